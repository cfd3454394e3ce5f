//! The tables that speak about parameters: terms, links, curves, starting and known values, ranges.

use super::fault::Fault;
use super::node::{Entry, Node, Table, Value, listed, unknown};
use crate::expr::Name;
use crate::likelihood::model::{Form, Setting, Terms};
use crate::math::Range;

/// Keys of a parameter's table.
pub const KEYS: &[&str] =
    &["terms", "link", "intercept", "coding", "offset", "curve", "start", "known", "range", "shared"];

/// Reads the table of a parameter; with `per` one table may hold a table for each parameter of one level, and a `group` that the
/// data make may hold a table for each of its parts.
pub fn settings(entry: &Entry, per: bool, group: bool) -> Result<Vec<Setting>, Fault> {
    let name = Name::single(entry.key.as_str());
    let table = match &entry.node.value {
        Value::Table(table) => table,
        Value::Number(_, text) => {
            return Err(Fault::at(entry.node.at, format!("it is not said what {text} is to {}", entry.key)).advise(
                format!(
                    "write {0} = {{ known = {text} }} to hold it there, {0} = {{ start = {text} }} to start there",
                    entry.key
                ),
            ));
        }
        _ => {
            let keys = [super::model::KEYS, &["let"]].concat();
            return Err(unknown(entry, "[model]", &keys));
        }
    };
    let level = holds_tables(table);
    if level && (per || group) {
        let mut out = Vec::new();
        for e in &table.0 {
            parts(&name.clone().dot(e.key.as_str()), e, per, &mut out)?;
        }
        return Ok(out);
    }
    if level {
        let inner = &table.0[0];
        return Err(unknown(inner, &format!("[model.{}]", entry.key), KEYS).advise(
            "a parameter's table is [model.NAME]; [model.LEVEL.NAME] speaks of one level and needs per in [model]",
        ));
    }
    Ok(vec![setting(&name, &entry.key, &entry.node, per)?])
}

/// Whether a table holds nothing but tables under names that are no settings.
fn holds_tables(table: &Table) -> bool {
    !table.0.is_empty()
        && table.0.iter().all(|e| !KEYS.contains(&e.key.as_str()) && matches!(e.node.value, Value::Table(_)))
}

fn parts(name: &Name, entry: &Entry, per: bool, out: &mut Vec<Setting>) -> Result<(), Fault> {
    match &entry.node.value {
        Value::Table(table) if holds_tables(table) => {
            for e in &table.0 {
                parts(&name.clone().dot(e.key.as_str()), e, per, out)?;
            }
        }
        _ => out.push(setting(name, &entry.key, &entry.node, per)?),
    }
    Ok(())
}

/// Reads the table of one parameter.
pub fn setting(name: &Name, key: &str, node: &Node, per: bool) -> Result<Setting, Fault> {
    let table = node.table(key, "settings")?;
    table.only(&format!("[model.{key}]"), KEYS)?;
    let mut setting = Setting { name: name.to_string(), form: form(table)?, ..Setting::default() };
    if let Some(shared) = table.node("shared") {
        setting.shared = shared.truth("shared")?;
        if setting.shared && !per {
            return Err(Fault::at(shared.at, "shared says: one for all levels, but the model has no per")
                .advise("name the column of levels as per in [model], or take shared out"));
        }
    }
    if let (Form::Curve(_), Some(e)) =
        (&setting.form, table.0.iter().find(|e| ["start", "known", "range"].contains(&e.key.as_str())))
    {
        return Err(Fault::at(e.at, format!("{key} is a curve and has no {} of its own", e.key))
            .advise("give it to the parameters the curve is made of, each in its own table"));
    }
    let plain = matches!(setting.form, Form::Plain);
    (setting.start, setting.known) = (numbers(table, "start", plain)?, numbers(table, "known", plain)?);
    setting.range = ranges(table, plain)?;
    Ok(setting)
}

fn form(table: &Table) -> Result<Form, Fault> {
    if let (Some(curve), Some(terms)) = (table.get("curve"), table.get("terms")) {
        return Err(Fault::at(curve.at.max(terms.at), "a parameter has terms or a curve, not both"));
    }
    let Some(list) = table.node("terms") else {
        let keys = ["link", "intercept", "coding", "offset"];
        if let Some(e) = table.0.iter().find(|e| keys.contains(&e.key.as_str())) {
            return Err(Fault::at(e.at, format!("{} goes with terms, and there are none", e.key))
                .advise("add terms = [\"COLUMN\"] (or [] for an intercept alone)"));
        }
        return match table.node("curve") {
            Some(curve) => Ok(Form::Curve(super::model::piece("curve", curve)?)),
            None => Ok(Form::Plain),
        };
    };
    let intercept = table.node("intercept").map_or(Ok(true), |n| n.truth("intercept"))?;
    let terms = terms(list)?;
    if terms.is_empty() && !intercept {
        return Err(Fault::at(list.at, "there are neither terms nor an intercept")
            .advise("name a column in terms, or leave intercept out"));
    }
    let full = match table.node("coding") {
        None => false,
        Some(node) => match node.text("coding", "\"reference\" or \"full\"")?.as_str() {
            "reference" => false,
            "full" => true,
            other => {
                return Err(Fault::at(node.at, format!("coding is \"reference\" or \"full\", not {other}")));
            }
        },
    };
    let offset = match table.node("offset") {
        Some(Node { value: Value::Number(_, text), .. }) => Some(text.clone()),
        Some(node) => Some(node.text("offset", "a column or an expression")?),
        None => None,
    };
    Ok(Form::Terms(Terms { terms, link: link(table)?, intercept, full, offset }))
}

