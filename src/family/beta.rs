//! Beta distribution by mean and precision.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family, with shapes mean * precision and (1 - mean) * precision.
///
/// Powers and gamma functions are joined in deviances and remainders of Stirling's formula, so that a large precision costs no digits.
pub const BETA: Family = Family {
    name: "beta",
    response: "numbers above 0 and below 1",
    support: Support::Unit,
    parameters: &[
        RowParameter::new(
            "mean",
            Range { low: 0.0, high: 1.0, low_closed: false, high_closed: false },
            &[Link::Logit, Link::Probit, Link::ComplementaryLogLog, Link::Log, Link::Identity],
            "expected value of the response",
        ),
        RowParameter::new(
            "precision",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "the variance is mean * (1 - mean) / (1 + precision)",
        ),
    ],
    amounts: &[],
    log_density: "log(precision) + log(mean) + log1p(-mean) - log(y) - log1p(-y) \
                  - deviance(mean * precision, y * precision) - deviance((1 - mean) * precision, (1 - y) * precision) \
                  + factorial_remainder(precision) - factorial_remainder(mean * precision) \
                  - factorial_remainder((1 - mean) * precision)",
    distribution: Some(Distribution {
        below: "beta_log_cdf(0, 0, mean * precision, (1 - mean) * precision, at, 1 - at)",
        above: "beta_log_cdf(0, 0, (1 - mean) * precision, mean * precision, 1 - at, at)",
        between: None,
    }),
    information: Information::Closed(&[
        ("mean", "mean", "precision^2 * (polygamma(1, mean * precision) + polygamma(1, (1 - mean) * precision))"),
        (
            "mean",
            "precision",
            "precision * (mean * polygamma(1, mean * precision) \
             - (1 - mean) * polygamma(1, (1 - mean) * precision))",
        ),
        (
            "precision",
            "precision",
            "mean^2 * polygamma(1, mean * precision) + (1 - mean)^2 * polygamma(1, (1 - mean) * precision) \
             - polygamma(1, precision)",
        ),
    ]),
    information_note: "closed form, by Ferrari and Cribari-Neto (2004), Journal of Applied Statistics 31",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 2, ch. 25",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let mean = m.mean.clamp(1e-3, 1.0 - 1e-3);
    let at = known[0].unwrap_or(mean);
    let precision = if m.variance > 0.0 { at * (1.0 - at) / m.variance - 1.0 } else { 1.0 };
    vec![mean, if precision > 0.05 { precision } else { 0.05 }]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let y = random.beta(p[0] * p[1], (1.0 - p[0]) * p[1]);
    // tiny shapes put the draw at an end to within the doubles; where both gamma variables vanish the mean says at which
    let y = if y.is_nan() { f64::from(u8::from(random.uniform() < p[0])) } else { y };
    y.clamp(f64::MIN_POSITIVE, 1.0 - 0.5 * f64::EPSILON)
}
