//! Model and table to a [`Sample`]: free parameters are numbered, designs made, rows parted by kind and level.

use std::collections::HashMap;

use super::compose::{Local, LocalPredictor, Template, has_terms, uses};
use super::design::{self, Coefficient, keyed};
use super::formula::Formula;
use super::model::{Form, Model, Setting, Terms};
use super::part::{Part, Predictor};
use super::rows::{self, RowKind, Rows};
use super::sample::{Mixture, Sample};
use super::start::{self, Shape};
use super::statement::{Body, RowEntry, Statement};
use super::{Coordinates, LikelihoodError, Parameter};
use crate::data::Table;
use crate::expr::{Name, blocks, parse_expression, rows as columns};
use crate::family::Link;
use crate::math::linear::{orthogonalise, scaled_condition};
use crate::math::{Matrix, Range};

/// Condition number of the scaled Gram matrix of a design beyond which its columns are orthogonalised: Newton's equations
/// keep half the digits of a double there, and the QR of the columns keeps the rest.
const ILL_CONDITIONED: f64 = 1e8;

/// A scalar parameter with all that is said of it.
pub(super) struct LocalPlan<'m> {
    pub(super) local: Local,
    settings: Option<(&'m Setting, Option<String>)>,
    place: String,
    shared: bool,
    meaning: String,
    /// Row parameter that it is, if it is one.
    pub(super) row: Option<usize>,
}

/// A predictor with all that is said of it.
pub(super) struct PredictorPlan<'m> {
    pub(super) local: LocalPredictor,
    pub(super) terms: &'m Terms,
    setting: &'m Setting,
    place: String,
    pub(super) coefficients: Vec<Coefficient>,
}

/// Which free parameter, or which number.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Bound {
    Free(usize),
    Known(f64),
}

