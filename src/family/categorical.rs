//! Labels with shares; with terms, the multinomial logit against the first label.

use super::Link;
use super::composite::{Composite, Drawn, Group, Layout, Made, Piece, Reads, Summary, pick, plus, written};
use crate::math::{Random, Range, special};

/// The family.
pub const CATEGORICAL: Composite = Composite {
    name: "categorical",
    response: "a column of labels, or several (every combination of their levels is a cell)",
    reads: Reads::Labels,
    groups: &[Group {
        name: "share",
        pattern: "LABEL",
        range: Range::UNIT,
        links: &[Link::Identity],
        intercept: true,
        known: None,
        meaning: "probability of the label; with terms, log of its odds against the first label",
    }],
    maintained: "without terms, sum(share.*) = 1",
    formula: "log(share.LABEL) of the label seen; with terms, share.LABEL - log_sum_exp(0, share.LABEL, ...)",
    information: "(share.LABEL, share.LABEL): 1 / share.LABEL; with terms p (1 - p) and -p q; closed form",
    source: "Aitchison and Silvey (1958), Annals of Mathematical Statistics 29; Agresti, Categorical Data Analysis, ch. 8",
    make,
    start,
    sample,
    concave: true,
};

fn make(layout: &Layout) -> Made {
    let share = |k: usize| written("share", &layout.pieces[k]);
    let seen = |k: usize| written("seen", &layout.pieces[k]);
    let n = layout.pieces.len();
    let from = usize::from(layout.terms);
    let parameters = (from..n)
        .map(|k| Piece {
            group: 0,
            key: layout.pieces[k].clone(),
            meaning: match layout.terms {
                true => format!("log odds of {} against {}", layout.pieces[k], layout.pieces[0]),
                false => format!("probability of {}", layout.pieces[k]),
            },
        })
        .collect();
    if !layout.terms {
        let levels = layout.pieces.first().map_or(1, |p| p.pieces.len());
        return Made {
            parameters,
            log_density: plus((0..n).map(|k| format!("{} * log({})", seen(k), share(k)))),
            information: (0..n).map(|k| (share(k), share(k), format!("1 / {}", share(k)))).collect(),
            equations: vec![format!("sum(share{}) = 1", ".*".repeat(levels))],
            ..Made::default()
        };
    }
    let chance = |k: usize| format!("chance.'{k}'");
    let others: Vec<String> = (1..n).map(share).collect();
    let mut lets =
        vec![("all".to_string(), format!("log_sum_exp({})", [&["0".to_string()], &others[..]].concat().join(", ")))];
    lets.extend((1..n).map(|k| (chance(k), format!("exp({} - all)", share(k)))));
    let mut information = Vec::new();
    for j in 1..n {
        for k in j..n {
            let text = match j == k {
                true => format!("{0} * (1 - {0})", chance(j)),
                false => format!("-{} * {}", chance(j), chance(k)),
            };
            information.push((share(j), share(k), text));
        }
    }
    let log_density = format!("{} - all", plus((1..n).map(|k| format!("{} * {}", seen(k), share(k)))));
    Made { parameters, lets, log_density, information, equations: Vec::new() }
}

fn start(layout: &Layout, summary: &Summary) -> Vec<f64> {
    let (total, k) = (summary.counts.iter().sum::<f64>(), summary.counts.len() as f64);
    // half a row in each cell keeps the start inside
    let share = |c: f64| (c + 0.5) / (total + 0.5 * k);
    if layout.terms {
        return summary.counts.iter().skip(1).map(|&c| libm::log(share(c) / share(summary.counts[0]))).collect();
    }
    summary.counts.iter().map(|&c| share(c)).collect()
}

fn sample(layout: &Layout, values: &[f64], random: &mut Random) -> Drawn {
    if !layout.terms {
        return Drawn::Label(pick(values, random));
    }
    let eta: Vec<f64> = std::iter::once(0.0).chain(values.iter().copied()).collect();
    let all = special::log_sum_exp(&eta);
    Drawn::Label(pick(&eta.iter().map(|e| libm::exp(e - all)).collect::<Vec<_>>(), random))
}
