//! Model and table to a [`Sample`]: free parameters are numbered, designs made, rows parted by kind and level.

use std::collections::HashMap;
use std::sync::Arc;

use super::compose::{Local, LocalPredictor, Template};
use super::designs::{Designs, designs};
use super::formula::Formula;
use super::model::{Model, Response};
use super::numbering::{Numbering, number_coefficients, number_locals};
use super::part::{Part, Predictor};
use super::plan::{Bound, LocalPlan, PredictorPlan, check_levels, locals, predictors};
use super::rows::{self, RowKind, Rows};
use super::sample::{Mixture, Sample};
use super::start::{self, Shape};
use super::statement::{Body, Statement};
use super::{Coordinates, Information, LikelihoodError, kinks, labels};
use crate::data::Table;
use crate::expr::{Name, blocks};
use crate::family::Support;
use crate::family::composite::{Composite, Layout, Reads};

/// A statement joined to a table: parameters numbered, designs made, nothing compiled yet.
pub(super) struct Plan<'m> {
    pub(super) model: &'m Model,
    pub(super) table: &'m Table,
    pub(super) statement: Statement<'m>,
    pub(super) rows: Rows,
    pub(super) locals: Vec<LocalPlan<'m>>,
    pub(super) predictors: Vec<PredictorPlan<'m>>,
    template_locals: Vec<Local>,
    template_predictors: Vec<LocalPredictor>,
    pub(super) numbering: Numbering,
    /// By level of `per`.
    pub(super) bound_locals: Vec<Vec<Bound>>,
    /// By level of `per` and predictor.
    pub(super) bound_coefficients: Vec<Vec<Vec<Bound>>>,
    pub(super) designs: Designs,
    pub(super) coordinates: Coordinates,
}

impl<'m> Plan<'m> {
    /// `apart`: equal rows are not joined.
    ///
    /// # Errors
    /// A statement that does not fit its family or the table; values that the response cannot take.
    pub(super) fn new(model: &'m Model, table: &'m Table, apart: bool) -> Result<Plan<'m>, LikelihoodError> {
        let layout = match Composite::named(&model.family) {
            Some(family) => Some(labels::layout(model, family, table)?),
            None => None,
        };
        let statement = Statement::resolve(model, layout)?;
        let mut rows = rows::read(model, &statement, table, apart)?;
        let locals = locals(model, &statement, &rows, table)?;
        let predictors = predictors(&statement, table)?;
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
        threshold(model, &statement, table, &mut rows, &locals, &bound_locals)?;
        let designs = designs(&rows, table, &statement, &predictors, &bound_coefficients)?;
        let mut coordinates = Coordinates::identity();
        for (at, r) in &designs.blocks {
            coordinates.push(*at, r.clone());
        }
        Ok(Plan {
            model,
            table,
            template_locals: locals.iter().map(|l| l.local.clone()).collect(),
            template_predictors: predictors.iter().map(|p| p.local.clone()).collect(),
            statement,
            rows,
            locals,
            predictors,
            numbering,
            bound_locals,
            bound_coefficients,
            designs,
            coordinates,
        })
    }

    /// What formulas are made from.
    pub(super) fn template(&self) -> Template<'_> {
        Template {
            model: self.model,
            statement: &self.statement,
            rows: &self.rows,
            table: self.table,
            locals: &self.template_locals,
            predictors: &self.template_predictors,
            expected_asked: false,
        }
    }

    /// The known values of the parameters of a level.
    pub(super) fn known(&self, level: usize) -> Vec<Option<f64>> {
        let value = |b: &Bound| if let Bound::Known(x) = b { Some(*x) } else { None };
        self.bound_locals[level].iter().map(value).collect()
    }

    /// Index among the free parameters of each that a formula of this level has.
    pub(super) fn map(&self, level: usize) -> Vec<usize> {
        self.bound_locals[level].iter().filter_map(|b| if let Bound::Free(i) = b { Some(*i) } else { None }).collect()
    }

    /// The predictors of some rows of a level.
    pub(super) fn predictors_of(&self, level: usize, members: &[usize]) -> Vec<Predictor> {
        let bound = &self.bound_coefficients[level];
        (0..self.predictors.len())
            .map(|k| Predictor {
                columns: bound[k]
                    .iter()
                    .enumerate()
                    .filter(|(_, b)| matches!(b, Bound::Free(_)))
                    .map(|(j, _)| blocks(members.iter().map(|&i| self.designs.columns[k][j][i])))
                    .collect(),
                offset: self.designs.offsets[k].as_ref().map(|o| blocks(members.iter().map(|&i| o[i]))),
                at: bound[k].iter().filter_map(|b| if let Bound::Free(i) = b { Some(*i) } else { None }).collect(),
            })
            .collect()
    }
}

