//! Cauchy distribution.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const CAUCHY: Family = Family {
    name: "cauchy",
    response: "any numbers",
    support: Support::Real,
    parameters: &[
        RowParameter::new("location", Range::ALL, &[Link::Identity, Link::Log], "median of the response"),
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "half the distance between the quartiles of the response",
        ),
    ],
    amounts: &[],
    log_density: "log(scale) - log(pi) - log(scale^2 + (y - location)^2)",
    distribution: Some(Distribution {
        // beyond one scale from the median the reciprocal keeps the digits of the tail
        below: "if(at < location - scale, log(atan(scale / (location - at)) / pi), \
                if(at > location + scale, log1p(-atan(scale / (at - location)) / pi), \
                log(1 / 2 + atan((at - location) / scale) / pi)))",
        above: "if(at > location + scale, log(atan(scale / (at - location)) / pi), \
                if(at < location - scale, log1p(-atan(scale / (location - at)) / pi), \
                log(1 / 2 + atan((location - at) / scale) / pi)))",
        // on one side of the median by the difference of arctangents, which does not cancel
        between: Some(
            "if((lower - location) * (upper - location) > 0, \
             log(atan(scale * (upper - lower) / (scale^2 + (lower - location) * (upper - location))) / pi), \
             log((atan((upper - location) / scale) + atan((location - lower) / scale)) / pi))",
        ),
    }),
    information: Information::Closed(&[
        ("location", "location", "1 / (2 * scale^2)"),
        ("scale", "scale", "1 / (2 * scale^2)"),
    ]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 16",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    // moments say nothing of a law that has none: quartiles
    let spread = 0.5 * (m.quartiles[2] - m.quartiles[0]);
    vec![m.quartiles[1], if spread > 0.0 { spread } else { m.variance.sqrt().max(m.quartiles[1].abs()).max(1e-3) }]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    p[0] + p[1] * libm::tan(std::f64::consts::PI * (random.uniform() - 0.5))
}
