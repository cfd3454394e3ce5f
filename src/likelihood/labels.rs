//! Responses of several columns or of labels: what is found in the table, and the columns that formulas see.

use std::collections::HashMap;

use super::LikelihoodError;
use super::model::{Model, Response};
use super::rows::{RowKind, Rows, fault, numbers};
use crate::data::{Table, Values};
use crate::expr::Name;
use crate::family::Composite;
use crate::family::composite::{Layout, Reads, Summary};

/// Most labels or cells of a response.
const MOST_CELLS: usize = 2_000;

/// The columns of the response by name.
fn names<'m>(model: &'m Model, family: &Composite) -> Result<Vec<&'m str>, LikelihoodError> {
    let names: Vec<&str> = match &model.response {
        Response::Column(c) => vec![c],
        Response::Several(list) => list.iter().map(String::as_str).collect(),
        _ => Vec::new(),
    };
    let (fewest, most) = match family.reads {
        Reads::Labels => (1, 4),
        Reads::OrderedLabels => (1, 1),
        Reads::Contest => (2, 2),
        Reads::Numbers | Reads::Shares => (2, usize::MAX),
    };
    if names.len() < fewest || names.len() > most {
        return Err(LikelihoodError::statement(
            "model.response",
            format!("the response of {} is {}", family.name, family.response),
            match family.reads {
                Reads::Labels | Reads::OrderedLabels => "write response = \"COLUMN\"",
                Reads::Contest => "write response = [\"WINNER\", \"LOSER\"] with the names of the two columns",
                Reads::Numbers | Reads::Shares => {
                    "write response = [\"FIRST\", \"SECOND\"] with the names of the columns"
                }
            },
        ));
    }
    if let Some((k, twice)) = names.iter().enumerate().find(|(k, n)| names[..*k].contains(n)) {
        return Err(LikelihoodError::statement(
            "model.response",
            format!("column {twice} stands in the response twice (place {})", k + 1),
            "name each column once",
        ));
    }
    Ok(names)
}

/// Codes and levels of a column of labels; numbers are labels too, in order of value.
fn codes(table: &Table, name: &str) -> Result<(Vec<u32>, Vec<String>), LikelihoodError> {
    match table.column(name).map(|c| &c.values) {
        Some(Values::Category { codes, levels }) => Ok((codes.clone(), levels.clone())),
        _ => {
            let x = numbers(table, name, "model.response")?;
            let mut sorted = x.to_vec();
            sorted.sort_by(f64::total_cmp);
            sorted.dedup();
            let own = x.iter().map(|v| sorted.partition_point(|s| s < v) as u32).collect();
            Ok((own, sorted.iter().map(f64::to_string).collect()))
        }
    }
}

/// The items of two columns: in the order of the first, then what only the second has; sorted if both are.
fn items(first: &[String], second: &[String]) -> Vec<String> {
    let mut all = first.to_vec();
    all.extend(second.iter().filter(|l| !first.contains(l)).cloned());
    if first.is_sorted() && second.is_sorted() {
        all.sort();
    }
    all
}

/// What a family made from the data finds in them.
///
/// # Errors
/// A response that the family cannot read.
pub(super) fn layout(model: &Model, family: &Composite, table: &Table) -> Result<Layout, LikelihoodError> {
    let names = names(model, family)?;
    let terms = family
        .groups
        .first()
        .is_some_and(|g| model.parameters.iter().any(|s| s.name == g.name && super::compose::has_terms(Some(&s.form))));
    let pieces = match family.reads {
        Reads::Labels | Reads::OrderedLabels => {
            let mut cells = vec![Name::default()];
            for name in names {
                let levels = codes(table, name)?.1;
                cells = cells
                    .iter()
                    .flat_map(|c| levels.iter().map(|l| c.clone().then(&Name::single(l.as_str()))).collect::<Vec<_>>())
                    .collect();
            }
            cells
        }
        Reads::Contest => {
            let (first, second) = (codes(table, names[0])?.1, codes(table, names[1])?.1);
            items(&first, &second).into_iter().map(Name::single).collect()
        }
        Reads::Numbers | Reads::Shares => names.into_iter().map(Name::single).collect(),
    };
    if pieces.len() > MOST_CELLS {
        return Err(LikelihoodError::statement(
            "model.response",
            format!("there are {} different labels or cells, more than {MOST_CELLS}", pieces.len()),
            "is this really a category? join rare labels first",
        ));
    }
    if pieces.len() < 2 && family.reads != Reads::Labels {
        return Err(LikelihoodError::statement(
            "model.response",
            format!("{} needs two different labels at least, and there is one", family.name),
            "",
        ));
    }
    Ok(Layout { pieces, terms })
}

