//! Exponential distribution of waiting times.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const EXPONENTIAL: Family = Family {
    name: "exponential",
    response: "numbers >= 0",
    support: Support::Nonnegative,
    parameters: &[RowParameter::new(
        "rate",
        Range::NONNEGATIVE,
        &[Link::Log, Link::Identity],
        "events per unit of the response; the mean is 1 / rate",
    )],
    amounts: &[],
    log_density: "log(rate) - rate * y",
    distribution: Some(Distribution {
        below: "log1mexp(rate * at)",
        above: "-rate * at",
        between: Some("-rate * lower + log1mexp(rate * (upper - lower))"),
    }),
    information: Information::Closed(&[("rate", "rate", "1 / rate^2")]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 19",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    vec![if m.mean > 0.0 { 1.0 / m.mean } else { 1.0 }]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    random.exponential() / p[0]
}
