//! Free parameters numbered level by level; known ones set aside.

use super::design::{self, keyed};
use super::model::{Model, Setting};
use super::plan::{Bound, LocalPlan, PredictorPlan};
use super::statement::Statement;
use super::{LikelihoodError, Parameter};
use crate::data::Table;
use crate::expr::Name;
use crate::family::Given;
use crate::math::Range;

/// The free parameters as they are numbered.
#[derive(Default)]
pub(super) struct Numbering {
    pub(super) parameters: Vec<Parameter>,
    pub(super) starts: Vec<Option<f64>>,
    pub(super) known: Vec<(String, f64)>,
}

impl Numbering {
    fn enter(
        &mut self,
        name: String,
        range: Range,
        start: Option<f64>,
        known: Option<f64>,
        meaning: String,
        place: &str,
    ) -> Result<Bound, LikelihoodError> {
        if self.parameters.iter().any(|p| p.name == name) || self.known.iter().any(|k| k.0 == name) {
            return Err(LikelihoodError::statement(
                place,
                format!("two parameters are called {name}"),
                "rename one of them",
            ));
        }
        if let Some(x) = known {
            if !range.contains(x) {
                return Err(LikelihoodError::statement(
                    place,
                    format!("the known value {x} of {name} is outside its range {range}"),
                    "",
                ));
            }
            self.known.push((name, x));
            return Ok(Bound::Known(x));
        }
        if let Some(x) = start
            && !(x >= range.low && x <= range.high)
        {
            return Err(LikelihoodError::statement(
                place,
                format!("the start {x} of {name} is outside its range {range}"),
                "",
            ));
        }
        self.parameters.push(Parameter { name, range, meaning });
        self.starts.push(start);
        Ok(Bound::Free(self.parameters.len() - 1))
    }
}

fn full_name(prefix: Option<&Name>, name: &Name) -> String {
    match prefix {
        Some(p) => p.clone().then(name).to_string(),
        None => name.to_string(),
    }
}

pub(super) fn number_locals(
    model: &Model,
    locals: &[LocalPlan],
    prefix: Option<&Name>,
    level: usize,
    before: &[Vec<Bound>],
    numbering: &mut Numbering,
) -> Result<Vec<Bound>, LikelihoodError> {
    let mut out = Vec::new();
    for (k, l) in locals.iter().enumerate() {
        if l.shared && level > 0 {
            out.push(before[0][k]);
            continue;
        }
        let prefix = prefix.filter(|_| !l.shared);
        let own = prefix.and_then(|_| {
            let base = l.settings.as_ref().map_or(l.local.name.to_string(), |(s, _)| s.name.clone());
            let wanted = full_name(prefix, &Name::parse(&base).ok()?);
            model.parameters.iter().find(|s| Name::parse(&s.name).is_ok_and(|n| n.to_string() == wanted))
        });
        let key = l.settings.as_ref().and_then(|(_, k)| k.as_deref());
        let pick = |f: &dyn Fn(&Setting) -> Option<f64>| {
            own.and_then(f).or_else(|| l.settings.as_ref().and_then(|(s, _)| f(s)))
        };
        let range = own
            .and_then(|s| keyed(&s.range, key))
            .or_else(|| l.settings.as_ref().and_then(|(s, _)| keyed(&s.range, key)))
            .unwrap_or(l.local.range);
        let meaning = match prefix {
            Some(p) => format!("{}, {p}", l.meaning),
            None => l.meaning.clone(),
        };
        out.push(numbering.enter(
            full_name(prefix, &l.local.name),
            range,
            pick(&|s| keyed(&s.start, key)),
            pick(&|s| keyed(&s.known, key)).or(match l.given {
                Given::KnownAs(x) => Some(x),
                _ => None,
            }),
            meaning,
            &l.place,
        )?);
    }
    Ok(out)
}

pub(super) fn number_coefficients(
    statement: &Statement,
    table: &Table,
    predictors: &[PredictorPlan],
    prefix: Option<&Name>,
    level: usize,
    before: &[Vec<Vec<Bound>>],
    numbering: &mut Numbering,
) -> Result<Vec<Vec<Bound>>, LikelihoodError> {
    let mut out = Vec::new();
    for (k, p) in predictors.iter().enumerate() {
        if p.setting.shared && level > 0 {
            out.push(before[0][k].clone());
            continue;
        }
        let prefix = prefix.filter(|_| !p.setting.shared);
        let row = &statement.rows[p.local.row];
        let mut bound = Vec::new();
        for c in &p.coefficients {
            // a setting for several row parameters keys their coefficients by both
            let key = match row.key.as_deref().and_then(|own| Name::parse(own).ok()) {
                Some(own) => own.then(&c.key).to_string(),
                None => c.key.to_string(),
            };
            // what a label or a column stands for says more than its name
            let what = match &row.key {
                Some(_) => row.about.meaning.clone(),
                None => row.name.to_string(),
            };
            let meaning = design::meaning(&what, p.local.link, &p.terms, table, c);
            bound.push(numbering.enter(
                full_name(prefix, &row.name.clone().then(&c.key)),
                keyed(&p.setting.range, Some(&key)).unwrap_or(Range::ALL),
                keyed(&p.setting.start, Some(&key)),
                keyed(&p.setting.known, Some(&key)),
                match prefix {
                    Some(l) => format!("{meaning}, {l}"),
                    None => meaning,
                },
                &p.place,
            )?);
        }
        out.push(bound);
    }
    Ok(out)
}
