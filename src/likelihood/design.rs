//! Linear predictors: coefficients from terms, their columns, names and meanings.

use super::LikelihoodError;
use super::model::{Setting, Terms};
use crate::data::{Table, Values};
use crate::expr::Name;
use crate::family::Link;

/// One coefficient of a linear predictor.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Coefficient {
    /// What follows the row parameter's name: `intercept`, `kiln.middle`, `kiln.middle:soak`.
    pub(super) key: Name,
    /// The factors: column and, for a category, the level.
    pub(super) factors: Vec<(String, Option<String>)>,
}

/// The coefficients of a predictor, in order: intercept, then term by term, the last factor running fastest.
///
/// # Errors
/// A term names a column that the table lacks.
pub(super) fn coefficients(terms: &Terms, table: &Table, place: &str) -> Result<Vec<Coefficient>, LikelihoodError> {
    let mut out = Vec::new();
    if terms.intercept {
        out.push(Coefficient { key: Name::single("intercept"), factors: Vec::new() });
    }
    for term in &terms.terms {
        let mut partial: Vec<Coefficient> = vec![Coefficient { key: Name::default(), factors: Vec::new() }];
        for column in term {
            let Some(found) = table.column(column) else {
                return Err(LikelihoodError::statement(
                    format!("{place}.terms"),
                    format!("no column is called {column}"),
                    "",
                ));
            };
            let pieces: Vec<Option<String>> = match &found.values {
                Values::Number(_) => vec![None],
                Values::Category { levels, .. } => {
                    let skip = usize::from(!terms.full);
                    levels.iter().skip(skip).map(|l| Some(l.clone())).collect()
                }
            };
            partial = partial
                .into_iter()
                .flat_map(|c| {
                    pieces
                        .iter()
                        .map(move |level| {
                            let first = c.key.pieces.is_empty();
                            let mut key = if first {
                                Name::single(column.as_str())
                            } else {
                                c.key.clone().colon(column.as_str())
                            };
                            if let Some(level) = level {
                                key = key.dot(level.as_str());
                            }
                            let mut factors = c.factors.clone();
                            factors.push((column.clone(), level.clone()));
                            Coefficient { key, factors }
                        })
                        .collect::<Vec<_>>()
                })
                .collect();
        }
        out.extend(partial);
    }
    if out.is_empty() {
        return Err(LikelihoodError::statement(
            format!("{place}.terms"),
            "there is no coefficient: no terms and no intercept",
            "add a term, or leave out the table to make the parameter one number",
        ));
    }
    if let Some(twice) = out.iter().enumerate().find(|(i, c)| out[..*i].iter().any(|d| d.key == c.key)) {
        return Err(LikelihoodError::statement(
            format!("{place}.terms"),
            format!("two coefficients are called {}", twice.1.key),
            "take the repeated term out",
        ));
    }
    Ok(out)
}

/// The values of a coefficient's column in every row of the table.
pub(super) fn column(coefficient: &Coefficient, table: &Table) -> Vec<f64> {
    let mut out = vec![1.0; table.rows];
    for (name, level) in &coefficient.factors {
        let Some(found) = table.column(name) else { continue };
        match (&found.values, level) {
            (Values::Number(x), _) => out.iter_mut().zip(x).for_each(|(o, x)| *o *= x),
            (Values::Category { codes, levels }, Some(level)) => {
                let code = levels.iter().position(|l| l == level).map_or(u32::MAX, |i| i as u32);
                out.iter_mut().zip(codes).for_each(|(o, &c)| *o = if c == code { *o } else { 0.0 });
            }
            (Values::Category { .. }, None) => {}
        }
    }
    out
}