/// The rows of a family made from the data. Without anything that differs between rows of one label, those are joined into one
/// with their total weight.
pub(super) fn read(
    model: &Model,
    family: &Composite,
    layout: &Layout,
    table: &Table,
    mut rows: Rows,
    alike: bool,
) -> Result<Rows, LikelihoodError> {
    let names = names(model, family)?;
    match family.reads {
        Reads::Numbers | Reads::Shares => {
            for name in &names {
                let x = numbers(table, name, "model.response")?;
                let (ok, words): (fn(f64) -> bool, _) = match family.reads {
                    Reads::Shares => (|v| v > 0.0 && v < 1.0, "a share above 0 and below 1"),
                    _ => (f64::is_finite, "a finite number"),
                };
                if let Some(row) = x.iter().position(|&v| !ok(v)) {
                    return Err(fault(table, row, name, x[row], words));
                }
                rows.push(Name::single("y").dot(*name).to_string(), x.to_vec());
            }
            if family.reads == Reads::Shares {
                for row in 0..rows.count {
                    let sum: f64 = rows.columns.iter().map(|c| c.1[row]).sum();
                    // shares written to a few digits still sum to one within them
                    if (sum - 1.0).abs() > SUM_OF_SHARES {
                        return Err(LikelihoodError::Data(format!(
                            "{}, line {}, columns {}: the shares sum to {sum}, expected 1",
                            if table.file.is_empty() { "the data" } else { &table.file },
                            table.line(row),
                            names.join(", ")
                        )));
                    }
                    rows.columns.iter_mut().for_each(|c| c.1[row] /= sum);
                }
            }
        }
        Reads::Labels | Reads::OrderedLabels => {
            let mut cell = vec![0usize; table.rows];
            for name in names {
                let (own, levels) = codes(table, name)?;
                cell.iter_mut().zip(&own).for_each(|(c, &o)| *c = *c * levels.len() + o as usize);
            }
            if alike {
                let found = join(&mut rows, cell.iter().map(|&c| (c, 0)));
                cell = found.into_iter().map(|k| k.0).collect();
            }
            for (k, piece) in layout.pieces.iter().enumerate() {
                let seen = cell.iter().map(|&c| f64::from(u8::from(c == k))).collect();
                rows.push(Name::single("seen").then(piece).to_string(), seen);
            }
        }
        Reads::Contest => {
            let place = |name: &str| -> Result<Vec<usize>, LikelihoodError> {
                let (own, levels) = codes(table, name)?;
                let at: Vec<usize> = levels
                    .iter()
                    .map(|l| {
                        let name = Name::single(l.as_str());
                        layout.pieces.iter().position(|p| *p == name).unwrap_or_default()
                    })
                    .collect();
                Ok(own.iter().map(|&c| at[c as usize]).collect())
            };
            let (won, lost) = (place(names[0])?, place(names[1])?);
            if let Some(row) = (0..table.rows).find(|&i| won[i] == lost[i]) {
                return Err(LikelihoodError::Data(format!(
                    "{}, line {}, columns {} and {}: {} is compared with itself",
                    if table.file.is_empty() { "the data" } else { &table.file },
                    table.line(row),
                    names[0],
                    names[1],
                    layout.pieces[won[row]]
                )));
            }
            let mut pairs: Vec<(usize, usize)> = won.into_iter().zip(lost).collect();
            if alike {
                pairs = join(&mut rows, pairs.into_iter());
            }
            for (k, piece) in layout.pieces.iter().enumerate() {
                let sign = |p: &(usize, usize)| f64::from(u8::from(p.0 == k)) - f64::from(u8::from(p.1 == k));
                rows.push(Name::single("sign").then(piece).to_string(), pairs.iter().map(sign).collect());
            }
        }
    }
    Ok(rows)
}

/// How far the shares of a row may sum from one.
const SUM_OF_SHARES: f64 = 1e-3;

/// Joins the rows of one level and key; the keys of the rows that are left, in order.
fn join(rows: &mut Rows, keys: impl Iterator<Item = (usize, usize)>) -> Vec<(usize, usize)> {
    let mut totals: HashMap<(u32, (usize, usize)), f64> = HashMap::new();
    for (row, key) in keys.enumerate() {
        *totals.entry((rows.level[row], key)).or_default() += rows.weight(row);
    }
    let mut found: Vec<(u32, (usize, usize))> = totals.keys().copied().collect();
    found.sort_unstable();
    rows.count = found.len();
    rows.kinds = vec![RowKind::Exact; found.len()];
    rows.level = found.iter().map(|k| k.0).collect();
    rows.weights = Some(found.iter().map(|k| totals[k]).collect());
    found.into_iter().map(|k| k.1).collect()
}

/// Summaries of the rows of a level, for starting values.
pub(super) fn summary(family: &Composite, layout: &Layout, rows: &Rows, members: &[usize]) -> Summary {
    let column = |i: usize| &rows.columns[i].1;
    match family.reads {
        Reads::Labels | Reads::OrderedLabels | Reads::Contest => Summary {
            counts: (0..layout.pieces.len())
                .map(|k| members.iter().map(|&i| rows.weight(i) * column(k)[i]).sum())
                .collect(),
            ..Summary::default()
        },
        Reads::Numbers | Reads::Shares => {
            let n = layout.pieces.len();
            let columns: Vec<_> = (0..n)
                .map(|k| crate::family::Moments::of(members.iter().map(|&i| (column(k)[i], rows.weight(i)))))
                .collect();
            let total: f64 = members.iter().map(|&i| rows.weight(i)).sum();
            let mut correlations = Vec::new();
            for a in 0..n {
                for b in a + 1..n {
                    let products = members
                        .iter()
                        .map(|&i| rows.weight(i) * (column(a)[i] - columns[a].mean) * (column(b)[i] - columns[b].mean));
                    let scale = (columns[a].variance * columns[b].variance).sqrt();
                    let covariance = products.sum::<f64>() / total;
                    correlations.push(if scale > 0.0 { covariance / scale } else { 0.0 });
                }
            }
            Summary { columns, correlations, ..Summary::default() }
        }
    }
}
