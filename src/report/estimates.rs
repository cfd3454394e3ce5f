//! The lines of estimates: parameter, low, value, high, standard error.

use super::Document;
use super::number::short;
use super::words::wrap;
use crate::infer::Estimate;
use crate::solve::End;

/// Names wider than this stand on a line of their own.
const NAME: usize = 44;

pub(super) fn section(document: &Document) -> String {
    let block = &document.outcome.restricted;
    let question = if block.multipliers.is_empty() {
        "What are the estimates?\n"
    } else {
        "What are the estimates, with every restriction imposed?\n"
    };
    let mut out = String::from(question);
    out.push_str(&lines("parameter", &block.estimates));
    if !block.quantities.is_empty() {
        out.push('\n');
        out.push_str(&lines("quantity", &block.quantities));
    }
    let confidence = short(100.0 * document.outcome.confidence, 4);
    let explain = match &block.reason {
        Some(reason) => format!("There are no standard errors: {reason}."),
        None => format!("Low and high enclose {confidence} percent, by the standard error."),
    };
    out.push_str(&wrap(&explain, 2, false));
    out
}

fn lines(what: &str, estimates: &[Estimate]) -> String {
    let longest = estimates.iter().map(|e| e.name.chars().count()).filter(|&n| n <= NAME).max().unwrap_or(0);
    let name = longest.max(what.len());
    let cells: Vec<[String; 4]> = estimates.iter().map(cells).collect();
    let width = |column: usize, head: &str| {
        cells.iter().map(|c| c[column].chars().count()).chain([head.len()]).max().unwrap_or(0) + 2
    };
    let heads = ["low", "value", "high", "standard error"];
    let widths: Vec<usize> = (0..4).map(|i| width(i, heads[i])).collect();
    let row = |first: &str, cells: [&str; 4]| {
        let cells = cells.iter().zip(&widths).fold(String::new(), |out, (cell, w)| out + &format!("{cell:>w$}"));
        format!("  {first:<name$}{cells}").trim_end().to_string() + "\n"
    };
    let mut out = row(what, heads);
    for (e, c) in estimates.iter().zip(&cells) {
        let cells = [c[0].as_str(), c[1].as_str(), c[2].as_str(), c[3].as_str()];
        if e.name.chars().count() > name {
            out.push_str(&format!("  {}\n", e.name));
            out.push_str(&row("", cells));
        } else {
            out.push_str(&row(&e.name, cells));
        }
        if let Some(end) = e.edge {
            let end = if end == End::Lower { "lower" } else { "upper" };
            out.push_str(&format!("  {:name$}  on the {end} end of its range and held there\n", ""));
        }
    }
    out
}

/// The four numbers of one line, with the decimals that give the standard error four digits.
fn cells(e: &Estimate) -> [String; 4] {
    let blank = String::new;
    let (Some(se), Some(low), Some(high)) = (e.se, e.lower, e.upper) else {
        return [blank(), short(e.value, 6), blank(), "none".to_string()];
    };
    if se == 0.0 {
        return [blank(), short(e.value, 6), blank(), "0, fixed".to_string()];
    }
    let largest = e.value.abs().max(low.abs()).max(high.abs());
    let decimals = 3 - se.log10().floor() as i32;
    if largest < 1e7 && decimals <= 8 {
        let decimals = decimals.max(0) as usize;
        let plain = |x: f64| format!("{x:.decimals$}");
        [plain(low), plain(e.value), plain(high), plain(se)]
    } else {
        [short(low, 6), short(e.value, 6), short(high, 6), short(se, 4)]
    }
}
