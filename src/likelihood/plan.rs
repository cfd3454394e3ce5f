//! What is said of each parameter and predictor of one level, before they are numbered.

use super::LikelihoodError;
use super::compose::{Local, LocalPredictor, has_terms, uses};
use super::design::{self, Coefficient, keyed};
use super::model::{Form, Model, Setting, Terms};
use super::rows::Rows;
use super::statement::{Body, Statement};
use crate::data::Table;
use crate::expr::Name;
use crate::family::{Given, Link};
use crate::math::Range;

/// A scalar parameter with all that is said of it.
pub(super) struct LocalPlan<'m> {
    pub(super) local: Local,
    pub(super) settings: Option<(&'m Setting, Option<String>)>,
    pub(super) place: String,
    pub(super) shared: bool,
    pub(super) meaning: String,
    /// Row parameter that it is, if it is one.
    pub(super) row: Option<usize>,
    /// Whether it is estimated where the study says nothing.
    pub(super) given: Given,
}

/// A predictor with all that is said of it.
pub(super) struct PredictorPlan<'m> {
    pub(super) local: LocalPredictor,
    pub(super) terms: Terms,
    pub(super) setting: &'m Setting,
    pub(super) place: String,
    pub(super) coefficients: Vec<Coefficient>,
}

/// Which free parameter, or which number.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Bound {
    Free(usize),
    Known(f64),
}

/// LEVEL.NAME settings must name levels that are there.
pub(super) fn check_levels(model: &Model, rows: &Rows) -> Result<(), LikelihoodError> {
    if model.per.is_none() {
        return Ok(());
    }
    for s in &model.parameters {
        if let Ok(name) = Name::parse(&s.name)
            && let [first, _] = &name.pieces[..]
        {
            let level = first.text.as_deref().unwrap_or_default();
            if !rows.levels.iter().any(|l| l == level) {
                return Err(LikelihoodError::statement(
                    format!("model.{}", s.name),
                    format!("{} has no level called {level}", model.per.as_deref().unwrap_or_default()),
                    format!("the levels are {}", rows.levels.join(", ")),
                ));
            }
        }
    }
    Ok(())
}

pub(super) fn locals<'m>(
    model: &'m Model,
    statement: &Statement<'m>,
    rows: &Rows,
    table: &Table,
) -> Result<Vec<LocalPlan<'m>>, LikelihoodError> {
    let mut out: Vec<LocalPlan<'m>> = Vec::new();
    if let Body::Mixture(parts) = &statement.body {
        let share = model.parameters.iter().find(|s| s.name == "share");
        let names: Vec<Name> = parts.iter().map(|(n, _)| n.clone()).collect();
        if let Some(s) = share {
            if s.form != Form::Plain {
                return Err(LikelihoodError::statement(
                    "model.share",
                    "the shares of a mixture cannot have terms or a curve",
                    "use per = \"COLUMN\" for shares that differ by level",
                ));
            }
            check_keys(s, "share", &names, "model.share")?;
        }
        for name in names {
            let key = name.to_string();
            out.push(LocalPlan {
                local: Local { name: Name::single("share").then(&name), range: Range::UNIT },
                meaning: format!("share of component {key}"),
                settings: share.map(|s| (s, Some(key))),
                place: "model.share".into(),
                shared: share.is_some_and(|s| s.shared),
                row: None,
                given: Given::Estimated,
            });
        }
    }
    if let Body::Composite(family, _, made) = &statement.body {
        for (g, group) in family.groups.iter().enumerate() {
            let keys: Vec<Name> = made.parameters.iter().filter(|p| p.group == g).map(|p| p.key.clone()).collect();
            for s in model.parameters.iter().filter(|s| s.name == group.name && s.form == Form::Plain) {
                check_keys(s, group.name, &keys, &format!("model.{}", s.name))?;
            }
        }
    }
    for (at, r) in statement.rows.iter().enumerate() {
        if r.curve.is_some() || has_terms(r.setting.map(|s| &s.form)) {
            continue;
        }
        let known = r.setting.is_some_and(|s| !s.known.is_empty());
        if r.about.given == Given::Known && !known {
            return Err(LikelihoodError::statement(
                if r.setting.is_some() { r.place.clone() } else { "model".into() },
                format!("{} must be known: the likelihood cannot estimate it", r.name),
                format!(
                    "write {} = {{ known = VALUE }}",
                    r.name.pieces.last().map_or("", |p| p.text.as_deref().unwrap_or(""))
                ),
            ));
        }
        out.push(LocalPlan {
            local: Local { name: r.name.clone(), range: r.about.range },
            settings: r.setting.map(|s| (s, r.key.clone())),
            place: r.place.clone(),
            shared: r.setting.is_some_and(|s| s.shared),
            meaning: match r.component {
                Some(k) => format!("{} in component {}", r.about.meaning, model.components[k].name),
                None => r.about.meaning.clone(),
            },
            row: Some(at),
            given: r.about.given,
        });
    }
    for s in &statement.free {
        let place = format!("model.{}", s.name);
        if uses(rows, &s.name) || table.column(&s.name).is_some() && statement.columns().contains(&s.name) {
            return Err(LikelihoodError::statement(
                place,
                format!("{} is the name of a parameter and of a column", s.name),
                "rename the parameter",
            ));
        }
        let known = keyed(&s.known, None).is_some();
        if keyed(&s.start, None).is_none() && !known {
            return Err(LikelihoodError::statement(
                place,
                format!("parameter {} has no start", s.name),
                format!("write {} = {{ start = 1 }} with a value of the right size", s.name),
            ));
        }
        if s.form != Form::Plain {
            return Err(LikelihoodError::statement(
                place,
                format!("{} is a parameter of a formula: it cannot have terms or a curve of its own", s.name),
                "write the formula with columns instead",
            ));
        }
        if !known
            && !statement.texts().iter().any(|(a, _)| a.names().iter().any(|(n, _)| n.as_single() == Some(&s.name)))
        {
            return Err(LikelihoodError::statement(
                place,
                format!("parameter {} stands in no formula", s.name),
                "use it, or take its table out",
            ));
        }
        out.push(LocalPlan {
            local: Local { name: Name::single(s.name.as_str()), range: keyed(&s.range, None).unwrap_or(Range::ALL) },
            settings: Some((s, None)),
            place,
            shared: s.shared,
            meaning: "as in the formula".into(),
            row: None,
            given: Given::Estimated,
        });
    }
    Ok(out)
}

