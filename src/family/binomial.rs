//! Binomial distribution of successes among trials.

use super::{Amounts, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const BINOMIAL: Family = Family {
    name: "binomial",
    response: "successes, whole numbers from 0 to the number of trials (one trial unless `trials` says more)",
    support: Support::CountOfTrials,
    parameters: &[RowParameter::new(
        "probability",
        Range::UNIT,
        &[Link::Logit, Link::Probit, Link::ComplementaryLogLog, Link::Log, Link::Identity],
        "probability of a success in one trial",
    )],
    amounts: &["trials"],
    log_density: "y * log(probability) + (trials - y) * log1p(-probability) + lgamma(trials + 1) - lgamma(y + 1) - lgamma(trials - y + 1)",
    distribution: None,
    information: Information::Closed(&[("probability", "probability", "trials / (probability * (1 - probability))")]),
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 3",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    // half a success and half a failure keep the start inside
    vec![(m.mean * m.weight + 0.5) / (m.weight + 1.0)]
}

fn sample(p: &[f64], amounts: &Amounts, random: &mut Random) -> f64 {
    random.binomial(amounts.trials, p[0])
}
