//! Dirichlet distribution of shares that sum to one.

use super::Link;
use super::composite::{Composite, Drawn, Group, Layout, Made, Piece, Reads, Summary, plus, written};
use crate::math::{Random, Range};

/// The family.
pub const DIRICHLET: Composite = Composite {
    name: "dirichlet",
    response: "several columns of numbers above 0 that sum to one in each row",
    reads: Reads::Shares,
    groups: &[Group {
        name: "alpha",
        pattern: "COLUMN",
        range: Range::POSITIVE,
        links: &[Link::Log, Link::Identity],
        intercept: true,
        known: None,
        meaning: "concentration of the column; its mean share is alpha over the sum of all",
    }],
    maintained: "",
    formula: "lgamma(sum(alpha.*)) - lgamma(alpha.COLUMN) - ... + (alpha.COLUMN - 1) * log(y.COLUMN) + ...",
    information: "(alpha.A, alpha.B): polygamma(1, alpha.A) if A is B, less polygamma(1, sum(alpha.*)); closed form",
    source: "Kotz, Balakrishnan and Johnson, Continuous Multivariate Distributions, vol. 1, ch. 49",
    make,
    start,
    sample,
    concave: true,
};

fn make(layout: &Layout) -> Made {
    let alpha = |k: usize| written("alpha", &layout.pieces[k]);
    let n = layout.pieces.len();
    let mut information = Vec::new();
    for j in 0..n {
        for k in j..n {
            let own = if j == k { format!("polygamma(1, {}) ", alpha(j)) } else { String::new() };
            information.push((alpha(j), alpha(k), format!("{own}- polygamma(1, total)")));
        }
    }
    let parameter = |k: usize| Piece {
        group: 0,
        key: layout.pieces[k].clone(),
        meaning: format!("concentration of {}", layout.pieces[k]),
    };
    let less: String = (0..n).map(|k| format!(" - lgamma({})", alpha(k))).collect();
    let rows = plus((0..n).map(|k| format!("({} - 1) * log({})", alpha(k), written("y", &layout.pieces[k]))));
    Made {
        parameters: (0..n).map(parameter).collect(),
        lets: vec![("total".into(), plus((0..n).map(alpha)))],
        log_density: format!("lgamma(total){less} + {rows}"),
        information,
        equations: Vec::new(),
    }
}

fn start(_: &Layout, summary: &Summary) -> Vec<f64> {
    // Var(y) = m (1 - m) / (1 + total) in every column: the median of what they say
    let mut totals: Vec<f64> = summary
        .columns
        .iter()
        .filter(|m| m.variance > 0.0)
        .map(|m| (m.mean * (1.0 - m.mean) / m.variance - 1.0).clamp(0.1, 1e6))
        .collect();
    totals.sort_by(f64::total_cmp);
    let total = totals.get(totals.len() / 2).copied().unwrap_or(1.0);
    summary.columns.iter().map(|m| (m.mean * total).max(1e-3)).collect()
}

fn sample(_: &Layout, values: &[f64], random: &mut Random) -> Drawn {
    let drawn: Vec<f64> = values.iter().map(|&a| random.gamma(a).max(f64::MIN_POSITIVE)).collect();
    let total: f64 = drawn.iter().sum();
    Drawn::Values(drawn.iter().map(|x| x / total).collect())
}
