//! `[[model.component]]`: the components of a mixture.

use super::fault::Fault;
use super::model::amount;
use super::node::{Entry, Node, Table, Value, unknown};
use super::parameter;
use crate::expr::Name;
use crate::likelihood::model::{Component, Setting};

const KEYS: &[&str] = &["name", "family", "start", "known", "range", "trials", "exposure"];

/// Reads the list of components.
pub fn components(node: &Node) -> Result<Vec<Component>, Fault> {
    let expected = "a list of tables, each headed [[model.component]]";
    let Value::List(members) = &node.value else { return Err(node.wrong("component", expected)) };
    let mut out: Vec<Component> = Vec::new();
    for member in members {
        let Value::Table(table) = &member.value else { return Err(member.wrong("a component", expected)) };
        let component = component(table, member)?;
        if let (true, Some(name)) = (out.iter().any(|c| c.name == component.name), table.node("name")) {
            return Err(Fault::at(name.at, format!("two components are called {}", component.name))
                .advise("give each its own name"));
        }
        out.push(component);
    }
    Ok(out)
}

fn component(table: &Table, member: &Node) -> Result<Component, Fault> {
    // a table of its own for a parameter: terms, a curve, a link
    let own = |e: &&Entry| !KEYS.contains(&e.key.as_str()) && matches!(e.node.value, Value::Table(_));
    if let Some(e) = table.0.iter().find(|e| !own(e) && !KEYS.contains(&e.key.as_str())) {
        return Err(unknown(e, "[[model.component]]", KEYS));
    }
    let need = |key: &str, example: &str| match table.node(key) {
        Some(node) => node.text(key, "a text"),
        None => Err(Fault::at(member.at, format!("a component has no {key}")).advise(format!("add {key} = {example}"))),
    };
    let (name, family) = (need("name", "\"north\"")?, need("family", "\"normal\"")?);
    let mut parameters: Vec<Setting> = Vec::new();
    for e in table.0.iter().filter(own) {
        parameters.push(parameter::setting(&Name::single(e.key.as_str()), &e.key, &e.node, false)?);
    }
    for group in table.0.iter().filter(|e| ["start", "known", "range"].contains(&e.key.as_str())) {
        let key = group.key.as_str();
        let by_name = group.node.table(key, "values by parameter, such as { mean = 3 }")?;
        for entry in &by_name.0 {
            let at = parameters.iter().position(|s| s.name == entry.key).unwrap_or_else(|| {
                parameters.push(Setting { name: entry.key.clone(), ..Setting::default() });
                parameters.len() - 1
            });
            match key {
                "start" => parameters[at].start.push((None, entry.node.number(&entry.key)?)),
                "known" => parameters[at].known.push((None, entry.node.number(&entry.key)?)),
                _ => parameters[at].range.push((None, parameter::range(&entry.node)?)),
            }
        }
    }
    let trials = table.node("trials").map(|n| amount(n, "trials")).transpose()?;
    let exposure = table.node("exposure").map(|n| n.text("exposure", "a column")).transpose()?;
    Ok(Component { name, family, parameters, trials, exposure })
}
