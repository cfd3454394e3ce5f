//! The rows a likelihood is computed from: the table's, or for labels one row a cell with its count; each of one kind.

use std::collections::{HashMap, HashSet};

use super::LikelihoodError;
use super::compose::has_terms;
use super::model::{Amount, Model, Response};
use super::statement::{Body, Statement};
use super::{labels, response};
use crate::data::{Table, Values};
use crate::family::Moments;

/// What is known of the response in a row.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) enum RowKind {
    /// Its value.
    Exact,
    /// It is above `lower`.
    Above,
    /// It is below `upper`.
    Below,
    /// It lies between.
    Between,
}

/// Rows with the columns that formulas may name.
#[derive(Debug, Default)]
pub(super) struct Rows {
    pub(super) count: usize,
    pub(super) kinds: Vec<RowKind>,
    /// Level of `per`; all 0 without.
    pub(super) level: Vec<u32>,
    /// A value a row that stands for the response.
    pub(super) values: Vec<f64>,
    /// The rows of each level, in order.
    pub(super) members: Vec<Vec<usize>>,
    /// Levels of `per`; empty without.
    pub(super) levels: Vec<String>,
    pub(super) weights: Option<Vec<f64>>,
    /// Columns by key, in the order of their graph index.
    pub(super) columns: Vec<(String, Vec<f64>)>,
}

/// Keys of the columns that are no column of the table (those are keyed by their name after a space).
pub(super) const Y: &str = "y";
pub(super) const LOWER: &str = "lower";
pub(super) const UPPER: &str = "upper";
/// Ends of what could be recorded, as arguments of the distribution function.
pub(super) const FROM: &str = "from";
pub(super) const UPTO: &str = "upto";

/// The key of a table column.
pub(super) fn table_key(name: &str) -> String {
    format!(" {name}")
}

impl Rows {
    pub(super) fn column(&self, key: &str) -> Option<(u32, &[f64])> {
        self.columns.iter().position(|c| c.0 == key).map(|i| (i as u32, &self.columns[i].1[..]))
    }

    pub(super) fn push(&mut self, key: impl Into<String>, values: Vec<f64>) {
        self.columns.push((key.into(), values));
    }

    /// Whether only a part of the values could be recorded.
    pub(super) fn truncated(&self) -> bool {
        self.column(FROM).is_some() || self.column(UPTO).is_some()
    }

    pub(super) fn weight(&self, row: usize) -> f64 {
        self.weights.as_ref().map_or(1.0, |w| w[row])
    }

    pub(super) fn weight_total(&self) -> f64 {
        self.weights.as_ref().map_or(self.count as f64, |w| w.iter().sum())
    }

    /// What tells a row from others.
    fn key(&self, row: usize) -> (u32, RowKind, Vec<u64>) {
        (self.level[row], self.kinds[row], self.columns.iter().map(|c| c.1[row].to_bits()).collect())
    }

    /// Whether among the first rows most have been there before.
    fn pays_to_join(&self) -> bool {
        let look = self.count.min(LOOK);
        let seen: HashSet<_> = (0..look).map(|i| self.key(i)).collect();
        look > 0 && 2 * seen.len() <= look
    }

    /// Joins equal rows into one with their total weight, in an order that does not depend on theirs.
    fn join(&mut self) {
        let mut totals: HashMap<(u32, RowKind, Vec<u64>), (usize, f64)> = HashMap::new();
        for row in 0..self.count {
            totals.entry(self.key(row)).or_insert((row, 0.0)).1 += self.weight(row);
        }
        let mut found: Vec<_> = totals.into_iter().collect();
        found.sort_by(|a, b| a.0.cmp(&b.0));
        let rows: Vec<usize> = found.iter().map(|f| f.1.0).collect();
        self.count = rows.len();
        self.kinds = rows.iter().map(|&i| self.kinds[i]).collect();
        self.level = rows.iter().map(|&i| self.level[i]).collect();
        self.weights = Some(found.iter().map(|f| f.1.1).collect());
        for (_, values) in &mut self.columns {
            *values = rows.iter().map(|&i| values[i]).collect();
        }
    }

    /// Takes what lies at or below `low` out of the interval of a row; the upper end if nothing is left.
    pub(super) fn bound_below(&mut self, row: usize, low: f64) -> Result<(), f64> {
        let at = |rows: &Rows, key: &str| rows.columns.iter().position(|c| c.0 == key);
        let (Some(lower), upper) = (at(self, LOWER), at(self, UPPER)) else { return Ok(()) };
        let high = upper.map_or(f64::INFINITY, |u| self.columns[u].1[row]);
        if high <= low {
            return Err(high);
        }
        if self.columns[lower].1[row] <= low {
            // under the end of the support everything is certain
            self.columns[lower].1[row] = low;
            if self.kinds[row] == RowKind::Between {
                self.kinds[row] = RowKind::Below;
            }
        }
        Ok(())
    }

