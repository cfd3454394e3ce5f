//! Gamma distribution.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
///
/// The power, the exponential and the gamma function are joined in a deviance and the remainder of Stirling's formula, so that
/// a large shape costs no digits.
pub const GAMMA: Family = Family {
    name: "gamma",
    response: "numbers > 0",
    support: Support::Positive,
    parameters: &[
        RowParameter::new("shape", Range::POSITIVE, &[Link::Log, Link::Identity], "the mean is shape * scale"),
        RowParameter::new("scale", Range::POSITIVE, &[Link::Log, Link::Identity], "the variance is shape * scale^2"),
    ],
    amounts: &[],
    log_density: "log(shape) - log(y) - deviance(shape, y / scale) - factorial_remainder(shape)",
    distribution: Some(Distribution {
        below: "gamma_log_cdf(0, shape, at / scale)",
        above: "gamma_log_survival(0, shape, at / scale)",
        between: None,
    }),
    information: Information::Closed(&[
        ("shape", "shape", "polygamma(1, shape)"),
        ("shape", "scale", "1 / scale"),
        ("scale", "scale", "shape / scale^2"),
    ]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 17",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let mean = if m.mean > 0.0 { m.mean } else { 1.0 };
    // how far the logarithm of the mean is above the mean of the logarithm; Johnson, Kotz and Balakrishnan, sec. 17.7, give
    // the shape to 2% by it
    let gap = libm::log(mean) - m.log_mean;
    let by_logs = if gap > 1e-8 { (3.0 - gap + ((gap - 3.0).powi(2) + 24.0 * gap).sqrt()) / (12.0 * gap) } else { 1.0 };
    match (known[0], known[1]) {
        (_, Some(scale)) => vec![mean / scale, scale],
        (shape, None) => {
            let shape = shape.unwrap_or(by_logs);
            vec![shape, mean / shape]
        }
    }
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    (p[1] * random.gamma(p[0])).clamp(f64::MIN_POSITIVE, f64::MAX)
}
