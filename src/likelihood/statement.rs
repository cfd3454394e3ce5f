//! A model statement resolved: which density, which row parameters, which free ones.

use super::LikelihoodError;
use super::model::{Form, Model, Setting};
use crate::expr::{Ast, Name, nearest, parse_expression};
use crate::family::{FAMILIES, Family, RowParameter, Support};

/// The density of a row.
#[derive(Debug)]
pub(super) enum Body {
    /// A family of the table.
    Density(&'static Family),
    /// Shares of labels.
    Categorical,
    /// Components with their families.
    Mixture(Vec<(Name, &'static Family)>),
    /// The user's formula.
    Custom(Ast),
}

/// A row parameter with what the study says of it.
#[derive(Debug)]
pub(super) struct RowEntry<'m> {
    /// `mean`, or `north.mean` in a mixture.
    pub(super) name: Name,
    pub(super) about: &'static RowParameter,
    pub(super) setting: Option<&'m Setting>,
    /// Place of its table in the study.
    pub(super) place: String,
    pub(super) curve: Option<Ast>,
    /// Component of a mixture.
    pub(super) component: Option<usize>,
}

/// A statement with its texts parsed.
#[derive(Debug)]
pub(super) struct Statement<'m> {
    pub(super) body: Body,
    pub(super) rows: Vec<RowEntry<'m>>,
    /// Parameters of curves and custom densities, in file order.
    pub(super) free: Vec<&'m Setting>,
    pub(super) lets: Vec<(String, Ast)>,
}

pub(super) fn parse(text: &str, place: &str) -> Result<Ast, LikelihoodError> {
    parse_expression(text).map_err(LikelihoodError::expression(place))
}

impl<'m> Statement<'m> {
    /// # Errors
    /// Anything in the statement that does not fit its family, with its place.
    pub(super) fn resolve(model: &'m Model) -> Result<Statement<'m>, LikelihoodError> {
        let body = body(model)?;
        let mut lets = Vec::new();
        for (name, text) in &model.lets {
            lets.push((name.clone(), parse(text, &format!("model.let.{name}"))?));
        }
        let mut rows = Vec::new();
        match &body {
            Body::Density(f) => {
                for p in f.parameters {
                    let setting = model.parameters.iter().find(|s| s.name == p.name);
                    rows.push(entry(Name::single(p.name), p, setting, format!("model.{}", p.name), None)?);
                }
            }
            Body::Mixture(parts) => {
                for (k, (name, f)) in parts.iter().enumerate() {
                    let settings = &model.components[k].parameters;
                    for p in f.parameters {
                        let setting = settings.iter().find(|s| s.name == p.name);
                        let place = format!("model.component.{k}.{}", p.name);
                        rows.push(entry(name.clone().dot(p.name), p, setting, place, Some(k))?);
                    }
                    if let Some(s) = settings.iter().find(|s| !f.parameters.iter().any(|p| p.name == s.name)) {
                        return Err(no_parameter(
                            &s.name,
                            &format!("model.component.{k}.{}", s.name),
                            f.parameters.iter().map(|p| p.name),
                        ));
                    }
                }
            }
            Body::Categorical | Body::Custom(_) => {}
        }
        let has_curve = rows.iter().any(|r| r.curve.is_some());
        let mut free = Vec::new();
        let mut known_names: Vec<&str> = match &body {
            Body::Density(f) => f.parameters.iter().map(|p| p.name).collect(),
            Body::Categorical | Body::Mixture(_) => vec!["share"],
            Body::Custom(_) => Vec::new(),
        };
        for s in &model.parameters {
            if known_names.contains(&s.name.as_str()) || is_of_level(&s.name, &known_names, model) {
                continue;
            }
            if has_curve || matches!(body, Body::Custom(_)) {
                free.push(s);
                continue;
            }
            known_names.extend(match &body {
                Body::Mixture(p) => p.iter().map(|(_, f)| f.name).collect::<Vec<_>>(),
                _ => Vec::new(),
            });
            return Err(no_parameter(&s.name, &format!("model.{}", s.name), known_names.into_iter()));
        }
        let free: Vec<&Setting> = {
            // LEVEL.NAME speaks of a free parameter that has a table of its own
            let names: Vec<&str> = free.iter().map(|s| s.name.as_str()).collect();
            free.iter().copied().filter(|s| !is_of_level(&s.name, &names, model)).collect()
        };
        Ok(Statement { body, rows, free, lets })
    }

    /// What the response must be; `None` for custom densities.
    pub(super) fn support(&self) -> Option<Support> {
        match &self.body {
            Body::Density(f) => Some(f.support),
            Body::Mixture(parts) => {
                // the strictest of the components
                let order = [Support::CountOfTrials, Support::Count, Support::Nonnegative, Support::Real];
                order.into_iter().find(|s| parts.iter().any(|(_, f)| f.support == *s))
            }
            Body::Categorical | Body::Custom(_) => None,
        }
    }

    /// All texts of the statement with their places, for the columns they name.
    pub(super) fn texts(&self) -> Vec<(&Ast, String)> {
        let mut out: Vec<(&Ast, String)> = Vec::new();
        if let Body::Custom(ast) = &self.body {
            out.push((ast, "model.log_density".into()));
        }
        for (name, ast) in &self.lets {
            out.push((ast, format!("model.let.{name}")));
        }
        for r in &self.rows {
            if let Some(ast) = &r.curve {
                out.push((ast, format!("{}.curve", r.place)));
            }
        }
        out
    }

    /// Names in the texts that are neither parameters nor lets: columns.
    pub(super) fn columns(&self) -> Vec<String> {
        let mut own: Vec<String> = self.free.iter().map(|s| s.name.clone()).collect();
        own.extend(self.lets.iter().map(|l| l.0.clone()));
        own.extend(self.rows.iter().filter(|r| r.curve.is_none()).map(|r| r.name.to_string()));
        let mut out = Vec::new();
        for (ast, _) in self.texts() {
            for (name, _) in ast.names() {
                let text = name.to_string();
                if let Some(column) = name.as_single()
                    && !own.contains(&text)
                    && !out.iter().any(|c| c == column)
                {
                    out.push(column.to_string());
                }
            }
        }
        out
    }
}

fn body(model: &Model) -> Result<Body, LikelihoodError> {
    match model.family.as_str() {
        "categorical" => Ok(Body::Categorical),
        "custom" => match &model.log_density {
            Some(text) => Ok(Body::Custom(parse(text, "model.log_density")?)),
            None => Err(LikelihoodError::statement(
                "model",
                "custom needs a log_density",
                "write log_density = \"...\" over columns and parameters",
            )),
        },
        "mixture" => {
            if model.components.is_empty() {
                return Err(LikelihoodError::statement(
                    "model",
                    "a mixture needs components",
                    "write a [[model.component]] table for each, with name and family",
                ));
            }
            let mut parts: Vec<(Name, &'static Family)> = Vec::new();
            for (k, c) in model.components.iter().enumerate() {
                let place = format!("model.component.{k}.family");
                let Some(f) = Family::named(&c.family) else {
                    return Err(unknown_family(&c.family, &place, FAMILIES.iter().map(|f| f.name).collect()));
                };
                if parts.iter().any(|p| p.0 == Name::single(c.name.as_str())) {
                    return Err(LikelihoodError::statement(
                        format!("model.component.{k}.name"),
                        format!("two components are called {}", c.name),
                        "give each its own name",
                    ));
                }
                parts.push((Name::single(c.name.as_str()), f));
            }
            Ok(Body::Mixture(parts))
        }
        name => match Family::named(name) {
            Some(f) => Ok(Body::Density(f)),
            None => {
                let mut all: Vec<&str> = FAMILIES.iter().map(|f| f.name).collect();
                all.extend(["categorical", "mixture", "custom"]);
                Err(unknown_family(name, "model.family", all))
            }
        },
    }
}

fn unknown_family(name: &str, place: &str, all: Vec<&str>) -> LikelihoodError {
    let near = nearest(name, all.iter().copied()).map(|n| format!("nearest name: {n}"));
    let advice = near.unwrap_or_else(|| format!("there are {}", all.join(", ")));
    LikelihoodError::statement(place, format!("no family is called {name}"), advice)
}

fn no_parameter<'a>(name: &str, place: &str, known: impl Iterator<Item = &'a str>) -> LikelihoodError {
    let names: Vec<&str> = known.collect();
    let near = nearest(name, names.iter().copied()).map(|n| format!("nearest name: {n}"));
    let advice = near.unwrap_or_else(|| format!("there are {}", names.join(", ")));
    LikelihoodError::statement(place, format!("no parameter is called {name}"), advice)
}

/// Whether a name is LEVEL.NAME for one of the names (the level is checked against the data later).
fn is_of_level(name: &str, names: &[&str], model: &Model) -> bool {
    model.per.is_some()
        && Name::parse(name)
            .is_ok_and(|n| n.pieces.len() == 2 && names.iter().any(|m| n.pieces[1].text.as_deref() == Some(m)))
}

fn entry<'m>(
    name: Name,
    about: &'static RowParameter,
    setting: Option<&'m Setting>,
    place: String,
    component: Option<usize>,
) -> Result<RowEntry<'m>, LikelihoodError> {
    let curve = match setting.map(|s| &s.form) {
        Some(Form::Curve(text)) => Some(parse(text, &format!("{place}.curve"))?),
        _ => None,
    };
    Ok(RowEntry { name, about, setting, place, curve, component })
}
