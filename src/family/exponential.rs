//! Exponential distribution of waiting times.

use super::{Censored, Family, Link, Moments, RowParameter, Support};
use crate::math::Range;

/// The family.
pub const EXPONENTIAL: Family = Family {
    name: "exponential",
    response: "numbers >= 0",
    support: Support::Nonnegative,
    parameters: &[RowParameter {
        name: "rate",
        range: Range::NONNEGATIVE,
        links: &[Link::Log, Link::Identity],
        meaning: "events per unit of the response; the mean is 1 / rate",
    }],
    log_density: "log(rate) - rate * y",
    censored: Some(Censored {
        above: "-rate * lower",
        below: "log1mexp(rate * upper)",
        between: "-rate * lower + log1mexp(rate * (upper - lower))",
    }),
    information: &[("rate", "rate", "1 / rate^2")],
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 19",
    start,
    concave: true,
};

fn start(m: &Moments) -> Vec<f64> {
    vec![if m.mean > 0.0 { 1.0 / m.mean } else { 1.0 }]
}
