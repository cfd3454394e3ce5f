//! The rows a likelihood is computed from: the table's, or for labels one row a cell with its count; each of one kind.

use std::collections::HashMap;

use super::LikelihoodError;
use super::model::{Amount, Model, Response};
use crate::data::{Table, Values};
use crate::expr::Name;
use crate::family::{Moments, Support};

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
    /// Labels of a categorical response, one cell a name.
    pub(super) cells: Vec<Name>,
}

/// Keys of the columns that are no column of the table (those are keyed by their name after a space).
pub(super) const Y: &str = "y";
pub(super) const LOWER: &str = "lower";
pub(super) const UPPER: &str = "upper";

/// The key of a table column.
pub(super) fn table_key(name: &str) -> String {
    format!(" {name}")
}

impl Rows {
    pub(super) fn column(&self, key: &str) -> Option<(u32, &[f64])> {
        self.columns.iter().position(|c| c.0 == key).map(|i| (i as u32, &self.columns[i].1[..]))
    }

    fn push(&mut self, key: impl Into<String>, values: Vec<f64>) {
        self.columns.push((key.into(), values));
    }

    pub(super) fn weight(&self, row: usize) -> f64 {
        self.weights.as_ref().map_or(1.0, |w| w[row])
    }

    pub(super) fn weight_total(&self) -> f64 {
        self.weights.as_ref().map_or(self.count as f64, |w| w.iter().sum())
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

fn numbers<'t>(table: &'t Table, name: &str, place: &str) -> Result<&'t [f64], LikelihoodError> {
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
fn fault(table: &Table, row: usize, column: &str, found: f64, wanted: &str) -> LikelihoodError {
    let file = if table.file.is_empty() { "the data" } else { &table.file };
    LikelihoodError::Data(format!(
        "{file}, line {}, column {column}: found {found}, expected {wanted}",
        table.line(row)
    ))
}

/// Reads the rows of a table as the model sees them. `expressions` are the columns that texts of the model name.
///
/// # Errors
/// Missing columns; values that the response cannot take.
pub(super) fn read(
    model: &Model,
    table: &Table,
    support: Option<Support>,
    expressions: &[String],
) -> Result<Rows, LikelihoodError> {
    let mut rows = columns(model, table, support, expressions)?;
    rows.members = vec![Vec::new(); rows.levels.len().max(1)];
    for (i, &level) in rows.level.iter().enumerate() {
        rows.members[level as usize].push(i);
    }
    rows.values = rows.representatives();
    Ok(rows)
}

fn columns(
    model: &Model,
    table: &Table,
    support: Option<Support>,
    expressions: &[String],
) -> Result<Rows, LikelihoodError> {
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
    if model.family == "categorical" {
        return cells(model, table, rows);
    }
    match &model.response {
        Response::None => {}
        Response::Labels(_) => {
            return Err(LikelihoodError::statement(
                "model.response",
                format!("{} takes one column, not a list", model.family),
                "",
            ));
        }
        Response::Column(name) if support.is_some() => {
            let y = numbers(table, name, "model.response")?.to_vec();
            check(table, name, &y, support)?;
            rows.push(Y, y);
        }
        Response::Column(name) => {
            numbers(table, name, "model.response")?;
        }
        Response::Ends { lower, upper } => ends(&mut rows, table, lower, upper, support)?,
    }
    let sized = |rows: &mut Rows, key: &str, name: &str, place: &str| -> Result<(), LikelihoodError> {
        let x = numbers(table, name, place)?;
        if let Some(row) = x.iter().position(|&v| !(v > 0.0 && v.is_finite())) {
            return Err(fault(table, row, name, x[row], "a number above 0"));
        }
        rows.push(key, x.to_vec());
        Ok(())
    };
    if let Some(name) = &model.exposure {
        sized(&mut rows, "exposure", name, "model.exposure")?;
    }
    if let Some(Amount::Column(name)) = &model.trials {
        let n = numbers(table, name, "model.trials")?.to_vec();
        if let Some(row) = n.iter().position(|&v| !(v >= 0.0 && v.fract() == 0.0)) {
            return Err(fault(table, row, name, n[row], "a whole number, 0 or more"));
        }
        rows.push("trials", n);
    }
    for (at, component) in model.components.iter().enumerate() {
        if let Some(name) = &component.exposure {
            sized(
                &mut rows,
                &format!("exposure of {}", component.name),
                name,
                &format!("model.component.{at}.exposure"),
            )?;
        }
        if let Some(Amount::Column(name)) = &component.trials {
            let n = numbers(table, name, &format!("model.component.{at}.trials"))?.to_vec();
            rows.push(format!("trials of {}", component.name), n);
        }
    }
    if support == Some(Support::CountOfTrials)
        && let (Some((_, y)), Response::Column(name)) = (rows.column(Y), &model.response)
    {
        let trials = rows.column("trials").map(|c| c.1);
        let fixed = match &model.trials {
            Some(Amount::Number(n)) => *n,
            _ => 1.0,
        };
        for (row, &y) in y.iter().enumerate() {
            let n = trials.map_or(fixed, |t| t[row]);
            if y > n {
                return Err(fault(table, row, name, y, &format!("at most the number of trials, {n}")));
            }
        }
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
    for name in expressions {
        let values = match table.column(name).map(|c| &c.values) {
            Some(Values::Number(x)) => x.clone(),
            Some(Values::Category { codes, .. }) => codes.iter().map(|&c| f64::from(c)).collect(),
            None => continue,
        };
        rows.push(table_key(name), values);
    }
    Ok(rows)
}

fn check(table: &Table, name: &str, y: &[f64], support: Option<Support>) -> Result<(), LikelihoodError> {
    let (ok, words): (fn(f64) -> bool, &str) = match support {
        Some(Support::Nonnegative) => (|y| y >= 0.0 && y.is_finite(), "a number, 0 or more"),
        Some(Support::Positive) => (|y| y > 0.0 && y.is_finite(), "a number above 0"),
        Some(Support::Unit) => (|y| y > 0.0 && y < 1.0, "a number above 0 and below 1"),
        Some(Support::CountFromOne) => (|y| y >= 1.0 && y.fract() == 0.0, "a whole number, 1 or more"),
        Some(Support::Count | Support::CountOfTrials) => {
            (|y| y >= 0.0 && y.fract() == 0.0, "a whole number, 0 or more")
        }
        Some(Support::Real | Support::From(_)) | None => (f64::is_finite, "a finite number"),
    };
    match y.iter().position(|&v| !ok(v)) {
        Some(row) => Err(fault(table, row, name, y[row], words)),
        None => Ok(()),
    }
}

fn ends(
    rows: &mut Rows,
    table: &Table,
    lower_name: &str,
    upper_name: &str,
    support: Option<Support>,
) -> Result<(), LikelihoodError> {
    let mut lower = numbers(table, lower_name, "model.response_lower")?.to_vec();
    let upper = numbers(table, upper_name, "model.response_upper")?.to_vec();
    for i in 0..rows.count {
        if lower[i].is_nan() || upper[i].is_nan() || (lower[i] == f64::NEG_INFINITY && upper[i] == f64::INFINITY) {
            return Err(fault(table, i, lower_name, lower[i], "one end at least that is not open"));
        }
        if lower[i] > upper[i] {
            return Err(fault(table, i, lower_name, lower[i], &format!("at most the upper end, {}", upper[i])));
        }
        // nothing lies below the support
        if support == Some(Support::Nonnegative) {
            if upper[i] < 0.0 {
                return Err(fault(table, i, upper_name, upper[i], "a number, 0 or more"));
            }
            lower[i] = lower[i].max(0.0);
        }
    }
    let closed = support == Some(Support::Nonnegative);
    rows.kinds = (0..rows.count)
        .map(|i| {
            if lower[i] == upper[i] {
                RowKind::Exact
            } else if upper[i] == f64::INFINITY {
                RowKind::Above
            } else if lower[i] == f64::NEG_INFINITY || (closed && lower[i] == 0.0) {
                RowKind::Below
            } else {
                RowKind::Between
            }
        })
        .collect();
    rows.push(Y, upper.clone());
    rows.push(LOWER, lower);
    rows.push(UPPER, upper);
    Ok(())
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

/// Labels: one row a cell and level of `per`, with the total weight of the cell.
fn cells(model: &Model, table: &Table, rows: Rows) -> Result<Rows, LikelihoodError> {
    let names: Vec<&str> = match &model.response {
        Response::Column(c) => vec![c],
        Response::Labels(list) => list.iter().map(String::as_str).collect(),
        _ => Vec::new(),
    };
    if names.is_empty() {
        return Err(LikelihoodError::statement(
            "model.response",
            "categorical needs a response: a column of labels, or a list of them",
            "write response = \"COLUMN\"",
        ));
    }
    let mut codes = vec![0usize; table.rows];
    let mut cells: Vec<Name> = vec![Name::single("share")];
    for name in names {
        let (own, levels): (Vec<u32>, Vec<String>) = match table.column(name).map(|c| &c.values) {
            Some(Values::Category { codes, levels }) => (codes.clone(), levels.clone()),
            _ => {
                let x = numbers(table, name, "model.response")?;
                let mut sorted = x.to_vec();
                sorted.sort_by(f64::total_cmp);
                sorted.dedup();
                let own = x.iter().map(|v| sorted.partition_point(|s| s < v) as u32).collect();
                (own, sorted.iter().map(f64::to_string).collect())
            }
        };
        codes.iter_mut().zip(&own).for_each(|(c, &o)| *c = *c * levels.len() + o as usize);
        cells =
            cells.iter().flat_map(|c| levels.iter().map(|l| c.clone().dot(l.as_str())).collect::<Vec<_>>()).collect();
    }
    if cells.len() > 2_000 {
        return Err(LikelihoodError::statement(
            "model.response",
            format!("there are {} different labels or cells, more than 2000", cells.len()),
            "is this really a category? join rare labels first",
        ));
    }
    let mut totals: HashMap<(u32, usize), f64> = HashMap::new();
    for (row, &code) in codes.iter().enumerate() {
        *totals.entry((rows.level[row], code)).or_default() += rows.weight(row);
    }
    let mut keys: Vec<(u32, usize)> = totals.keys().copied().collect();
    keys.sort_unstable();
    let mut out = Rows {
        count: keys.len(),
        kinds: vec![RowKind::Exact; keys.len()],
        level: keys.iter().map(|k| k.0).collect(),
        levels: rows.levels,
        weights: Some(keys.iter().map(|k| totals[k]).collect()),
        cells,
        ..Rows::default()
    };
    for cell in 0..out.cells.len() {
        let indicator = keys.iter().map(|k| f64::from(u8::from(k.1 == cell))).collect();
        out.push(format!("cell {cell}"), indicator);
    }
    Ok(out)
}