    /// Values that stand for the response: itself, the middle of its interval, or the end that is known.
    fn representatives(&self) -> Vec<f64> {
        let get = |key: &str| self.column(key).map(|c| c.1);
        let (y, lower, upper) = (get(Y), get(LOWER), get(UPPER));
        let at = |c: Option<&[f64]>, i: usize| c.map_or(0.0, |c| c[i]);
        (0..self.count)
            .map(|i| match self.kinds[i] {
                RowKind::Exact => at(y, i),
                RowKind::Above => at(lower, i),
                RowKind::Below => at(upper, i),
                RowKind::Between => 0.5 * (at(lower, i) + at(upper, i)),
            })
            .collect()
    }

    /// Moments of the response over some rows, per unit of `size` (exposure or trials).
    pub(super) fn moments(&self, rows: impl Iterator<Item = usize>, size: Option<&[f64]>) -> Moments {
        Moments::of(rows.map(|i| {
            let s = size.map_or(1.0, |s| s[i]);
            (self.values[i] / s, self.weight(i) * s)
        }))
    }
}

pub(super) fn numbers<'t>(table: &'t Table, name: &str, place: &str) -> Result<&'t [f64], LikelihoodError> {
    match table.column(name).map(|c| &c.values) {
        Some(Values::Number(x)) => Ok(x),
        Some(Values::Category { .. }) => Err(LikelihoodError::statement(
            place,
            format!("column {name} holds labels, but numbers are needed here"),
            "name a column of numbers, or take it out of [data.category]",
        )),
        None => {
            let names: Vec<&str> = table.columns.iter().map(|c| c.name.as_str()).collect();
            let near = crate::expr::nearest(name, names.iter().copied());
            Err(LikelihoodError::statement(
                place,
                format!("no column is called {name}"),
                near.map_or_else(|| format!("there are {}", names.join(", ")), |n| format!("nearest name: {n}")),
            ))
        }
    }
}

/// A fault in a cell, with its place in the file.
pub(super) fn fault(table: &Table, row: usize, column: &str, found: f64, wanted: &str) -> LikelihoodError {
    let file = if table.file.is_empty() { "the data" } else { &table.file };
    LikelihoodError::Data(format!(
        "{file}, line {}, column {column}: found {found}, expected {wanted}",
        table.line(row)
    ))
}

/// Rows that a look at decides whether equal ones are worth joining.
const LOOK: usize = 2_000;

/// Reads the rows of a table as the model sees them. Counts without anything that differs between rows come up again and again:
/// equal rows are then joined into one with their total weight, unless each has to stay by itself (`apart`).
///
/// # Errors
/// Missing columns; values that the response cannot take.
pub(super) fn read(model: &Model, statement: &Statement, table: &Table, apart: bool) -> Result<Rows, LikelihoodError> {
    let mut rows = columns(model, statement, table)?;
    let plain = |r: &super::statement::RowEntry| r.curve.is_none() && !has_terms(r.setting.map(|s| &s.form));
    if !apart && statement.counts() && statement.rows.iter().all(plain) && rows.pays_to_join() {
        rows.join();
    }
    rows.members = vec![Vec::new(); rows.levels.len().max(1)];
    for (i, &level) in rows.level.iter().enumerate() {
        rows.members[level as usize].push(i);
    }
    rows.values = rows.representatives();
    Ok(rows)
}

fn columns(model: &Model, statement: &Statement, table: &Table) -> Result<Rows, LikelihoodError> {
    let mut rows = Rows { count: table.rows, weights: table.weights.clone(), ..Rows::default() };
    rows.kinds = vec![RowKind::Exact; table.rows];
    match &model.per {
        None => rows.level = vec![0; table.rows],
        Some(per) => match table.column(per).map(|c| &c.values) {
            Some(Values::Category { codes, levels }) => {
                rows.level.clone_from(codes);
                rows.levels.clone_from(levels);
            }
            Some(Values::Number(x)) => {
                // numbers name levels as well, in order of value
                let mut sorted: Vec<f64> = x.clone();
                sorted.sort_by(f64::total_cmp);
                sorted.dedup();
                rows.level = x.iter().map(|v| sorted.partition_point(|s| s < v) as u32).collect();
                rows.levels = sorted.iter().map(f64::to_string).collect();
            }
            None => {
                numbers(table, per, "model.per")?;
            }
        },
    }
    let expressions = statement.columns();
    if let Body::Composite(family, layout, _) = &statement.body {
        let alike = expressions.is_empty() && !statement.rows.iter().any(|r| has_terms(r.setting.map(|s| &s.form)));
        rows = labels::read(model, family, layout, table, rows, alike)?;
        if alike {
            return Ok(rows);
        }
    } else {
        single(&mut rows, model, statement, table)?;
    }
    for name in &expressions {
        let values = match table.column(name).map(|c| &c.values) {
            Some(Values::Number(x)) => x.clone(),
            Some(Values::Category { codes, .. }) => codes.iter().map(|&c| f64::from(c)).collect(),
            None => continue,
        };
        rows.push(table_key(name), values);
    }
    Ok(rows)
}

