//! Binomial distribution of successes among trials.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
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
    log_density: "-deviance(y, trials * probability) - deviance(trials - y, trials * (1 - probability)) \
        + factorial_remainder(trials) - factorial_remainder(y) - factorial_remainder(trials - y)",
    // the last two counts of either side with the slopes that belong to them at probability 0 or 1
    distribution: Some(Distribution {
        below: "if(at < 0, log(0), if(at >= trials, 0, if(at < 2, \
            (trials - at) * log1p(-probability) + log1p(at * (trials - 1) * probability), \
            beta_log_cdf(0, 0, trials - at, at + 1, 1 - probability, probability))))",
        above: "if(at < 0, 0, if(at >= trials, log(0), if(at >= trials - 2, \
            (at + 1) * log(probability) + log1p((trials - 1 - at) * (trials - 1) * (1 - probability)), \
            beta_log_cdf(0, 0, at + 1, trials - at, probability, 1 - probability))))",
        between: None,
    }),
    information: Information::Closed(&[("probability", "probability", "trials / (probability * (1 - probability))")]),
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 3; in deviances after Loader (2000), Fast and accurate computation of \
        binomial probabilities",
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