/// The free parameters as they are numbered.
#[derive(Default)]
struct Numbering {
    parameters: Vec<Parameter>,
    starts: Vec<Option<f64>>,
    known: Vec<(String, f64)>,
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

/// Prepares a likelihood.
///
/// # Errors
/// A statement that does not fit its family or the table; values that the response cannot take.
pub fn prepare(model: &Model, table: &Table) -> Result<Sample, LikelihoodError> {
    let statement = Statement::resolve(model)?;
    let rows = rows::read(model, table, statement.support(), &statement.columns())?;
    let locals = locals(model, &statement, &rows, table)?;
    let predictors = predictors(&statement, table)?;
    let template_locals: Vec<Local> = locals.iter().map(|l| l.local.clone()).collect();
    let template_predictors: Vec<LocalPredictor> = predictors.iter().map(|p| p.local.clone()).collect();
    let template = Template {
        model,
        statement: &statement,
        rows: &rows,
        table,
        locals: &template_locals,
        predictors: &template_predictors,
    };
    let levels = rows.levels.len().max(1);
    check_levels(model, &rows)?;
    let mut numbering = Numbering::default();
    let mut bound_locals: Vec<Vec<Bound>> = Vec::new();
    let mut bound_coefficients: Vec<Vec<Vec<Bound>>> = Vec::new();
    for level in 0..levels {
        let prefix = rows.levels.get(level).map(|l| Name::single(l.as_str()));
        bound_locals.push(number_locals(model, &locals, prefix.as_ref(), level, &bound_locals, &mut numbering)?);
        bound_coefficients.push(number_coefficients(
            &statement,
            table,
            &predictors,
            prefix.as_ref(),
            level,
            &bound_coefficients,
            &mut numbering,
        )?);
    }
    let designs = designs(&rows, table, &statement, &predictors, &bound_coefficients)?;
    let mut coordinates = Coordinates::identity();
    for (at, r) in designs.blocks {
        coordinates.push(at, r);
    }
    // rows by level and kind
    let mut groups: Vec<((u32, RowKind), Vec<usize>)> = Vec::new();
    {
        let mut at: HashMap<(u32, RowKind), usize> = HashMap::new();
        for i in 0..rows.count {
            let key = (rows.level[i], rows.kinds[i]);
            let g = *at.entry(key).or_insert_with(|| {
                groups.push((key, Vec::new()));
                groups.len() - 1
            });
            groups[g].1.push(i);
        }
        groups.sort_by_key(|g| g.0);
    }
    let mut formulas: Vec<Formula> = Vec::new();
    let mut compiled: HashMap<(RowKind, Vec<Option<u64>>), usize> = HashMap::new();
    let mut parts = Vec::new();
    for ((level, kind), members) in groups {
        let bound = &bound_locals[level as usize];
        let known: Vec<Option<f64>> = bound
            .iter()
            .map(|b| match b {
                Bound::Known(x) => Some(*x),
                Bound::Free(_) => None,
            })
            .collect();
        let key = (kind, known.iter().map(|k| k.map(f64::to_bits)).collect::<Vec<_>>());
        let formula = match compiled.get(&key) {
            Some(&f) => f,
            None => {
                formulas.push(template.compile(kind, &known)?);
                compiled.insert(key, formulas.len() - 1);
                formulas.len() - 1
            }
        };
        let map = bound.iter().filter_map(|b| if let Bound::Free(i) = b { Some(*i) } else { None }).collect();
        let part_predictors = (0..predictors.len())
            .map(|k| Predictor {
                columns: bound_coefficients[level as usize][k]
                    .iter()
                    .enumerate()
                    .filter(|(_, b)| matches!(b, Bound::Free(_)))
                    .map(|(j, _)| blocks(members.iter().map(|&i| designs.columns[k][j][i])))
                    .collect(),
                offset: designs.offsets[k].as_ref().map(|o| blocks(members.iter().map(|&i| o[i]))),
                at: bound_coefficients[level as usize][k]
                    .iter()
                    .filter_map(|b| if let Bound::Free(i) = b { Some(*i) } else { None })
                    .collect(),
            })
            .collect();
        let weights: Option<Vec<f64>> = rows.weights.as_ref().map(|w| members.iter().map(|&i| w[i]).collect());
        parts.push(Part::bind(
            &formulas[formula],
            formula,
            members.len(),
            &|c| template.raw(c, &members),
            weights.as_deref(),
            map,
            part_predictors,
        ));
    }
    let shape = Shape {
        model,
        statement: &statement,
        rows: &rows,
        locals: &locals,
        predictors: &predictors,
        bound_locals: &bound_locals,
        bound_coefficients: &bound_coefficients,
        design: &designs.columns,
        offsets: &designs.offsets,
        coordinates: &coordinates,
    };
    let start = start::theta(&shape, &numbering.parameters, &numbering.starts)?;
    let mixture = mixture(&shape, levels);
    let all_kinds_exact = rows.kinds.iter().all(|&k| k == RowKind::Exact);
    let concave = match &statement.body {
        Body::Density(f) => f.concave && !statement.rows.iter().any(|r| r.curve.is_some()),
        Body::Categorical => true,
        Body::Mixture(_) => {
            locals
                .iter()
                .enumerate()
                .all(|(k, l)| l.row.is_none() || bound_locals.iter().all(|b| matches!(b[k], Bound::Known(_))))
                && predictors.is_empty()
        }
        Body::Custom(_) => false,
    };
    let equations = match &statement.body {
        Body::Categorical | Body::Mixture(_) => {
            let pattern = match rows.cells.first().map_or(1, |c| c.pieces.len() - 1) {
                2 => "share.*.*",
                _ => "share.*",
            };
            match rows.levels.is_empty() {
                true => vec![format!("sum({pattern}) = 1")],
                false => {
                    rows.levels.iter().map(|l| format!("sum({}.{pattern}) = 1", Name::single(l.as_str()))).collect()
                }
            }
        }
        _ => Vec::new(),
    };
    Ok(Sample {
        parameters: numbering.parameters,
        known: numbering.known,
        coordinates,
        formulas,
        parts,
        weight_total: rows.weight_total(),
        start,
        concave,
        equations,
        mixture,
        expected: all_kinds_exact,
        collapsed_rows: rows.collapsed,
    })
}

/// LEVEL.NAME settings must name levels that are there.
fn check_levels(model: &Model, rows: &Rows) -> Result<(), LikelihoodError> {
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

fn locals<'m>(
    model: &'m Model,
    statement: &Statement<'m>,
    rows: &Rows,
    table: &Table,
) -> Result<Vec<LocalPlan<'m>>, LikelihoodError> {
    let mut out: Vec<LocalPlan<'m>> = Vec::new();
    let share = model.parameters.iter().find(|s| s.name == "share");
    let share_names: Vec<Name> = match &statement.body {
        Body::Categorical => rows.cells.clone(),
        Body::Mixture(parts) => parts.iter().map(|(n, _)| Name::single("share").then(n)).collect(),
        _ => Vec::new(),
    };
    if let Some(s) = share {
        if s.form != Form::Plain {
            return Err(LikelihoodError::statement(
                "model.share",
                "shares cannot have terms or a curve in this version",
                "use per = \"COLUMN\" for shares that differ by level",
            ));
        }
        for key in s
            .start
            .iter()
            .map(|e| &e.0)
            .chain(s.known.iter().map(|e| &e.0))
            .chain(s.range.iter().map(|e| &e.0))
            .flatten()
        {
            let Ok(name) = Name::parse(key) else { continue };
            if !share_names.contains(&Name::single("share").then(&name)) {
                let names: Vec<String> = share_names.iter().map(Name::to_string).collect();
                return Err(LikelihoodError::statement(
                    "model.share",
                    format!("no share is called share.{key}"),
                    format!("there are {}", names.join(", ")),
                ));
            }
        }
    }
    for name in share_names {
        let key: Vec<_> = name.pieces[1..].to_vec();
        let key = Name { pieces: key }.to_string();
        let what = match &statement.body {
            Body::Categorical => format!("probability of {key}"),
            _ => format!("share of component {key}"),
        };
        out.push(LocalPlan {
            local: Local { name, range: Range::UNIT },
            settings: share.map(|s| (s, Some(key))),
            place: "model.share".into(),
            shared: share.is_some_and(|s| s.shared),
            meaning: what,
            row: None,
        });
    }
    for (at, r) in statement.rows.iter().enumerate() {
        if r.curve.is_some() || has_terms(r.setting.map(|s| &s.form)) {
            continue;
        }
        out.push(LocalPlan {
            local: Local { name: r.name.clone(), range: range_of(r) },
            settings: r.setting.map(|s| (s, None)),
            place: r.place.clone(),
            shared: r.setting.is_some_and(|s| s.shared),
            meaning: match r.component {
                Some(k) => format!("{} in component {}", r.about.meaning, model.components[k].name),
                None => r.about.meaning.into(),
            },
            row: Some(at),
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
        });
    }
    Ok(out)
}