/// A response of one column or of two ends, with its amounts.
fn single(rows: &mut Rows, model: &Model, statement: &Statement, table: &Table) -> Result<(), LikelihoodError> {
    let custom = matches!(statement.body, Body::Custom(_));
    for (what, own, amount, place) in amounts(model) {
        let (key, name) = match (amount, own) {
            (Amount::Number(_), _) => continue,
            (Amount::Column(name), None) => (what.to_string(), name),
            (Amount::Column(name), Some(component)) => (format!("{what} of {component}"), name),
        };
        let x = numbers(table, &name, &place)?;
        let (ok, words): (fn(f64) -> bool, &str) = match what {
            "exposure" => (|v| v > 0.0 && v.is_finite(), "a number above 0"),
            _ => (|v| v >= 0.0 && v.fract() == 0.0, "a whole number, 0 or more"),
        };
        if let Some(row) = x.iter().position(|&v| !ok(v)) {
            return Err(fault(table, row, &name, x[row], words));
        }
        rows.push(key, x.to_vec());
    }
    match &model.response {
        Response::None => {}
        Response::Several(list) if custom => {
            for name in list {
                if table.column(name).is_none() {
                    numbers(table, name, "model.response")?;
                }
            }
        }
        Response::Several(_) => {
            return Err(LikelihoodError::statement(
                "model.response",
                format!("{} takes one column, not a list", model.family),
                "",
            ));
        }
        Response::Column(name) if custom => {
            if table.column(name).is_none() {
                numbers(table, name, "model.response")?;
            }
        }
        Response::Column(name) => {
            let y = numbers(table, name, "model.response")?.to_vec();
            response::check(rows, model, statement, table, name, &y, None)?;
            rows.push(Y, y);
        }
        Response::Ends { lower, upper } => response::ends(rows, model, statement, table, lower, upper)?,
    }
    if let Some(event) = &model.event {
        let seen = events(table, &event.column, event.seen.as_deref())?;
        let Some((_, y)) = rows.column(Y) else {
            return Err(LikelihoodError::statement(
                "model.event",
                "event needs a response",
                "name the column under response",
            ));
        };
        let y = y.to_vec();
        rows.kinds = seen.iter().map(|&s| if s { RowKind::Exact } else { RowKind::Above }).collect();
        rows.push(LOWER, y);
    }
    if !custom {
        response::truncate(rows, model, statement, table)?;
    }
    Ok(())
}

/// All amounts of the model: what, of which component, column or number, place in the study.
fn amounts(model: &Model) -> Vec<(&'static str, Option<&str>, Amount, String)> {
    let exposure = |e: &Option<String>| e.as_ref().map(|c| Amount::Column(c.clone()));
    let mut out = Vec::new();
    for (what, amount) in [
        ("exposure", exposure(&model.exposure)),
        ("trials", model.trials.clone()),
        ("successes", model.successes.clone()),
        ("failures", model.failures.clone()),
    ] {
        out.extend(amount.map(|a| (what, None, a, format!("model.{what}"))));
    }
    for (k, c) in model.components.iter().enumerate() {
        for (what, amount) in [("exposure", exposure(&c.exposure)), ("trials", c.trials.clone())] {
            out.extend(amount.map(|a| (what, Some(c.name.as_str()), a, format!("model.component.{k}.{what}"))));
        }
    }
    out
}

fn events(table: &Table, column: &str, seen: Option<&str>) -> Result<Vec<bool>, LikelihoodError> {
    match (table.column(column).map(|c| &c.values), seen) {
        (Some(Values::Category { codes, levels }), Some(seen)) => {
            let code = levels.iter().position(|l| l == seen).ok_or_else(|| {
                LikelihoodError::statement(
                    "model.event",
                    format!("no row of column {column} holds {seen}"),
                    format!("it holds {}", levels.join(", ")),
                )
            })?;
            Ok(codes.iter().map(|&c| c as usize == code).collect())
        }
        (Some(Values::Category { levels, .. }), None) => Err(LikelihoodError::statement(
            "model.event",
            format!("column {column} holds labels, not 1 and 0"),
            format!(
                "write event = {{ column = \"{column}\", seen = \"{}\" }}",
                levels.first().map_or("failed", String::as_str)
            ),
        )),
        (Some(Values::Number(x)), seen) => {
            if let Some(seen) = seen {
                let Ok(value) = seen.parse::<f64>() else {
                    return Err(LikelihoodError::statement(
                        "model.event",
                        format!("column {column} holds numbers, and {seen} is none"),
                        "",
                    ));
                };
                return Ok(x.iter().map(|&v| v == value).collect());
            }
            match x.iter().position(|&v| v != 0.0 && v != 1.0) {
                Some(row) => Err(fault(table, row, column, x[row], "1 (seen) or 0 (not seen, right-censored)")),
                None => Ok(x.iter().map(|&v| v == 1.0).collect()),
            }
        }
        (None, _) => numbers(table, column, "model.event").map(|_| Vec::new()),
    }
}
