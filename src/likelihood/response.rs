//! A response of numbers: what it may be, the ends between which it fell, and what could be recorded at all.

use super::LikelihoodError;
use super::model::{Amount, Model};
use super::rows::{FROM, LOWER, RowKind, Rows, UPPER, UPTO, Y, fault, numbers};
use super::statement::Statement;
use crate::data::Table;
use crate::family::Support;

/// Whether a value may be seen under a support, and what would be in words. Bounds that depend on other columns or on known
/// parameters are looked at elsewhere.
fn allowed(support: Support) -> (fn(f64) -> bool, &'static str) {
    match support {
        Support::Nonnegative => (|y| y >= 0.0 && y.is_finite(), "a number, 0 or more"),
        Support::Positive => (|y| y > 0.0 && y.is_finite(), "a number above 0"),
        Support::Unit => (|y| y > 0.0 && y < 1.0, "a number above 0 and below 1"),
        Support::CountFromOne => (|y| y >= 1.0 && y.fract() == 0.0, "a whole number, 1 or more"),
        Support::Count | Support::CountOfTrials | Support::Draws => {
            (|y| y >= 0.0 && y.fract() == 0.0, "a whole number, 0 or more")
        }
        Support::Real | Support::Angle | Support::From(_) | Support::Lump(_) => (f64::is_finite, "a finite number"),
    }
}

/// The number that an amount is in a row.
fn amount(rows: &Rows, key: &str, stated: &Option<Amount>, row: usize) -> f64 {
    match (rows.column(key), stated) {
        (Some((_, x)), _) => x[row],
        (None, Some(Amount::Number(n))) => *n,
        _ => 1.0,
    }
}

/// The values on which components have all their mass.
fn lumps(model: &Model, supports: &[Support]) -> Vec<f64> {
    let of = |(c, s): (&super::model::Component, &Support)| match s {
        Support::Lump(name) => c.parameters.iter().find(|p| p.name == *name).and_then(|p| p.known.first()).map(|k| k.1),
        _ => None,
    };
    model.components.iter().zip(supports).filter_map(of).collect()
}

/// Checks exactly seen values; `only` restricts the look to some rows.
///
/// # Errors
/// The first value that no density of the model can give.
pub(super) fn check(
    rows: &Rows,
    model: &Model,
    statement: &Statement,
    table: &Table,
    name: &str,
    y: &[f64],
    only: Option<&dyn Fn(usize) -> bool>,
) -> Result<(), LikelihoodError> {
    let supports = statement.supports();
    // of a mixture one component at least must be able to give the value
    let able: Vec<_> = supports.iter().filter(|s| !s.is_lump()).map(|&s| allowed(s)).collect();
    let lumps: Vec<f64> = lumps(model, &supports);
    let looked = |i: &usize| only.is_none_or(|f| f(*i));
    if let Some(row) =
        (0..y.len()).filter(looked).find(|&i| !lumps.contains(&y[i]) && !able.iter().any(|(ok, _)| ok(y[i])))
    {
        return Err(fault(table, row, name, y[row], able.first().map_or("a number", |a| a.1)));
    }
    let of_trials = supports.iter().all(|s| matches!(s, Support::CountOfTrials)) && model.components.is_empty();
    let draws = supports.contains(&Support::Draws);
    for row in (0..y.len()).filter(looked) {
        let trials = amount(rows, "trials", &model.trials, row);
        if (of_trials || draws) && y[row] > trials {
            return Err(fault(table, row, name, y[row], &format!("at most the number of trials, {trials}")));
        }
        if draws {
            let (s, f) =
                (amount(rows, "successes", &model.successes, row), amount(rows, "failures", &model.failures, row));
            let (low, high) = ((trials - f).max(0.0), trials.min(s));
            if trials > s + f {
                let words = format!("at most successes and failures together, {}", s + f);
                return Err(fault(table, row, "of trials", trials, &words));
            }
            if y[row] < low || y[row] > high {
                let words =
                    format!("from {low} to {high}, what {trials} draws from {s} successes and {f} failures can give");
                return Err(fault(table, row, name, y[row], &words));
            }
        }
    }
    Ok(())
}

