//! Poisson distribution of counts.

use super::{Amounts, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const POISSON: Family = Family {
    name: "poisson",
    response: "counts 0, 1, 2, ...",
    support: Support::Count,
    parameters: &[RowParameter::new(
        "rate",
        Range::NONNEGATIVE,
        &[Link::Log, Link::Identity],
        "expected count per unit of exposure",
    )],
    amounts: &["exposure"],
    log_density: "y * log(exposure * rate) - exposure * rate - lgamma(y + 1)",
    distribution: None,
    information: Information::Closed(&[("rate", "rate", "exposure / rate")]),
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 4",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    vec![m.mean]
}

fn sample(p: &[f64], amounts: &Amounts, random: &mut Random) -> f64 {
    random.poisson(p[0] * amounts.exposure)
}