/// Keys of a setting that speaks of several parameters must name them.
fn check_keys(s: &Setting, group: &str, names: &[Name], place: &str) -> Result<(), LikelihoodError> {
    let keys = s.start.iter().map(|e| &e.0).chain(s.known.iter().map(|e| &e.0)).chain(s.range.iter().map(|e| &e.0));
    for key in keys.flatten() {
        let Ok(name) = Name::parse(key) else { continue };
        if !names.contains(&name) {
            let all: Vec<String> = names.iter().map(|n| Name::single(group).then(n).to_string()).collect();
            return Err(LikelihoodError::statement(
                place,
                format!("no {group} is called {group}.{key}"),
                format!("there are {}", all.join(", ")),
            ));
        }
    }
    Ok(())
}

pub(super) fn predictors<'m>(
    statement: &Statement<'m>,
    table: &Table,
) -> Result<Vec<PredictorPlan<'m>>, LikelihoodError> {
    let mut out = Vec::new();
    for (at, r) in statement.rows.iter().enumerate() {
        let Some(setting) = r.setting else { continue };
        let Form::Terms(terms) = &setting.form else { continue };
        let link = match &terms.link {
            None => r.about.links[0],
            Some(name) => {
                let known = Link::named(name).filter(|l| r.about.links.contains(l));
                known.ok_or_else(|| {
                    let names: Vec<&str> = r.about.links.iter().map(|l| l.text()).collect();
                    LikelihoodError::statement(
                        format!("{}.link", r.place),
                        format!("{} has no link called {name}", r.name),
                        format!("there are {}", names.join(", ")),
                    )
                })?
            }
        };
        let terms = Terms { intercept: terms.intercept && r.about.intercept, ..terms.clone() };
        let coefficients = design::coefficients(&terms, table, &r.place)?;
        if let Some(e) = design::unknown_key(setting, r.key.as_deref(), &coefficients, &terms, table, &r.place) {
            return Err(e);
        }
        out.push(PredictorPlan {
            local: LocalPredictor { row: at, link },
            terms,
            setting,
            place: r.place.clone(),
            coefficients,
        });
    }
    Ok(out)
}
