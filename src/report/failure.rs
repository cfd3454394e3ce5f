//! What is said when there is no trustworthy maximum: why, what to do, and the best point, which is no estimate.

use super::Document;
use super::number::{short, tiny, trimmed};
use super::words::{sentence, wrap};
use crate::solve::{Direction, Verdict};

pub(super) fn section(document: &Document) -> String {
    let block = &document.outcome.restricted;
    let c = &block.fit.certificate;
    let names: Vec<&str> = document.model.parameters.iter().map(|p| p.name.as_str()).collect();
    let mut out = String::from("Is there an answer?\n");
    out.push_str(&wrap(&format!("No trustworthy maximum was found: the verdict is '{}'.", c.verdict.text()), 2, false));
    if let Some(reason) = &c.reason {
        out.push_str(&wrap(&sentence(reason), 2, true));
    }
    for note in &c.notes {
        out.push_str(&wrap(&sentence(note), 2, true));
    }
    for direction in &c.flat {
        let line = format!("The likelihood does not change along {}.", combination(direction, &names));
        out.push_str(&wrap(&line, 2, true));
    }
    if !c.identified.is_empty() {
        out.push_str("\nWhat is known all the same?\n");
        for direction in &c.identified {
            let se = direction.se.map_or_else(String::new, |se| format!(", standard error {}", short(se, 4)));
            let line = format!("{} is {}{se}", combination(direction, &names), trimmed(direction.value, 6));
            out.push_str(&wrap(&line, 2, true));
        }
    }
    out.push_str("\nWhat can be done?\n");
    out.push_str(&wrap(advice(c.verdict), 2, false));
    out.push_str("\nWhere did the search end?\n");
    let status = format!(
        "At the point below, which is not an estimate: log-likelihood {}, restrictions met to {}, slope left {}.",
        short(block.fit.log_likelihood, 8),
        tiny(c.feasibility),
        tiny(c.stationarity)
    );
    out.push_str(&wrap(&status, 2, false));
    let width = names.iter().map(|n| n.chars().count()).filter(|&n| n <= 60).max().unwrap_or(0);
    for (name, &x) in names.iter().zip(block.fit.theta.iter()) {
        out.push_str(&format!("    {name:<width$}  {}\n", trimmed(x, 6)));
    }
    out
}

/// `0.71 a - 0.71 b`
fn combination(direction: &Direction, names: &[&str]) -> String {
    let mut out = String::new();
    for (i, &(j, weight)) in direction.weights.iter().enumerate() {
        let sign = match (i, weight < 0.0) {
            (0, false) => "",
            (0, true) => "-",
            (_, false) => " + ",
            (_, true) => " - ",
        };
        let name = names.get(j).copied().unwrap_or("?");
        let size = trimmed(weight.abs(), 3);
        out.push_str(&if size == "1" { format!("{sign}{name}") } else { format!("{sign}{size} {name}") });
    }
    out
}

fn advice(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::StrictMaximum => "",
        Verdict::Flat => {
            "The data cannot tell the parameters named above apart. Add a maintained restriction that fixes the \
             combination, give one of them a known value, or leave one out."
        }
        Verdict::Saddle => {
            "The search stands on a ridge or saddle and found no way up. Make more starts with --starts, or give starting \
             values nearer to what you expect."
        }
        Verdict::Irregular => {
            "The restrictions do not cross cleanly at this point, so multipliers need not exist. Write the one named above \
             in a simpler form that means the same (x = 0 instead of x^2 = 0)."
        }
        Verdict::Infeasible => {
            "No point meets all restrictions. Take out one of those named above with --drop, or correct its right-hand \
             side; guyline check lists them all."
        }
        Verdict::Unbounded => {
            "The likelihood keeps growing towards the end of a range or towards infinity, as when a covariate separates \
             the outcomes. Restrict the range of the parameter that runs away, or leave out what drives it there."
        }
        Verdict::Stopped => {
            "If the reason above is the data or the restrictions, mend those. If the search gave up, give starting values \
             nearer to what you expect, make more starts with --starts, or rescale columns so that parameters are of \
             ordinary size."
        }
    }
}