/// Reads the two ends of intervals. They are kept as arguments of the distribution function: P(lower < Y <= upper).
///
/// # Errors
/// Both ends open, ends in the wrong order, an interval outside the support.
pub(super) fn ends(
    rows: &mut Rows,
    model: &Model,
    statement: &Statement,
    table: &Table,
    lower_name: &str,
    upper_name: &str,
) -> Result<(), LikelihoodError> {
    let mut lower = numbers(table, lower_name, "model.response_lower")?.to_vec();
    let mut upper = numbers(table, upper_name, "model.response_upper")?.to_vec();
    let supports = statement.supports();
    let bounded = !supports.is_empty()
        && !supports.iter().any(|s| matches!(s, Support::Real | Support::Angle | Support::From(_)));
    let counts = statement.counts();
    let mut exact = vec![false; rows.count];
    for i in 0..rows.count {
        if lower[i].is_nan() || upper[i].is_nan() || (lower[i] == f64::NEG_INFINITY && upper[i] == f64::INFINITY) {
            return Err(fault(table, i, lower_name, lower[i], "one end at least that is not open"));
        }
        if lower[i] > upper[i] {
            return Err(fault(table, i, lower_name, lower[i], &format!("at most the upper end, {}", upper[i])));
        }
        exact[i] = lower[i] == upper[i];
        // nothing lies below the support
        if bounded && upper[i] < 0.0 {
            return Err(fault(table, i, upper_name, upper[i], "a number, 0 or more"));
        }
        if !exact[i] && counts {
            // both ends belong
            (lower[i], upper[i]) = (lower[i].ceil() - 1.0, upper[i].floor());
            if lower[i] >= upper[i] {
                return Err(fault(table, i, lower_name, lower[i] + 1.0, "an interval that holds a whole number"));
            }
        }
        let nothing_below = if counts { lower[i] < 0.0 } else { lower[i] <= 0.0 };
        if !exact[i] && bounded && nothing_below {
            lower[i] = f64::NEG_INFINITY;
            if upper[i] == f64::INFINITY {
                return Err(fault(
                    table,
                    i,
                    lower_name,
                    0.0,
                    "an interval that says something: this one holds every value",
                ));
            }
        }
    }
    check(rows, model, statement, table, lower_name, &lower, Some(&|i| exact[i]))?;
    rows.kinds = (0..rows.count)
        .map(|i| {
            if exact[i] {
                RowKind::Exact
            } else if upper[i] == f64::INFINITY {
                RowKind::Above
            } else if lower[i] == f64::NEG_INFINITY {
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

/// Reads what could be recorded at all, checks the response against it and cuts the intervals at it.
///
/// # Errors
/// A response outside what could be recorded.
pub(super) fn truncate(
    rows: &mut Rows,
    model: &Model,
    statement: &Statement,
    table: &Table,
) -> Result<(), LikelihoodError> {
    let counts = statement.counts();
    let read = |amount: &Option<Amount>, what: &str| -> Result<Option<Vec<f64>>, LikelihoodError> {
        let x = match amount {
            None => return Ok(None),
            Some(Amount::Number(x)) => vec![*x; rows.count],
            Some(Amount::Column(name)) => numbers(table, name, &format!("model.{what}"))?.to_vec(),
        };
        if let Some(row) = x.iter().position(|v| !v.is_finite()) {
            return Err(fault(table, row, what, x[row], "a finite number"));
        }
        Ok(Some(x))
    };
    let (mut above, mut below) = (read(&model.above, "above")?, read(&model.below, "below")?);
    if counts {
        // the largest count that could be recorded lies below a strict end
        above.iter_mut().flatten().for_each(|x| *x = x.floor());
        below.iter_mut().flatten().for_each(|x| *x = x.ceil() - 1.0);
    }
    if above.is_none() && below.is_none() {
        return Ok(());
    }
    let name = match &model.response {
        super::model::Response::Column(c) => c.clone(),
        _ => "of the response".into(),
    };
    let column = |key: &str| rows.column(key).map(|c| c.1.to_vec());
    let y = column(Y).unwrap_or_default();
    let mut lower = column(LOWER).unwrap_or_else(|| vec![f64::NEG_INFINITY; rows.count]);
    let mut upper = column(UPPER).unwrap_or_else(|| vec![f64::INFINITY; rows.count]);
    for i in 0..rows.count {
        let low = above.as_ref().map_or(f64::NEG_INFINITY, |a| a[i]);
        let high = below.as_ref().map_or(f64::INFINITY, |b| b[i]);
        if low >= high {
            return Err(fault(table, i, "of above", low, &format!("less than below, {high}")));
        }
        match rows.kinds[i] {
            RowKind::Exact => {
                let over = if counts { y[i] > high } else { y[i] >= high };
                if y[i] <= low || over {
                    let words = format!(
                        "a value that could be recorded: above {low} and {} {high}",
                        if counts { "up to" } else { "below" }
                    );
                    return Err(fault(table, i, &name, y[i], &words));
                }
            }
            RowKind::Above | RowKind::Below | RowKind::Between => {
                (lower[i], upper[i]) = (lower[i].max(low), upper[i].min(high));
                if lower[i] >= upper[i] {
                    return Err(fault(
                        table,
                        i,
                        &name,
                        lower[i],
                        "an interval that could be recorded in part at least",
                    ));
                }
                rows.kinds[i] = match (lower[i].is_finite(), upper[i].is_finite()) {
                    (true, true) => RowKind::Between,
                    (true, false) => RowKind::Above,
                    _ => RowKind::Below,
                };
            }
        }
    }
    let mut replace = |key: &str, values: Vec<f64>| match rows.columns.iter().position(|c| c.0 == key) {
        Some(at) => rows.columns[at].1 = values,
        None => rows.push(key, values),
    };
    replace(LOWER, lower);
    replace(UPPER, upper);
    if let Some(a) = above {
        replace(FROM, a);
    }
    if let Some(b) = below {
        replace(UPTO, b);
    }
    Ok(())
}
