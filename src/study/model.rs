//! `[model]`: what is modelled, by which family, with which parameters.

use super::component::components;
use super::fault::Fault;
use super::node::{Node, Table, Value};
use super::parameter;
use crate::likelihood::Model;
use crate::likelihood::model::{Amount, Event, Response};

/// Keys of `[model]` that are not parameters. All others that hold a table are.
pub const KEYS: &[&str] = &[
    "family",
    "response",
    "response_lower",
    "response_upper",
    "exposure",
    "trials",
    "event",
    "per",
    "log_density",
    "let",
    "component",
];

/// Keys whose work is not done yet, and what to do meanwhile.
const LATER: &[(&str, &str)] = &[
    ("above", "truncation from below"),
    ("below", "truncation from above"),
    ("support", "a support for custom densities"),
];

/// Reads `[model]`.
pub fn model(table: &Table) -> Result<Model, Fault> {
    if let Some((entry, later)) = LATER.iter().find_map(|(k, what)| Some((table.get(k)?, what))) {
        return Err(Fault::at(entry.at, format!("this version does not know {later} yet"))
            .advise(format!("take {} out of [model]", entry.key)));
    }
    let text = |key: &str, of: &str| table.node(key).map(|n| n.text(key, of)).transpose();
    let Some(family) = text("family", "the name of a family")? else {
        return Err(Fault::of_all("the study names no family")
            .advise("add family = \"...\" under [model], or --family NAME; guyline families lists them"));
    };
    let per = text("per", "a column")?;
    let mut model = Model {
        response: response(table)?,
        exposure: text("exposure", "a column")?,
        trials: table.node("trials").map(|n| amount(n, "trials")).transpose()?,
        event: event(table)?,
        log_density: text("log_density", "an expression")?,
        components: table.node("component").map(components).transpose()?.unwrap_or_default(),
        ..Model::default()
    };
    if let Some(node) = table.node("let") {
        for entry in &node.table("let", "named expressions")?.0 {
            model.lets.push((entry.key.clone(), piece(&entry.key, &entry.node)?));
        }
    }
    for entry in table.0.iter().filter(|e| !KEYS.contains(&e.key.as_str())) {
        let settings = parameter::settings(entry, per.is_some())?;
        if let Some(name) = model.lets.iter().map(|l| &l.0).find(|n| **n == entry.key) {
            return Err(Fault::at(
                entry.at,
                format!("two things are called {name}: a parameter and a piece in [model.let]"),
            )
            .advise("rename one of them"));
        }
        model.parameters.extend(settings);
    }
    if let (false, Some(node)) = (family == "mixture", table.get("component")) {
        return Err(Fault::at(node.at, format!("components belong to the family mixture, not to {family}"))
            .advise("write family = \"mixture\", or take the components out"));
    }
    if let (true, Some(node)) = (family != "custom", table.get("log_density")) {
        return Err(Fault::at(node.at, format!("log_density belongs to the family custom, not to {family}"))
            .advise("write family = \"custom\", or take log_density out"));
    }
    if model.response == Response::None && family != "custom" {
        return Err(Fault::of_all(format!("{family} needs a response, and the study names none"))
            .advise("add response = \"COLUMN\" under [model], or --response COLUMN"));
    }
    (model.family, model.per) = (family, per);
    Ok(model)
}

/// An expression; a number counts as one.
pub fn piece(key: &str, node: &Node) -> Result<String, Fault> {
    match &node.value {
        Value::Number(_, text) => Ok(text.clone()),
        _ => node.text(key, "an expression"),
    }
}

/// A column or a number.
pub fn amount(node: &Node, key: &str) -> Result<Amount, Fault> {
    match &node.value {
        Value::Number(..) => Ok(Amount::Number(node.number(key)?)),
        _ => Ok(Amount::Column(node.text(key, "a column or a number")?)),
    }
}

fn response(table: &Table) -> Result<Response, Fault> {
    let (lower, upper) = (table.get("response_lower"), table.get("response_upper"));
    match (table.get("response"), lower, upper) {
        (Some(_), Some(end), _) | (Some(_), _, Some(end)) => {
            Err(Fault::at(end.at, format!("the response is one column, or two ends: not response and {}", end.key))
                .advise("keep response, or response_lower with response_upper"))
        }
        (None, Some(l), Some(u)) => Ok(Response::Ends {
            lower: l.node.text("response_lower", "a column")?,
            upper: u.node.text("response_upper", "a column")?,
        }),
        (None, Some(one), None) | (None, None, Some(one)) => {
            let other = if one.key == "response_lower" { "response_upper" } else { "response_lower" };
            Err(Fault::at(one.at, format!("{} needs {other} beside it", one.key))
                .advise("an open end is an empty cell in that column"))
        }
        (None, None, None) => Ok(Response::None),
        (Some(entry), None, None) => match &entry.node.value {
            Value::Text(_) => Ok(Response::Column(entry.node.text("response", "a column")?)),
            Value::List(list) if !list.is_empty() => Ok(Response::Labels(entry.node.texts("response", "columns")?)),
            Value::List(_) => Err(Fault::at(entry.node.at, "response is an empty list").advise("name its columns")),
            _ => Err(entry.node.wrong("response", "a column or a list of columns")),
        },
    }
}

fn event(table: &Table) -> Result<Option<Event>, Fault> {
    let Some(node) = table.node("event") else { return Ok(None) };
    let event = match &node.value {
        Value::Text(_) => Event { column: node.text("event", "a column")?, seen: None },
        Value::Table(t) => {
            t.only("event", &["column", "seen"])?;
            let Some(column) = t.node("column") else {
                return Err(
                    Fault::at(node.at, "event names no column").advise("write { column = \"...\", seen = \"...\" }")
                );
            };
            let seen = match t.node("seen") {
                Some(Node { value: Value::Number(_, text), .. }) => Some(text.clone()),
                Some(n) => Some(n.text("seen", "a label")?),
                None => None,
            };
            Event { column: column.text("column", "a column")?, seen }
        }
        _ => return Err(node.wrong("event", "a column, or { column = \"...\", seen = \"...\" }")),
    };
    if let (None, Some(entry)) = (table.get("response"), table.get("event")) {
        return Err(Fault::at(entry.at, "event needs response: the column of times or values seen so far")
            .advise("add response = \"COLUMN\""));
    }
    Ok(Some(event))
}
