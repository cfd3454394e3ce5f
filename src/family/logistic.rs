//! Logistic distribution.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const LOGISTIC: Family = Family {
    name: "logistic",
    response: "any numbers",
    support: Support::Real,
    parameters: &[
        RowParameter::new("location", Range::ALL, &[Link::Identity, Link::Log], "mean and median of the response"),
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "the standard deviation is scale * pi / sqrt(3)",
        ),
    ],
    amounts: &[],
    log_density: "-log(scale) + log_logistic((y - location) / scale) + log_logistic((location - y) / scale)",
    distribution: Some(Distribution {
        below: "log_logistic((at - location) / scale)",
        above: "log_logistic((location - at) / scale)",
        between: Some(
            "log_logistic((upper - location) / scale) + log_logistic((location - lower) / scale) \
             + log1mexp((upper - lower) / scale)",
        ),
    }),
    information: Information::Closed(&[
        ("location", "location", "1 / (3 * scale^2)"),
        ("scale", "scale", "(pi^2 + 3) / (9 * scale^2)"),
    ]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 2, ch. 23",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    let sd = if m.variance > 0.0 { m.variance.sqrt() } else { m.mean.abs().max(1.0) };
    vec![m.mean, sd * 3f64.sqrt() / std::f64::consts::PI]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let u = random.uniform();
    p[0] + p[1] * (libm::log(u) - libm::log1p(-u))
}
