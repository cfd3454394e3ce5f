//! Gumbel distribution of the smallest of many: the logarithm of a Weibull variable.

use super::gumbel::{EULER, scale};
use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const GUMBEL_SMALLEST: Family = Family {
    name: "gumbel_smallest",
    response: "any numbers, such as smallest values of a period or logarithms of lifetimes",
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
    log_density: "-log(scale) + (y - location) / scale - exp((y - location) / scale)",
    distribution: Some(Distribution {
        // far out the exponential goes below the doubles and its logarithm does not
        below: "if((at - location) / scale < -30, \
                (at - location) / scale - exp((at - location) / scale) / 2, \
                log1mexp(exp((at - location) / scale)))",
        above: "-exp((at - location) / scale)",
        between: Some(
            "-exp((lower - location) / scale) \
             + log1mexp(-exp((upper - location) / scale) * expm1(-(upper - lower) / scale))",
        ),
    }),
    information: Information::Closed(&[
        ("location", "location", "1 / scale^2"),
        ("location", "scale", "digamma(2) / scale^2"),
        ("scale", "scale", "(pi^2 / 6 + digamma(2)^2) / scale^2"),
    ]),
    information_note: "closed form; digamma(2) is 1 less the constant of Euler",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 2, ch. 22",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let scale = known[1].unwrap_or(scale(m));
    vec![m.mean + EULER * scale, scale]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    p[0] + p[1] * libm::log(random.exponential())
}
