//! Binomial distribution of successes among trials.

use super::{Family, Link, Moments, RowParameter, Support};
use crate::math::Range;

/// The family.
pub const BINOMIAL: Family = Family {
    name: "binomial",
    response: "successes, whole numbers from 0 to the number of trials (one trial unless `trials` says more)",
    support: Support::CountOfTrials,
    parameters: &[RowParameter {
        name: "probability",
        range: Range::UNIT,
        links: &[Link::Logit, Link::Probit, Link::ComplementaryLogLog, Link::Log, Link::Identity],
        meaning: "probability of a success in one trial",
    }],
    log_density: "y * log(probability) + (trials - y) * log1p(-probability) + lgamma(trials + 1) - lgamma(y + 1) - lgamma(trials - y + 1)",
    censored: None,
    information: &[("probability", "probability", "trials / (probability * (1 - probability))")],
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 3",
    start,
    concave: true,
};

fn start(m: &Moments) -> Vec<f64> {
    // half a success and half a failure keep the start inside
    vec![(m.mean * m.weight + 0.5) / (m.weight + 1.0)]
}
