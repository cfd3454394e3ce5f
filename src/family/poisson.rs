//! Poisson distribution of counts.

use super::{Family, Link, Moments, RowParameter, Support};
use crate::math::Range;

/// The family.
pub const POISSON: Family = Family {
    name: "poisson",
    response: "counts 0, 1, 2, ...",
    support: Support::Count,
    parameters: &[RowParameter {
        name: "rate",
        range: Range::NONNEGATIVE,
        links: &[Link::Log, Link::Identity],
        meaning: "expected count per unit of exposure",
    }],
    log_density: "y * log(exposure * rate) - exposure * rate - lgamma(y + 1)",
    censored: None,
    information: &[("rate", "rate", "exposure / rate")],
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 4",
    start,
    concave: true,
};

fn start(m: &Moments) -> Vec<f64> {
    vec![m.mean]
}