/// A response bounded below by a known parameter: values under it are faults, ends of intervals at or under it say nothing.
fn threshold(
    model: &Model,
    statement: &Statement,
    table: &Table,
    rows: &mut Rows,
    locals: &[LocalPlan],
    bound: &[Vec<Bound>],
) -> Result<(), LikelihoodError> {
    let Body::Density(f) = &statement.body else { return Ok(()) };
    let Support::From(name) = f.support else { return Ok(()) };
    let Some(at) = locals.iter().position(|l| l.local.name.as_single() == Some(name)) else { return Ok(()) };
    for i in 0..rows.count {
        let Bound::Known(low) = bound[rows.level[i] as usize][at] else { continue };
        let column = match &model.response {
            Response::Column(c) => c.as_str(),
            _ => "of the response",
        };
        let words = format!("a number of at least {name}, which is {low}");
        if rows.kinds[i] == RowKind::Exact {
            let y = rows.values[i];
            if y < low {
                return Err(rows::fault(table, i, column, y, &words));
            }
            continue;
        }
        rows.bound_below(i, low).map_err(|y| rows::fault(table, i, column, y, &words))?;
    }
    Ok(())
}

/// Prepares a likelihood.
///
/// # Errors
/// A statement that does not fit its family or the table; values that the response cannot take.
pub fn prepare(model: &Model, table: &Table) -> Result<Sample, LikelihoodError> {
    prepare_for(model, table, None)
}

