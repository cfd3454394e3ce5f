//! `[maintained]`, `[tested]`, `[quantities]`, and the restrictions of the command line.

use super::fault::Fault;
use super::node::Table;
use super::place::Places;
use super::source::{At, Sources};
use super::with::{Overlay, command_line};
use crate::expr::{Name, nearest};
use crate::restriction::{Draft, Role};

/// An expression whose value is wanted at both fits.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Quantity {
    /// Its name.
    pub name: String,
    /// The expression.
    pub text: String,
    /// Its place, `quantities.NAME`.
    pub place: String,
}

/// What is read here.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Read {
    /// Restrictions: those of the study in the order maintained, tested, then those of the command line.
    pub drafts: Vec<Draft>,
    /// Quantities in the order of the study.
    pub quantities: Vec<Quantity>,
    /// `--drop` names that no draft carries: names of links of a chain, perhaps.
    pub drop: Vec<String>,
}

/// Reads all restrictions and quantities. `dropped` are the names of `--drop` with the places they were written at.
pub fn read(root: &Table, overlay: &Overlay, dropped: &[(String, At)], places: &mut Places) -> Result<Read, Fault> {
    let mut out = Read::default();
    let mut seen: Vec<(String, At)> = Vec::new();
    for (key, role) in [("maintained", Role::Maintained), ("tested", Role::Tested)] {
        let Some(node) = root.node(key) else { continue };
        for entry in &node.table(key, "equations, NAME = \"LEFT = RIGHT\"")?.0 {
            let text = entry.node.text(&entry.key, "an equation, \"LEFT = RIGHT\"")?;
            once(&mut seen, &entry.key, entry.at, places)?;
            let place = format!("{key}.{}", entry.key);
            out.drafts.push(Draft { name: Some(entry.key.clone()), role, text, place });
        }
    }
    for (name, at) in dropped {
        let before = out.drafts.len();
        out.drafts.retain(|d| d.name.as_deref() != Some(name));
        seen.retain(|s| s.0 != *name);
        if out.drafts.len() == before {
            let base = name.rsplit_once('.').map(|b| b.0);
            if !out.drafts.iter().any(|d| d.name.as_deref().is_some_and(|n| base == Some(n))) {
                let names = out.drafts.iter().filter_map(|d| d.name.as_deref());
                let fault = Fault::at(*at, format!("no restriction is called {name}"));
                return Err(match nearest(name, names) {
                    Some(near) => fault.advise(format!("nearest name: {near}")),
                    None => fault.advise("--drop takes the name a restriction has under [maintained] or [tested]"),
                });
            }
            out.drop.push(name.clone());
        }
    }
    for (option, role, texts) in
        [("--maintained", Role::Maintained, &overlay.maintained), ("--tested", Role::Tested, &overlay.tested)]
    {
        let mut unnamed = 0;
        for text in texts {
            let source = command_line(&mut places.sources, option, text);
            let (name, from) = named(text);
            let at = At { source, start: from, end: text.len(), quoted: false };
            let name = match name {
                Some(name) => name,
                None => loop {
                    unnamed += 1;
                    let name = format!("{}_{unnamed}", &option[2..]);
                    if !seen.iter().any(|s| s.0 == name) {
                        break name;
                    }
                },
            };
            if text[from..].trim().is_empty() {
                return Err(
                    Fault::at(at, "there is no equation in it").advise(format!("write {option} 'NAME: LEFT = RIGHT'"))
                );
            }
            once(&mut seen, &name, At { start: 0, ..at }, places)?;
            let place = format!("command line.{option}.{name}");
            places.note(place.as_str(), at);
            out.drafts.push(Draft { name: Some(name), role, text: text[from..].to_owned(), place });
        }
    }
    if let Some(node) = root.node("quantities") {
        for entry in &node.table("quantities", "expressions, NAME = \"EXPRESSION\"")?.0 {
            let text = super::model::piece(&entry.key, &entry.node)?;
            out.quantities.push(Quantity { name: entry.key.clone(), text, place: format!("quantities.{}", entry.key) });
        }
    }
    Ok(out)
}

/// The names of `--drop`, each as a source of its own.
pub fn dropped(names: &[String], sources: &mut Sources) -> Vec<(String, At)> {
    let place = |name: &String| {
        let source = command_line(sources, "--drop", name);
        (name.clone(), At { source, start: 0, end: name.len(), quoted: false })
    };
    names.iter().map(place).collect()
}

fn once(seen: &mut Vec<(String, At)>, name: &str, at: At, places: &Places) -> Result<(), Fault> {
    if let Some((_, first)) = seen.iter().find(|s| s.0 == name) {
        let other = places.sources.show(Some(*first), "", None).place;
        return Err(Fault::at(at, format!("two restrictions are called {name}; the other is at {other}"))
            .advise(format!("rename one of them, or leave the study's out with --drop {name}")));
    }
    seen.push((name.to_owned(), at));
    Ok(())
}

/// `NAME: EQUATION`: the name, if one is given, and where the equation starts. A colon that joins a product of terms
/// stands inside a dotted name, so what is before it is not one piece.
fn named(text: &str) -> (Option<String>, usize) {
    let found = text.match_indices(':').find_map(|(at, _)| {
        let name = Name::parse(text[..at].trim()).ok()?.as_single()?.to_owned();
        Some((name, text.len() - text[at + 1..].trim_start().len()))
    });
    found.map_or((None, 0), |(name, at)| (Some(name), at))
}

#[cfg(test)]
mod tests {
    use super::named;

    #[test]
    fn a_name_stands_before_the_colon() {
        assert_eq!(named("same: a = b"), (Some("same".into()), 6));
        assert_eq!(named("'odd name':a = b"), (Some("odd name".into()), 11));
        assert_eq!(named("rate.kiln.middle:soak = 0"), (None, 0));
        assert_eq!(named("a = rate.soak:kiln.b"), (None, 0));
        assert_eq!(named("a = b"), (None, 0));
        assert_eq!(named("'a: b': c = d"), (Some("a: b".into()), 8));
    }
}