fn terms(list: &Node) -> Result<Vec<Vec<String>>, Fault> {
    let expected = "a list of columns, an inner list being a product";
    let Value::List(members) = &list.value else { return Err(list.wrong("terms", expected)) };
    let mut out: Vec<Vec<String>> = Vec::new();
    for member in members {
        let term = member.texts("a term", "column names")?;
        let sorted = |t: &Vec<String>| {
            let mut t = t.clone();
            t.sort();
            t
        };
        if term.is_empty() {
            return Err(Fault::at(member.at, "a product of no columns"));
        }
        if out.iter().any(|t| sorted(t) == sorted(&term)) {
            return Err(Fault::at(member.at, format!("the term {} is there twice", term.join(":"))));
        }
        out.push(term);
    }
    Ok(out)
}

fn link(table: &Table) -> Result<Option<String>, Fault> {
    use crate::family::Link;
    let Some(node) = table.node("link") else { return Ok(None) };
    let text = node.text("link", "the name of a link")?;
    if Link::named(&text).is_some() {
        return Ok(Some(text));
    }
    let names: Vec<_> = Link::ALL.iter().map(|l| l.text()).collect();
    let advice = match crate::expr::nearest(&text, names.iter().copied()) {
        Some(near) => format!("nearest name: {near}"),
        None => format!("links are {}", listed(&names)),
    };
    Err(Fault::at(node.at, format!("no link is called {text}")).advise(advice))
}

/// Values of `start` or `known`: one number, or a table of them by coefficient or level.
pub fn numbers(table: &Table, key: &str, plain: bool) -> Result<Vec<(Option<String>, f64)>, Fault> {
    let Some(node) = table.node(key) else { return Ok(Vec::new()) };
    leaves(node, key, plain)?.into_iter().map(|(name, n)| Ok((name, n.number(key)?))).collect()
}

/// Values of `range`, likewise.
pub fn ranges(table: &Table, plain: bool) -> Result<Vec<(Option<String>, Range)>, Fault> {
    let Some(node) = table.node("range") else { return Ok(Vec::new()) };
    leaves(node, "range", plain)?.into_iter().map(|(name, n)| Ok((name, range(n)?))).collect()
}

/// A range written as in mathematics.
pub fn range(node: &Node) -> Result<Range, Fault> {
    let text = node.text("range", "a text such as \"[0, inf)\"")?;
    Range::parse(&text).map_err(|why| {
        Fault::at(node.at, why.to_string())
            .advise("write \"[0, 1]\", \"(0, inf)\": [ takes the end in, ( leaves it out")
    })
}

/// The plain values in a node, each with the name of what it is for.
fn leaves<'a>(node: &'a Node, key: &str, plain: bool) -> Result<Vec<(Option<String>, &'a Node)>, Fault> {
    match &node.value {
        Value::Table(table) => {
            let mut out = Vec::new();
            for entry in &table.0 {
                flatten(&piece(&entry.key), &entry.node, &mut out);
            }
            Ok(out)
        }
        _ if plain => Ok(vec![(None, node)]),
        _ => Err(Fault::at(node.at, format!("with terms, {key} takes one value a coefficient"))
            .advise(format!("write {key} = {{ intercept = ..., COLUMN = ... }}"))),
    }
}

fn flatten<'a>(name: &Name, node: &'a Node, out: &mut Vec<(Option<String>, &'a Node)>) {
    match &node.value {
        Value::Table(table) => {
            for entry in &table.0 {
                flatten(&name.clone().then(&piece(&entry.key)), &entry.node, out);
            }
        }
        _ => out.push((Some(name.to_string()), node)),
    }
}

/// A key as the name it stands for: a product (`'kiln.middle:soak'`) keeps its pieces, any other is one piece.
fn piece(key: &str) -> Name {
    match Name::parse(key) {
        Ok(name) if key.contains([':', '.']) && !name.is_pattern() => name,
        _ => Name::single(key),
    }
}
