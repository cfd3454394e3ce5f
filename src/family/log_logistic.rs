//! Log-logistic distribution: the logarithm of the response is logistic.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const LOG_LOGISTIC: Family = Family {
    name: "log_logistic",
    response: "numbers > 0",
    support: Support::Positive,
    parameters: &[
        RowParameter::new(
            "shape",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "1 / shape is the scale of the logarithm of the response",
        ),
        RowParameter::new("scale", Range::POSITIVE, &[Link::Log, Link::Identity], "median of the response"),
    ],
    amounts: &[],
    log_density: "log(shape) - log(y) + log_logistic(shape * log(y / scale)) + log_logistic(shape * log(scale / y))",
    distribution: Some(Distribution {
        below: "log_logistic(shape * log(at / scale))",
        above: "log_logistic(shape * log(scale / at))",
        between: Some(
            "log_logistic(shape * log(upper / scale)) + log_logistic(shape * log(scale / lower)) \
             + log1mexp(shape * log1p((upper - lower) / lower))",
        ),
    }),
    information: Information::Closed(&[
        ("shape", "shape", "(pi^2 + 3) / (9 * shape^2)"),
        ("scale", "scale", "shape^2 / (3 * scale^2)"),
    ]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 2, ch. 23",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    let sd = m.log_variance.sqrt();
    vec![if sd > 0.0 { std::f64::consts::PI / (3f64.sqrt() * sd) } else { 1.0 }, libm::exp(m.log_mean)]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let u = random.uniform();
    (p[1] * libm::exp((libm::log(u) - libm::log1p(-u)) / p[0])).clamp(f64::MIN_POSITIVE, f64::MAX)
}
