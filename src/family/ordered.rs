//! Ordered labels: cumulative logit and probit. P(label k or before) = F(cut.k - location).

use super::Link;
use super::composite::{Composite, Drawn, Group, Layout, Made, Piece, Reads, Summary, pick, plus, written};
use crate::expr::Name;
use crate::math::{Random, Range, special};

const CUT: Group = Group {
    name: "cut",
    pattern: "LABEL",
    range: Range::ALL,
    links: &[],
    intercept: true,
    known: None,
    meaning: "upper limit of the label on the underlying scale, for each label but the last; limits increase",
};

const LOCATION: Group = Group {
    name: "location",
    pattern: "",
    range: Range::ALL,
    links: &[Link::Identity],
    intercept: false,
    known: Some(0.0),
    meaning: "place of the row on the underlying scale, by its terms; 0 without them, and there is no intercept",
};

const SOURCE: &str = "McCullagh (1980), Journal of the Royal Statistical Society B 42";

/// The family with the logistic distribution function.
pub const LOGIT: Composite = Composite {
    name: "ordered_logit",
    response: "a column of labels in order (say the order in [data.category])",
    reads: Reads::OrderedLabels,
    groups: &[LOCATION, CUT],
    maintained: "",
    formula: "log(logistic(cut.LABEL - location) - logistic(cut.BEFORE - location)) of the label seen",
    information: "sum over the labels of their slopes times slopes over probability; closed form",
    source: SOURCE,
    make: make_logit,
    start: start_logit,
    sample: sample_logit,
    concave: true,
};

/// The family with the normal distribution function.
pub const PROBIT: Composite = Composite {
    name: "ordered_probit",
    formula: "log(normal_cdf(cut.LABEL - location) - normal_cdf(cut.BEFORE - location)) of the label seen",
    make: make_probit,
    start: start_probit,
    sample: sample_probit,
    ..LOGIT
};

fn make_logit(layout: &Layout) -> Made {
    let density = |x: &str| format!("logistic({x}) * logistic(-({x}))");
    let cdf = |x: &str| format!("logistic({x})");
    let interval = |lower: &str, upper: &str| {
        format!("(log_logistic({upper}) + log_logistic(-({lower})) + log1mexp(({upper}) - ({lower})))")
    };
    make(layout, &density, &cdf, &|x| format!("log_logistic({x})"), &interval)
}

fn make_probit(layout: &Layout) -> Made {
    let density = |x: &str| format!("exp(-({x})^2 / 2) / sqrt(2 * pi)");
    let cdf = |x: &str| format!("normal_cdf({x})");
    let interval = |lower: &str, upper: &str| format!("normal_log_interval({lower}, {upper})");
    make(layout, &density, &cdf, &|x| format!("normal_log_cdf({x})"), &interval)
}

/// The formulas from a symmetric distribution: its density, its distribution function and the logarithm of that, and the
/// logarithm of the probability of an interval.
fn make(
    layout: &Layout,
    density: &dyn Fn(&str) -> String,
    cdf: &dyn Fn(&str) -> String,
    log_cdf: &dyn Fn(&str) -> String,
    interval: &dyn Fn(&str, &str) -> String,
) -> Made {
    let n = layout.pieces.len();
    let cut = |k: usize| written("cut", &layout.pieces[k]);
    let seen = |k: usize| written("seen", &layout.pieces[k]);
    let mut made = Made::default();
    made.parameters.push(Piece { group: 0, key: Name::default(), meaning: LOCATION.meaning.into() });
    for k in 0..n.saturating_sub(1) {
        let meaning = format!("upper limit of {} on the underlying scale", layout.pieces[k]);
        made.parameters.push(Piece { group: 1, key: layout.pieces[k].clone(), meaning });
    }
    if n < 2 {
        made.log_density = "0".into();
        return made;
    }
    let last = n - 1;
    // the limits of the row's own label; each label between has two
    made.lets.push(("high".into(), plus((1..last).map(|k| format!("{} * {}", seen(k), cut(k))))));
    made.lets.push(("low".into(), plus((1..last).map(|k| format!("{} * {}", seen(k), cut(k - 1))))));
    let first = format!("{} * {}", seen(0), log_cdf(&format!("{} - location", cut(0))));
    let end = format!("{} * {}", seen(last), log_cdf(&format!("location - {}", cut(last - 1))));
    made.log_density = format!("{first} + {end}");
    if n > 2 {
        let middle = plus((1..last).map(seen));
        made.log_density += &format!(" + if({middle} = 1, {}, 0)", interval("low - location", "high - location"));
    }
    for k in 0..last {
        made.lets.push((format!("f.'{k}'"), density(&format!("{} - location", cut(k)))));
    }
    // f at the upper limit of label k, and the probability of label k
    let f = |k: usize| format!("f.'{k}'");
    let at = |k: usize| format!("{} - location", cut(k));
    for k in 0..n {
        let text = if k == 0 {
            cdf(&at(0))
        } else if k == last {
            cdf(&format!("location - {}", cut(last - 1)))
        } else {
            format!("exp({})", interval(&at(k - 1), &at(k)))
        };
        made.lets.push((format!("p.'{k}'"), text));
        let slope = match k {
            0 => format!("-{}", f(0)),
            k if k == last => f(k - 1),
            k => format!("{} - {}", f(k - 1), f(k)),
        };
        made.lets.push((format!("slope.'{k}'"), slope));
    }
    let location = "location".to_string();
    let own = plus((0..n).map(|k| format!("slope.'{k}'^2 / p.'{k}'")));
    made.information.push((location.clone(), location.clone(), own));
    for k in 0..last {
        let both = format!("{}^2 * (1 / p.'{k}' + 1 / p.'{}')", f(k), k + 1);
        made.information.push((cut(k), cut(k), both));
        let cross = format!("{} * (slope.'{k}' / p.'{k}' - slope.'{1}' / p.'{1}')", f(k), k + 1);
        made.information.push((location.clone(), cut(k), cross));
        if k + 1 < last {
            made.information.push((cut(k), cut(k + 1), format!("-{} * {} / p.'{}'", f(k), f(k + 1), k + 1)));
        }
    }
    made
}

fn start_logit(_: &Layout, summary: &Summary) -> Vec<f64> {
    start(summary, special::logit)
}

fn start_probit(_: &Layout, summary: &Summary) -> Vec<f64> {
    start(summary, special::normal_quantile)
}

fn start(summary: &Summary, quantile: fn(f64) -> f64) -> Vec<f64> {
    let (total, n) = (summary.counts.iter().sum::<f64>(), summary.counts.len() as f64);
    let mut sum = 0.0;
    let mut out = vec![0.0];
    for c in &summary.counts[..summary.counts.len().saturating_sub(1)] {
        // half a row a label keeps the limits finite and apart
        sum += (c + 0.5) / (total + 0.5 * n);
        out.push(quantile(sum));
    }
    out
}

fn sample_logit(layout: &Layout, values: &[f64], random: &mut Random) -> Drawn {
    sample(layout, values, random, special::logistic)
}

fn sample_probit(layout: &Layout, values: &[f64], random: &mut Random) -> Drawn {
    sample(layout, values, random, special::normal_cdf)
}

fn sample(layout: &Layout, values: &[f64], random: &mut Random, cdf: fn(f64) -> f64) -> Drawn {
    let mut before = 0.0;
    let mut chances = Vec::with_capacity(layout.pieces.len());
    for cut in &values[1..] {
        let here = cdf(cut - values[0]);
        chances.push((here - before).max(0.0));
        before = here;
    }
    chances.push(1.0 - before);
    Drawn::Label(pick(&chances, random))
}
