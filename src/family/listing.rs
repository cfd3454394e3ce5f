//! Every family as a user sees it, the ones that are no single density included.

use super::composite::Group;
use super::{COMPOSITES, Composite, FAMILIES, Family, Information};

/// A family in words.
#[derive(Debug, Clone, PartialEq)]
pub struct Listing {
    /// Name in a study.
    pub name: String,
    /// The response in words.
    pub response: String,
    /// Its parameters.
    pub parameters: Vec<ListedParameter>,
    /// The formula that is computed (or what is, in words).
    pub formula: String,
    /// Its expected information.
    pub information: String,
    /// Where it is published.
    pub source: String,
}

/// A parameter in words.
#[derive(Debug, Clone, PartialEq)]
pub struct ListedParameter {
    /// Name.
    pub name: String,
    /// Natural range.
    pub range: String,
    /// Links it may have with terms, the default first.
    pub links: Vec<&'static str>,
    /// Meaning.
    pub meaning: String,
}

impl Listing {
    fn of(family: &Family) -> Listing {
        let mut information: Vec<String> = match family.information {
            Information::Closed(list) => list.iter().map(|(a, b, text)| format!("({a}, {b}): {text}")).collect(),
            Information::Computed => Vec::new(),
        };
        information.push(family.information_note.to_string());
        Listing {
            name: family.name.into(),
            response: family.response.into(),
            parameters: family
                .parameters
                .iter()
                .map(|p| ListedParameter {
                    name: p.name.into(),
                    range: p.range.to_string(),
                    links: p.links.iter().map(|l| l.text()).collect(),
                    meaning: p.meaning.into(),
                })
                .collect(),
            formula: family.log_density.into(),
            information: information.join("; "),
            source: family.source.into(),
        }
    }
}

impl Listing {
    fn made(family: &Composite) -> Listing {
        let name =
            |g: &Group| if g.pattern.is_empty() { g.name.to_string() } else { format!("{}.{}", g.name, g.pattern) };
        let mut information = vec![family.information.to_string()];
        if !family.maintained.is_empty() {
            information.push(format!("maintained: {}", family.maintained));
        }
        Listing {
            name: family.name.into(),
            response: family.response.into(),
            parameters: family
                .groups
                .iter()
                .map(|g| ListedParameter {
                    name: name(g),
                    range: g.range.to_string(),
                    links: g.links.iter().map(|l| l.text()).collect(),
                    meaning: g.meaning.into(),
                })
                .collect(),
            formula: family.formula.into(),
            information: information.join("; "),
            source: family.source.into(),
        }
    }
}

fn plain(name: &str, range: &str, meaning: &str) -> ListedParameter {
    ListedParameter { name: name.into(), range: range.into(), links: Vec::new(), meaning: meaning.into() }
}

/// All families, sorted by name within kind: of one number, made from the data, mixture and custom.
pub fn all() -> Vec<Listing> {
    let mut out: Vec<Listing> = FAMILIES.iter().map(|f| Listing::of(f)).collect();
    out.extend(COMPOSITES.iter().map(|f| Listing::made(f)));
    out.push(Listing {
        name: "mixture".into(),
        response: "that of its components".into(),
        parameters: vec![
            plain("share.NAME", "[0, 1]", "share of the component; sum(share.*) = 1 is maintained"),
            plain("NAME.PARAMETER", "as in the component's family", "parameter of the component, known or estimated"),
        ],
        formula: "log_mix(share.A, log density of A, share.B, log density of B, ...)".into(),
        information: "observed; expected on request, by sum over the support or by adaptive quadrature to 1e-9".into(),
        source: "Hathaway (1985), Annals of Statistics 13, on its maxima".into(),
    });
    out.push(Listing {
        name: "custom".into(),
        response: "whatever the formula names".into(),
        parameters: vec![plain("NAME", "as stated", "each table in [model]; needs a start")],
        formula: "log_density of the study".into(),
        information: "observed; with [model.support] expected on request, by sum over the support or by adaptive quadrature to 1e-9".into(),
        source: "the user's".into(),
    });
    out
}