/// What a coefficient means in words.
pub(super) fn meaning(parameter: &str, link: Link, terms: &Terms, table: &Table, c: &Coefficient) -> String {
    let scale = |what: String| match link {
        Link::Identity => what,
        Link::Log => format!("log of {what}"),
        Link::Logit => format!("log odds of {what}"),
        Link::Probit => format!("normal quantile of {what}"),
        Link::ComplementaryLogLog => format!("log(-log(1 - p)) of {what}"),
    };
    let reference = |column: &str| match table.column(column).map(|c| &c.values) {
        Some(Values::Category { levels, .. }) => levels.first().cloned().unwrap_or_default(),
        _ => String::new(),
    };
    match &c.factors[..] {
        [] => {
            let mut zero: Vec<String> = Vec::new();
            for name in terms.terms.iter().flatten() {
                let text = match table.column(name).map(|c| &c.values) {
                    Some(Values::Category { levels, .. }) if !terms.full => {
                        format!("{name} {}", levels.first().cloned().unwrap_or_default())
                    }
                    _ => format!("{name} 0"),
                };
                if !zero.contains(&text) {
                    zero.push(text);
                }
            }
            if zero.is_empty() {
                scale(parameter.to_string())
            } else {
                scale(format!("{parameter} at {}", zero.join(", ")))
            }
        }
        [(column, Some(level))] if !terms.full => {
            let base = reference(column);
            match link {
                Link::Log => format!("log of {parameter}({level}) / {parameter}({base})"),
                Link::Identity => format!("{parameter}({level}) - {parameter}({base})"),
                Link::Logit => format!("log of the odds ratio of {parameter}, {level} against {base}"),
                _ => format!("{} less that of {base}", scale(format!("{parameter}({level})"))),
            }
        }
        [(column, Some(level))] => {
            if terms.intercept {
                format!("what {column} {level} adds to the {}", scale(parameter.to_string()))
            } else {
                scale(format!("{parameter}({level})"))
            }
        }
        [(column, None)] => match link {
            Link::Identity => format!("change of {parameter} for one unit more of {column}"),
            _ => format!("change of the {} for one unit more of {column}", scale(parameter.to_string())),
        },
        several => {
            let text: Vec<String> = several
                .iter()
                .map(|(c, l)| match l {
                    Some(l) => format!("{c} {l}"),
                    None => c.clone(),
                })
                .collect();
            format!(
                "what {} do together beyond their separate parts, on the scale of the {}",
                text.join(" and "),
                scale(parameter.to_string())
            )
        }
    }
}

/// The value a setting's list gives to a coefficient (or to the parameter itself for `None`).
pub(super) fn keyed<T: Copy>(list: &[(Option<String>, T)], key: Option<&str>) -> Option<T> {
    list.iter().find(|(k, _)| k.as_deref() == key).map(|(_, v)| *v)
}

/// Keys of a setting that are no coefficient's: mistakes to report. Under reference coding the first level is explained.
pub(super) fn unknown_key(
    setting: &Setting,
    own: Option<&str>,
    coefficients: &[Coefficient],
    terms: &Terms,
    table: &Table,
    place: &str,
) -> Option<LikelihoodError> {
    let lists = [
        ("start", setting.start.iter().map(|e| &e.0).collect::<Vec<_>>()),
        ("known", setting.known.iter().map(|e| &e.0).collect()),
        ("range", setting.range.iter().map(|e| &e.0).collect()),
    ];
    for (list, keys) in lists {
        for key in keys {
            let Some(key) = key else {
                return Some(LikelihoodError::statement(
                    format!("{place}.{list}"),
                    format!("{} has terms, so {list} speaks of its coefficients", setting.name),
                    format!("write {list} = {{ {} = ... }}", coefficients[0].key),
                ));
            };
            // where the setting speaks of several row parameters, the others have their keys too
            let Some(key) = (match own {
                None => Some(key.clone()),
                Some(own) => key.strip_prefix(own).and_then(|k| k.strip_prefix('.')).map(str::to_string),
            }) else {
                continue;
            };
            let key = &key;
            if coefficients.iter().any(|c| c.key.to_string() == *key) {
                continue;
            }
            let advice = reference_level(key, terms, table).unwrap_or_else(|| {
                let names: Vec<String> = coefficients.iter().map(|c| c.key.to_string()).collect();
                match crate::expr::nearest(key, names.iter().map(String::as_str)) {
                    Some(n) => format!("nearest name: {n}"),
                    None => format!("there are {}", names.join(", ")),
                }
            });
            return Some(LikelihoodError::statement(
                format!("{place}.{list}"),
                format!("{} has no coefficient called {key}", setting.name),
                advice,
            ));
        }
    }
    None
}

/// If the key names the reference level of a category among the terms, what to say about it.
pub(super) fn reference_level(key: &str, terms: &Terms, table: &Table) -> Option<String> {
    if terms.full {
        return None;
    }
    terms.terms.iter().flatten().find_map(|column| match &table.column(column)?.values {
        Values::Category { levels, .. } => {
            let first = levels.first()?;
            let name = Name::single(column.as_str()).dot(first.as_str()).to_string();
            key.ends_with(&name).then(|| {
                format!(
                    "{first} is the first level of {column}, the one that the others are compared with; use per = \"{column}\" to give each level a parameter"
                )
            })
        }
        Values::Number(_) => None,
    })
}
