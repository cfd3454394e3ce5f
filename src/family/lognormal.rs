//! Lognormal distribution: the logarithm of the response is normal.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const LOGNORMAL: Family = Family {
    name: "lognormal",
    response: "numbers > 0",
    support: Support::Positive,
    parameters: &[
        RowParameter::new("mean", Range::ALL, &[Link::Identity], "expected value of the logarithm of the response"),
        RowParameter::new(
            "sd",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "standard deviation of the logarithm of the response",
        ),
    ],
    amounts: &[],
    log_density: "-log(y) - log(sd) - ((log(y) - mean) / sd)^2 / 2 - log(2 * pi) / 2",
    distribution: Some(Distribution {
        below: "normal_log_cdf((log(at) - mean) / sd)",
        above: "normal_log_cdf((mean - log(at)) / sd)",
        between: Some("normal_log_interval((log(lower) - mean) / sd, (log(upper) - mean) / sd)"),
    }),
    information: Information::Closed(&[("mean", "mean", "1 / sd^2"), ("sd", "sd", "2 / sd^2")]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 14",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    vec![m.log_mean, if m.log_variance > 0.0 { m.log_variance.sqrt() } else { 1.0 }]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    // a logarithm past the doubles is held at their ends, so that the response stays in the support
    libm::exp(p[0] + p[1] * random.normal()).clamp(f64::MIN_POSITIVE, f64::MAX)
}
