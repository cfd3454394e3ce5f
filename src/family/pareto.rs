//! Pareto distribution above a known minimum.

use super::{Amounts, Distribution, Family, Given, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const PARETO: Family = Family {
    name: "pareto",
    response: "numbers at or above the known minimum",
    support: Support::From("minimum"),
    parameters: &[
        RowParameter::new(
            "shape",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "the part of responses above y falls as y^-shape",
        ),
        RowParameter {
            name: "minimum",
            range: Range::POSITIVE,
            links: &[],
            meaning: "smallest value there can be; it must be known",
            given: Given::Known,
        },
    ],
    amounts: &[],
    log_density: "log(shape) - log(y) - shape * log1p((y - minimum) / minimum)",
    distribution: Some(Distribution {
        // an end below the minimum is as good as the minimum
        below: "log1mexp(shape * log1p(max(at - minimum, 0) / minimum))",
        above: "-shape * log1p(max(at - minimum, 0) / minimum)",
        between: Some(
            "-shape * log1p(max(lower - minimum, 0) / minimum) \
             + log1mexp(shape * log1p((upper - max(lower, minimum)) / max(lower, minimum)))",
        ),
    }),
    information: Information::Closed(&[("shape", "shape", "1 / shape^2")]),
    information_note: "closed form; the minimum is known",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 20",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let minimum = known[1].unwrap_or(if m.min > 0.0 { m.min } else { 1.0 });
    // the maximum in closed form
    let log = m.log_mean - libm::log(minimum);
    vec![if log > 0.0 { 1.0 / log } else { 1.0 }, minimum]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    (p[1] * libm::exp(random.exponential() / p[0])).min(f64::MAX)
}
