//! Comparisons of items in pairs: which of two wins.

use super::composite::{Composite, Drawn, Group, Layout, Made, Piece, Reads, Summary, plus, written};
use crate::math::{Random, Range, special};

/// The family.
pub const PAIRED_COMPARISON: Composite = Composite {
    name: "paired_comparison",
    response: "two columns of labels: the item that won, the item that lost",
    reads: Reads::Contest,
    groups: &[Group {
        name: "strength",
        pattern: "ITEM",
        range: Range::ALL,
        links: &[],
        intercept: true,
        known: None,
        meaning: "strength of the item; the difference of two is the log odds that the first wins",
    }],
    maintained: "sum(strength.*) = 0",
    formula: "log_logistic(strength.WINNER - strength.LOSER)",
    information: "(difference, difference): logistic(difference) * logistic(-difference); closed form",
    source: "Bradley and Terry (1952), Biometrika 39",
    make,
    start,
    sample,
    concave: true,
};

fn make(layout: &Layout) -> Made {
    let strength = |k: usize| written("strength", &layout.pieces[k]);
    let n = layout.pieces.len();
    let parameter = |k: usize| Piece {
        group: 0,
        key: layout.pieces[k].clone(),
        meaning: format!("strength of {} beside the mean of all", layout.pieces[k]),
    };
    let difference = plus((0..n).map(|k| format!("{} * {}", written("sign", &layout.pieces[k]), strength(k))));
    let own = ("difference".to_string(), "difference".to_string());
    Made {
        parameters: (0..n).map(parameter).collect(),
        lets: vec![("difference".into(), difference)],
        log_density: "log_logistic(difference)".into(),
        information: vec![(own.0, own.1, "logistic(difference) * logistic(-difference)".into())],
        equations: vec!["sum(strength.*) = 0".into()],
    }
}

fn start(layout: &Layout, summary: &Summary) -> Vec<f64> {
    let scale = summary.counts.iter().fold(1.0, |m: f64, c| m.max(c.abs()));
    let mean = summary.counts.iter().sum::<f64>() / layout.pieces.len().max(1) as f64;
    summary.counts.iter().map(|c| (c - mean) / scale).collect()
}

fn sample(_: &Layout, values: &[f64], random: &mut Random) -> Drawn {
    // the values are those of the first and of the second item
    Drawn::Won(random.uniform() < special::logistic(values[0] - values[1]))
}