/// The range of a plain parameter: what the study says, within the natural one.
fn range_of(r: &RowEntry) -> Range {
    r.setting.and_then(|s| keyed(&s.range, None)).unwrap_or(r.about.range)
}

fn predictors<'m>(statement: &Statement<'m>, table: &Table) -> Result<Vec<PredictorPlan<'m>>, LikelihoodError> {
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
        let coefficients = design::coefficients(terms, table, &r.place)?;
        if let Some(e) = design::unknown_key(setting, &coefficients, terms, table, &r.place) {
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

fn full_name(prefix: Option<&Name>, name: &Name) -> String {
    match prefix {
        Some(p) => p.clone().then(name).to_string(),
        None => name.to_string(),
    }
}

fn number_locals(
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
            pick(&|s| keyed(&s.known, key)),
            meaning,
            &l.place,
        )?);
    }
    Ok(out)
}

fn number_coefficients(
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
            let key = c.key.to_string();
            let meaning = design::meaning(&row.name.to_string(), p.local.link, p.terms, table, c);
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

/// Design columns by predictor and coefficient over all rows, orthogonalised where their conditioning asks for it.
struct Designs {
    columns: Vec<Vec<Vec<f64>>>,
    offsets: Vec<Option<Vec<f64>>>,
    /// Where each orthogonalised block of coefficients begins, and its R.
    blocks: Vec<(usize, Matrix)>,
}

fn designs(
    rows: &Rows,
    table: &Table,
    statement: &Statement,
    predictors: &[PredictorPlan],
    bound: &[Vec<Vec<Bound>>],
) -> Result<Designs, LikelihoodError> {
    let mut out = Designs { columns: Vec::new(), offsets: Vec::new(), blocks: Vec::new() };
    for (k, p) in predictors.iter().enumerate() {
        let mut columns: Vec<Vec<f64>> = p.coefficients.iter().map(|c| design::column(c, table)).collect();
        let mut offset = match &p.terms.offset {
            None => None,
            Some(text) => {
                let place = format!("{}.offset", statement.rows[p.local.row].place);
                let ast = parse_expression(text).map_err(LikelihoodError::expression(place.clone()))?;
                let find = |n: &Name| {
                    n.as_single().and_then(|n| table.column(n)).map(|c| match &c.values {
                        crate::data::Values::Number(x) => columns::ColumnView::Number(x),
                        crate::data::Values::Category { codes, levels } => {
                            columns::ColumnView::Category { codes, levels }
                        }
                    })
                };
                let x =
                    columns::evaluate(&ast, &find, table.rows).map_err(LikelihoodError::expression(place.clone()))?;
                if let Some(row) = x.iter().position(|v| !v.is_finite()) {
                    return Err(LikelihoodError::Data(format!(
                        "{}, line {}: the offset {text} is {} there; every row needs a finite number",
                        table.file,
                        table.line(row),
                        x[row]
                    )));
                }
                Some(x)
            }
        };
        for (level, b) in bound.iter().enumerate() {
            let members: Vec<usize> = (0..rows.count).filter(|&i| rows.level[i] as usize == level).collect();
            for (j, b) in b[k].iter().enumerate() {
                if let Bound::Known(x) = b
                    && *x != 0.0
                {
                    let o = offset.get_or_insert_with(|| vec![0.0; rows.count]);
                    members.iter().for_each(|&i| o[i] += x * columns[j][i]);
                }
            }
        }
        // one set of coefficients for all rows, or one a level
        let sets: Vec<(usize, Vec<usize>)> = if p.setting.shared || bound.len() == 1 {
            vec![(0, (0..rows.count).collect())]
        } else {
            (0..bound.len()).map(|l| (l, (0..rows.count).filter(|&i| rows.level[i] as usize == l).collect())).collect()
        };
        for (level, members) in sets {
            let free: Vec<(usize, usize)> = bound[level][k]
                .iter()
                .enumerate()
                .filter_map(|(j, b)| if let Bound::Free(i) = b { Some((j, *i)) } else { None })
                .collect();
            if let Some(block) = orthogonal(&mut columns, &free, &members, rows.count) {
                out.blocks.push(block);
            }
        }
        out.columns.push(columns);
        out.offsets.push(offset);
    }
    Ok(out)
}

fn orthogonal(
    columns: &mut [Vec<f64>],
    free: &[(usize, usize)],
    members: &[usize],
    count: usize,
) -> Option<(usize, Matrix)> {
    if free.len() < 2 || members.len() < free.len() {
        return None;
    }
    let gathered: Vec<Vec<f64>>;
    let list: Vec<&[f64]> = if members.len() == count {
        free.iter().map(|&(j, _)| &columns[j][..]).collect()
    } else {
        gathered = free.iter().map(|&(j, _)| members.iter().map(|&i| columns[j][i]).collect()).collect();
        gathered.iter().map(Vec::as_slice).collect()
    };
    let condition = scaled_condition(&list, None);
    if condition.is_nan() || condition < ILL_CONDITIONED {
        return None;
    }
    // a design without full rank stays as it is: the certificate will name the flat direction
    let qr = orthogonalise(&list, None).ok().filter(|q| q.rank == free.len())?;
    for (q, &(j, _)) in qr.q.iter().zip(free) {
        members.iter().zip(q).for_each(|(&i, &x)| columns[j][i] = x);
    }
    Some((free[0].1, qr.r))
}

fn mixture(shape: &Shape, levels: usize) -> Option<Mixture> {
    let Body::Mixture(parts) = &shape.statement.body else { return None };
    let at = |name: &Name| shape.locals.iter().position(|l| l.local.name == *name);
    let mut out = Mixture::default();
    for level in 0..levels {
        let mut components = Vec::new();
        for (k, (name, family)) in parts.iter().enumerate() {
            let share = at(&Name::single("share").then(name)).map(|i| shape.bound_locals[level][i]);
            let own: Vec<Bound> = shape
                .statement
                .rows
                .iter()
                .enumerate()
                .filter(|(_, r)| r.component == Some(k))
                .filter_map(|(row, _)| shape.locals.iter().position(|l| l.row == Some(row)))
                .map(|i| shape.bound_locals[level][i])
                .collect();
            let spread = family.parameters.iter().position(|p| p.name == "sd").and_then(|s| own.get(s).copied());
            components.push((name.to_string(), family.name, share, own, spread));
        }
        let members = (0..shape.rows.count).filter(|&i| shape.rows.level[i] as usize == level);
        let sd = shape.rows.moments(members, None).variance.sqrt();
        out.push(components, sd);
    }
    Some(out)
}
