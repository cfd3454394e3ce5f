//! A model statement resolved: which density, which row parameters, which free ones.

use super::LikelihoodError;
use super::compose::has_terms;
use super::model::{Form, Model, Setting};
use crate::expr::{Ast, Name, nearest, parse_expression};
use crate::family::composite::{Group, Layout, Made};
use crate::family::{COMPOSITES, Composite, FAMILIES, Family, Given, Link, RowParameter, Support};
use crate::math::Range;

/// The density of a row.
#[derive(Debug)]
pub(super) enum Body {
    /// A family of the table.
    Density(&'static Family),
    /// A family whose row parameters are made from the data, for the layout found.
    Composite(&'static Composite, Layout, Made),
    /// Components with their families.
    Mixture(Vec<(Name, &'static Family)>),
    /// The user's formula.
    Custom(Ast),
}

/// What a family says of a row parameter.
#[derive(Debug, Clone)]
pub(super) struct About {
    pub(super) range: Range,
    pub(super) links: &'static [Link],
    pub(super) meaning: String,
    pub(super) given: Given,
    /// Whether terms may have an intercept.
    pub(super) intercept: bool,
}

impl From<&RowParameter> for About {
    fn from(p: &RowParameter) -> About {
        About { range: p.range, links: p.links, meaning: p.meaning.into(), given: p.given, intercept: true }
    }
}

/// A row parameter with what the study says of it.
#[derive(Debug)]
pub(super) struct RowEntry<'m> {
    /// `mean`, `north.mean` in a mixture, `share.north` of labels.
    pub(super) name: Name,
    pub(super) about: About,
    pub(super) setting: Option<&'m Setting>,
    /// Key in the setting's lists, where the setting speaks of several row parameters.
    pub(super) key: Option<String>,
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
    /// `layout` is what was found in the data for a family that is made from them; without it there is one row parameter a group.
    ///
    /// # Errors
    /// Anything in the statement that does not fit its family, with its place.
    pub(super) fn resolve(model: &'m Model, layout: Option<Layout>) -> Result<Statement<'m>, LikelihoodError> {
        let body = body(model, layout)?;
        let mut lets = Vec::new();
        for (name, text) in &model.lets {
            lets.push((name.clone(), parse(text, &format!("model.let.{name}"))?));
        }
        let rows = rows(model, &body)?;
        check_amounts(model, &body)?;
        let has_curve = rows.iter().any(|r| r.curve.is_some());
        let mut free = Vec::new();
        let mut known_names: Vec<String> = match &body {
            Body::Density(f) => f.parameters.iter().map(|p| p.name.to_string()).collect(),
            Body::Composite(f, ..) => f.groups.iter().map(|g| g.name.to_string()).collect(),
            Body::Mixture(_) => vec!["share".into()],
            Body::Custom(_) => Vec::new(),
        };
        if let Body::Composite(..) = &body {
            known_names.extend(rows.iter().map(|r| r.name.to_string()));
        }
        for s in &model.parameters {
            if known_names.contains(&s.name) || is_of_level(&s.name, &known_names, model) {
                continue;
            }
            let of_group = matches!(&body, Body::Composite(f, ..) if f.groups.iter().any(|g| starts(&s.name, g.name)));
            if (has_curve && !of_group) || matches!(body, Body::Custom(_)) {
                free.push(s);
                continue;
            }
            known_names.extend(match &body {
                Body::Mixture(p) => p.iter().map(|(_, f)| f.name.to_string()).collect::<Vec<_>>(),
                _ => Vec::new(),
            });
            return Err(no_parameter(&s.name, &format!("model.{}", s.name), known_names.iter().map(String::as_str)));
        }
        let free: Vec<&Setting> = {
            // LEVEL.NAME speaks of a free parameter that has a table of its own
            let names: Vec<String> = free.iter().map(|s| s.name.clone()).collect();
            free.iter().copied().filter(|s| !is_of_level(&s.name, &names, model)).collect()
        };
        Ok(Statement { body, rows, free, lets })
    }

    /// What the response may be: one of these supports; empty where any value may stand.
    pub(super) fn supports(&self) -> Vec<Support> {
        match &self.body {
            Body::Density(f) => vec![f.support],
            Body::Mixture(parts) => parts.iter().map(|(_, f)| f.support).collect(),
            Body::Composite(..) | Body::Custom(_) => Vec::new(),
        }
    }

    /// Whether the response counts, so that both ends of an interval belong to it.
    pub(super) fn counts(&self) -> bool {
        let supports = self.supports();
        supports.iter().any(|s| s.is_count())
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

fn body(model: &Model, layout: Option<Layout>) -> Result<Body, LikelihoodError> {
    if let Some(f) = Composite::named(&model.family) {
        let Some(layout) = layout else {
            return Ok(Body::Composite(f, Layout::default(), Made::default()));
        };
        let made = (f.make)(&layout);
        return Ok(Body::Composite(f, layout, made));
    }
    match model.family.as_str() {
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
                    let all = FAMILIES.iter().map(|f| f.name).collect();
                    return Err(unknown_family(&c.family, &place, all));
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
            Some(f) if f.support.is_lump() => Err(LikelihoodError::statement(
                "model.family",
                format!("{name} has nothing to estimate by itself"),
                "use it as the family of a component of a mixture, for values that come up too often",
            )),
            Some(f) => Ok(Body::Density(f)),
            None => {
                let mut all: Vec<&str> = FAMILIES.iter().map(|f| f.name).collect();
                all.extend(COMPOSITES.iter().map(|f| f.name));
                all.extend(["mixture", "custom"]);
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
fn is_of_level(name: &str, names: &[String], model: &Model) -> bool {
    model.per.is_some()
        && Name::parse(name).is_ok_and(|n| {
            n.pieces.len() >= 2 && {
                let rest = Name { pieces: n.pieces[1..].to_vec() }.to_string();
                names.contains(&rest)
            }
        })
}

/// Whether the first piece of a name is this one.
fn starts(name: &str, first: &str) -> bool {
    Name::parse(name).is_ok_and(|n| n.pieces[0].text.as_deref() == Some(first))
}

/// The row parameters with what the study says of each.
fn rows<'m>(model: &'m Model, body: &Body) -> Result<Vec<RowEntry<'m>>, LikelihoodError> {
    let mut rows = Vec::new();
    let of_model = |name: &str| model.parameters.iter().find(|s| s.name == name);
    match body {
        Body::Density(f) => {
            for p in f.parameters {
                let place = format!("model.{}", p.name);
                rows.push(entry(Name::single(p.name), p.into(), of_model(p.name), None, place, None)?);
            }
        }
        Body::Composite(f, _, made) => {
            let about = |group: &Group, meaning: &str| About {
                range: group.range,
                links: group.links,
                meaning: meaning.into(),
                given: group.known.map_or(Given::Estimated, Given::KnownAs),
                intercept: group.intercept,
            };
            for piece in &made.parameters {
                let group = &f.groups[piece.group];
                let name = f.name_of(piece);
                let key = (!piece.key.pieces.is_empty()).then(|| piece.key.to_string());
                let own = key.as_ref().and_then(|_| of_model(&name.to_string()));
                let place = format!("model.{}", own.map_or(group.name, |s| &s.name));
                let (setting, key) = match own {
                    Some(s) => (Some(s), None),
                    None => (of_model(group.name), key),
                };
                rows.push(entry(name, about(group, &piece.meaning), setting, key, place, None)?);
            }
            if made.parameters.is_empty() {
                // before the data are read: what the study says of groups and of their parts
                for group in f.groups {
                    for s in model.parameters.iter().filter(|s| starts(&s.name, group.name)) {
                        let name = Name::parse(&s.name).unwrap_or_else(|_| Name::single(group.name));
                        rows.push(entry(name, about(group, ""), Some(s), None, format!("model.{}", s.name), None)?);
                    }
                }
            }
        }
        Body::Mixture(parts) => {
            for (k, (name, f)) in parts.iter().enumerate() {
                let settings = &model.components[k].parameters;
                for p in f.parameters {
                    let setting = settings.iter().find(|s| s.name == p.name);
                    let place = format!("model.component.{k}.{}", p.name);
                    rows.push(entry(name.clone().dot(p.name), p.into(), setting, None, place, Some(k))?);
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
        Body::Custom(_) => {}
    }
    Ok(rows)
}

/// Amounts that no formula of the family names are mistakes, and so is one that is missing where it is needed.
fn check_amounts(model: &Model, body: &Body) -> Result<(), LikelihoodError> {
    let named: Vec<&str> = match body {
        Body::Density(f) => f.amounts.to_vec(),
        Body::Mixture(parts) => parts.iter().flat_map(|(_, f)| f.amounts.iter().copied()).collect(),
        _ => Vec::new(),
    };
    let given = [
        ("exposure", model.exposure.is_some()),
        ("trials", model.trials.is_some()),
        ("successes", model.successes.is_some()),
        ("failures", model.failures.is_some()),
    ];
    for (what, there) in given {
        if there && !named.contains(&what) {
            return Err(LikelihoodError::statement(
                format!("model.{what}"),
                format!("{} has no {what}", model.family),
                "take it out, or choose another family",
            ));
        }
        if !there && named.contains(&what) && (what == "successes" || what == "failures") {
            return Err(LikelihoodError::statement(
                "model",
                format!("{} needs {what}: a column or a number", model.family),
                format!("write {what} = \"COLUMN\" under [model]"),
            ));
        }
    }
    if let Body::Mixture(parts) = body {
        for (k, (c, (_, f))) in model.components.iter().zip(parts).enumerate() {
            for (what, there) in [("exposure", c.exposure.is_some()), ("trials", c.trials.is_some())] {
                if there && !f.amounts.contains(&what) {
                    return Err(LikelihoodError::statement(
                        format!("model.component.{k}.{what}"),
                        format!("{} has no {what}", f.name),
                        "take it out, or choose another family",
                    ));
                }
            }
        }
    }
    Ok(())
}

fn entry<'m>(
    name: Name,
    about: About,
    setting: Option<&'m Setting>,
    key: Option<String>,
    place: String,
    component: Option<usize>,
) -> Result<RowEntry<'m>, LikelihoodError> {
    let curve = match setting.map(|s| &s.form) {
        Some(Form::Curve(text)) => Some(parse(text, &format!("{place}.curve"))?),
        _ => None,
    };
    if about.links.is_empty() && has_terms(setting.map(|s| &s.form)) {
        return Err(LikelihoodError::statement(
            format!("{place}.terms"),
            format!("{name} takes no terms"),
            "make it one number, or write a curve",
        ));
    }
    Ok(RowEntry { name, about, setting, key, place, curve, component })
}
