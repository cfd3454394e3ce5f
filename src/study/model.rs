//! `[model]`: what is modelled, by which family, with which parameters.

use super::component::components;
use super::fault::Fault;
use super::node::{Node, Table, Value};
use super::parameter;
use crate::family::Composite;
use crate::likelihood::Model;
use crate::likelihood::model::{Amount, Event, Response, Values};

/// Keys of `[model]` that are not parameters. All others that hold a table are.
pub const KEYS: &[&str] = &[
    "family",
    "response",
    "response_lower",
    "response_upper",
    "exposure",
    "trials",
    "successes",
    "failures",
    "above",
    "below",
    "support",
    "event",
    "per",
    "log_density",
    "let",
    "component",
];

/// Reads `[model]`.
pub fn model(table: &Table) -> Result<Model, Fault> {
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
        successes: table.node("successes").map(|n| amount(n, "successes")).transpose()?,
        failures: table.node("failures").map(|n| amount(n, "failures")).transpose()?,
        above: table.node("above").map(|n| amount(n, "above")).transpose()?,
        below: table.node("below").map(|n| amount(n, "below")).transpose()?,
        support: support(table)?,
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
        // a part of a group that the data make: share.north, alpha.clay
        let group = Composite::named(&family).is_some_and(|f| f.groups.iter().any(|g| g.name == entry.key));
        let settings = parameter::settings(entry, per.is_some(), group)?;
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
    if let (true, Some(entry)) = (family != "custom", table.get("support")) {
        return Err(Fault::at(entry.at, format!("support belongs to the family custom; {family} has its own"))
            .advise("write family = \"custom\", or take support out"));
    }
    if let (true, Some(entry)) = (family == "custom", table.get("above").or(table.get("below"))) {
        return Err(Fault::at(
            entry.at,
            format!("{} is for families with a distribution function, not for custom", entry.key),
        )
        .advise("write the condition into log_density"));
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

/// `[model.support]`: for each variable a list of values, a text `"FROM..TO"` of whole numbers (either may be left out), or an
/// interval as in written mathematics.
fn support(table: &Table) -> Result<Vec<(String, Values)>, Fault> {
    let Some(node) = table.node("support") else { return Ok(Vec::new()) };
    let mut out = Vec::new();
    for entry in &node.table("support", "the values that each variable takes")?.0 {
        let advice = "write y = [0, 1], y = \"0..\", y = \"0..12\" or y = \"(-inf, inf)\"";
        let wrong = |why: String| Err(Fault::at(entry.node.at, why).advise(advice));
        let values = match &entry.node.value {
            Value::List(list) if !list.is_empty() => {
                Values::List(list.iter().map(|n| n.number(&entry.key)).collect::<Result<_, _>>()?)
            }
            Value::Text(text) => match text.split_once("..") {
                Some((from, to)) => {
                    let end = |t: &str, open: f64| match t.trim() {
                        "" => Some(open),
                        t => t.parse::<f64>().ok().filter(|x| x.fract() == 0.0),
                    };
                    match (end(from, f64::NEG_INFINITY), end(to, f64::INFINITY)) {
                        (Some(a), Some(b)) if a <= b && (a.is_finite() || b.is_finite()) => Values::Whole(a, b),
                        _ => return wrong(format!("{text} is no range of whole numbers with one end at least")),
                    }
                }
                None => {
                    let r = parameter::range(&entry.node)?;
                    Values::Interval(r.low, r.high)
                }
            },
            _ => return wrong(format!("the support of {} is {}", entry.key, entry.node.kind())),
        };
        out.push((entry.key.clone(), values));
    }
    Ok(out)
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
            Value::List(list) if !list.is_empty() => Ok(Response::Several(entry.node.texts("response", "columns")?)),
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
