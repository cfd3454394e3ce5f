//! Poisson distribution of counts.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
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
    log_density: "-deviance(y, exposure * rate) - factorial_remainder(y)",
    // none or one: with the slopes that belong to them at rate 0
    distribution: Some(Distribution {
        below: "if(at < 0, log(0), if(at < 2, log1p(at * exposure * rate) - exposure * rate, \
            gamma_log_survival(0, at + 1, exposure * rate)))",
        above: "if(at < 0, 0, gamma_log_cdf(0, at + 1, exposure * rate))",
        between: None,
    }),
    information: Information::Closed(&[("rate", "rate", "exposure / rate")]),
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 4; in deviances after Loader (2000), Fast and accurate computation of \
        binomial probabilities",
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
