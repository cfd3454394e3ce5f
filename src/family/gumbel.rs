//! Gumbel distribution of the largest of many.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const GUMBEL: Family = Family {
    name: "gumbel",
    response: "any numbers, such as largest values of a period",
    support: Support::Real,
    parameters: &[
        RowParameter::new("location", Range::ALL, &[Link::Identity, Link::Log], "mode of the response"),
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "the standard deviation is scale * pi / sqrt(6)",
        ),
    ],
    amounts: &[],
    log_density: "-log(scale) - (y - location) / scale - exp(-(y - location) / scale)",
    distribution: Some(Distribution {
        below: "-exp(-(at - location) / scale)",
        // far out the exponential goes below the doubles and its logarithm does not
        above: "if((at - location) / scale > 30, \
                -(at - location) / scale - exp(-(at - location) / scale) / 2, \
                log1mexp(exp(-(at - location) / scale)))",
        between: Some(
            "-exp(-(upper - location) / scale) \
             + log1mexp(-exp(-(lower - location) / scale) * expm1(-(upper - lower) / scale))",
        ),
    }),
    information: Information::Closed(&[
        ("location", "location", "1 / scale^2"),
        ("location", "scale", "-digamma(2) / scale^2"),
        ("scale", "scale", "(pi^2 / 6 + digamma(2)^2) / scale^2"),
    ]),
    information_note: "closed form; digamma(2) is 1 less the constant of Euler",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 2, ch. 22",
    start,
    sample,
    concave: false,
};

/// Constant of Euler.
pub(super) const EULER: f64 = 0.577_215_664_901_532_9;

/// The scale by the standard deviation.
pub(super) fn scale(m: &Moments) -> f64 {
    let sd = if m.variance > 0.0 { m.variance.sqrt() } else { m.mean.abs().max(1.0) };
    sd * 6f64.sqrt() / std::f64::consts::PI
}

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let scale = known[1].unwrap_or(scale(m));
    vec![m.mean - EULER * scale, scale]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    p[0] - p[1] * libm::log(random.exponential())
}
