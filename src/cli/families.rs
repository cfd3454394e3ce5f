//! `guyline families`.

use super::arguments::{Families, ListFormat};
use super::output::deliver;
use super::sentence::list;
use super::status::{Status, Stop};
use crate::expr::nearest;
use crate::family::listing::{ListedParameter, Listing, all};
use crate::report::listing;

/// Runs the command.
pub fn run(arguments: &Families) -> Result<Status, Stop> {
    let families = all();
    let chosen: Vec<&Listing> = match &arguments.name {
        None => families.iter().collect(),
        Some(name) => {
            let found = families.iter().find(|f| f.name == *name).ok_or_else(|| {
                let names: Vec<&str> = families.iter().map(|f| f.name.as_str()).collect();
                let advice = match nearest(name, names.iter().copied()) {
                    Some(near) => format!("nearest name: {near}"),
                    None => format!("the families are {}", list(&names)),
                };
                Stop::study(format!("no family is called {name}\n    {advice}"))
            })?;
            vec![found]
        }
    };
    let text = match (arguments.format, &arguments.name) {
        (ListFormat::Json, _) => {
            let rows: Vec<listing::Family> = chosen.iter().map(|f| row(f)).collect();
            listing::json(&rows)
        }
        (ListFormat::Text, Some(_)) => description(chosen[0]),
        (ListFormat::Text, None) => overview(&chosen),
    };
    deliver(&text, None)?;
    Ok(Status::Done)
}

fn row(family: &Listing) -> listing::Family<'_> {
    listing::Family {
        name: &family.name,
        response: &family.response,
        parameters: family.parameters.iter().map(cell).collect(),
        formula: &family.formula,
        information: &family.information,
        source: &family.source,
    }
}

fn cell(p: &ListedParameter) -> listing::Parameter<'_> {
    listing::Parameter { name: &p.name, range: &p.range, link: p.links.first().copied() }
}

fn overview(families: &[&Listing]) -> String {
    let width = families.iter().map(|f| f.name.len()).max().unwrap_or(0);
    let mut out = String::new();
    for f in families {
        let names: Vec<&str> = f.parameters.iter().map(|p| p.name.as_str()).collect();
        out += &format!("{:width$}  {}; {}\n", f.name, list(&names), f.response);
    }
    out + "\nguyline families NAME says more about one.\n"
}

fn description(family: &Listing) -> String {
    let mut out = format!("{}: {}\n", family.name, family.response);
    for p in &family.parameters {
        out += &format!("  {}\n", parameter(p));
    }
    out += &format!("log density: {}\n", family.formula);
    out += &format!("expected information: {}\n", family.information);
    out += &format!("source: {}\n", family.source);
    out
}

fn parameter(p: &ListedParameter) -> String {
    let mut out = format!("{} in {}: {}", p.name, p.range, p.meaning);
    match p.links.as_slice() {
        [] => {}
        [one] => out += &format!("; with terms through the link {one}"),
        [first, rest @ ..] => out += &format!("; with terms through the link {first}, or {}", list(rest)),
    }
    out
}
