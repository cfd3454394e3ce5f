//! Inverse Gaussian distribution of first passage times.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
///
/// Both tails are written by ratios of the normal density to its distribution function: the second term of the usual form
/// carries exp(2 shape / mean), which overflows where its partner underflows.
pub const INVERSE_GAUSSIAN: Family = Family {
    name: "inverse_gaussian",
    response: "numbers > 0",
    support: Support::Positive,
    parameters: &[
        RowParameter::new("mean", Range::POSITIVE, &[Link::Log, Link::Identity], "expected value of the response"),
        RowParameter::new("shape", Range::POSITIVE, &[Link::Log, Link::Identity], "the variance is mean^3 / shape"),
    ],
    amounts: &[],
    log_density: "(log(shape) - log(2 * pi) - 3 * log(y)) / 2 - shape * ((y - mean) / mean)^2 / (2 * y)",
    distribution: Some(Distribution {
        below: "normal_log_cdf((at - mean) / mean * sqrt(shape / at)) \
                + log1p(inverse_mills((at - mean) / mean * sqrt(shape / at)) \
                / inverse_mills(-(at + mean) / mean * sqrt(shape / at)))",
        above: "normal_log_cdf((mean - at) / mean * sqrt(shape / at)) \
                + log1p(-inverse_mills((mean - at) / mean * sqrt(shape / at)) \
                / inverse_mills(-(at + mean) / mean * sqrt(shape / at)))",
        between: None,
    }),
    information: Information::Closed(&[("mean", "mean", "shape / mean^3"), ("shape", "shape", "1 / (2 * shape^2)")]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 15",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let mean = if m.mean > 0.0 { m.mean } else { 1.0 };
    let at = known[0].unwrap_or(mean);
    // the maximum in closed form: 1 / shape is the mean of (y - mean)^2 / (mean^2 y)
    let inverse = m.mean / (at * at) - 2.0 / at + m.inverse_mean;
    vec![mean, if inverse > 1e-12 / at { 1.0 / inverse } else { at }]
}

/// Michael, Schucany and Haas (1976), American Statistician 30: a root of a chi-square transformation.
fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let (mean, shape) = (p[0], p[1]);
    let w = mean * random.normal().powi(2) / (2.0 * shape);
    // the smaller root of the quadratic, free of cancellation
    let x = mean / (1.0 + w + (w * (w + 2.0)).sqrt());
    let y = if random.uniform() <= mean / (mean + x) { x } else { mean * (mean / x) };
    y.clamp(f64::MIN_POSITIVE, f64::MAX)
}