/// Prepares a likelihood for this information; where it is `Expected`, what sums and integrals need is compiled for mixtures too.
///
/// # Errors
/// As [`prepare`].
pub fn prepare_for(model: &Model, table: &Table, information: Option<Information>) -> Result<Sample, LikelihoodError> {
    let plan = Plan::new(model, table, false)?;
    let template = Template { expected_asked: information == Some(Information::Expected), ..plan.template() };
    let Plan { statement, rows, locals, predictors, bound_locals, bound_coefficients, designs, .. } = &plan;
    let levels = rows.levels.len().max(1);
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
    let level_weight = |level: usize| -> f64 { rows.members[level].iter().map(|&i| rows.weight(i)).sum() };
    // rows with weights and no predictor, all in intervals, are bins: each has an expected count
    let binned = rows.weights.is_some() && predictors.is_empty() && !rows.kinds.contains(&RowKind::Exact);
    let bins = groups
        .iter()
        .map(|((level, kind), _)| (binned && *kind != RowKind::Exact).then(|| level_weight(*level as usize)))
        .collect();
    for ((level, kind), members) in groups {
        let known = plan.known(level as usize);
        let key = (kind, known.iter().map(|k| k.map(f64::to_bits)).collect::<Vec<_>>());
        let formula = match compiled.get(&key) {
            Some(&f) => f,
            None => {
                formulas.push(template.compile(kind, &known)?);
                compiled.insert(key, formulas.len() - 1);
                formulas.len() - 1
            }
        };
        let weights: Option<Vec<f64>> = rows.weights.as_ref().map(|w| members.iter().map(|&i| w[i]).collect());
        let inputs = formulas[formula].expectation.as_ref().map(|e| template.inputs(e, &members));
        let mut part = Part::bind(
            &formulas[formula],
            formula,
            members.len(),
            &|c| template.raw(c, &members),
            weights.as_deref(),
            plan.map(level as usize),
            plan.predictors_of(level as usize, &members),
        );
        part.inputs = inputs;
        part.raw = kinks::Raw::keep(&formulas[formula], &template, &members, weights.as_deref()).map(Arc::new);
        parts.push(part);
    }
    let shape = Shape {
        model,
        statement,
        rows,
        locals,
        predictors,
        bound_locals,
        bound_coefficients,
        design: &designs.columns,
        offsets: &designs.offsets,
        coordinates: &plan.coordinates,
    };
    let start = start::theta(&shape, &plan.numbering.parameters, &plan.numbering.starts);
    let mixture = mixture(&shape, levels);
    let all_kinds_exact = rows.kinds.iter().all(|&k| k == RowKind::Exact);
    let concave = match &statement.body {
        Body::Density(f) => f.concave && !statement.rows.iter().any(|r| r.curve.is_some()),
        Body::Composite(f, ..) => f.concave && !statement.rows.iter().any(|r| r.curve.is_some()),
        Body::Mixture(_) => {
            locals
                .iter()
                .enumerate()
                .all(|(k, l)| l.row.is_none() || bound_locals.iter().all(|b| matches!(b[k], Bound::Known(_))))
                && predictors.is_empty()
        }
        Body::Custom(_) => false,
    };
    let equations = equations(statement, rows)?;
    // cells have expected counts where the shares are parameters themselves
    let plain = |layout: &Layout| !layout.terms && !statement.rows.iter().any(|r| r.curve.is_some());
    let cells = match &statement.body {
        Body::Composite(f, layout, _) if f.reads == Reads::Labels && plain(layout) => {
            bound_locals.iter().enumerate().map(|(l, b)| (level_weight(l), b.clone())).collect()
        }
        _ => Vec::new(),
    };
    Ok(Sample {
        weight_total: rows.weight_total(),
        observed_by_default: matches!(statement.body, Body::Mixture(_) | Body::Custom(_)),
        custom: matches!(statement.body, Body::Custom(_)),
        parameters: plan.numbering.parameters,
        known: plan.numbering.known,
        coordinates: plan.coordinates,
        formulas,
        parts,
        start,
        concave,
        equations,
        mixture,
        expected: all_kinds_exact,
        cells,
        bins,
    })
}

/// The restrictions that the family maintains, once a level of `per`.
fn equations(statement: &Statement, rows: &Rows) -> Result<Vec<String>, LikelihoodError> {
    let own = match &statement.body {
        Body::Mixture(_) => vec!["sum(share.*) = 1".to_string()],
        Body::Composite(_, _, made) => {
            // curves that make every share need no sum maintained; some alone would leave it without meaning
            let curves = statement.rows.iter().filter(|r| r.curve.is_some()).count();
            if curves > 0 && curves < statement.rows.len() && !made.equations.is_empty() {
                return Err(LikelihoodError::statement(
                    "model",
                    format!(
                        "{curves} of {} parameters are curves, and the family keeps the sum of all",
                        statement.rows.len()
                    ),
                    "give each of them a curve, or none",
                ));
            }
            if curves > 0 { Vec::new() } else { made.equations.clone() }
        }
        _ => Vec::new(),
    };
    if rows.levels.is_empty() {
        return Ok(own);
    }
    let each = |l: &String| {
        let level = Name::single(l.as_str());
        own.iter().map(move |e| e.replace("sum(", &format!("sum({level}."))).collect::<Vec<_>>()
    };
    Ok(rows.levels.iter().flat_map(each).collect())
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
            // where every parameter is plain, its place among them is that in the family
            let spread = ["sd", "scale"].iter().find_map(|s| at(&name.clone().dot(*s)));
            let spread = spread.map(|i| shape.bound_locals[level][i]);
            components.push((name.to_string(), *family, share, own, spread));
        }
        let sd = shape.rows.moments(shape.rows.members[level].iter().copied(), None).variance.sqrt();
        out.push(components, sd);
    }
    Some(out)
}
