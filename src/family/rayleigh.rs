//! Rayleigh distribution: the length of a normal vector in the plane.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const RAYLEIGH: Family = Family {
    name: "rayleigh",
    response: "numbers > 0",
    support: Support::Positive,
    parameters: &[RowParameter::new(
        "scale",
        Range::POSITIVE,
        &[Link::Log, Link::Identity],
        "mode of the response; 1 - F = exp(-y^2 / (2 scale^2))",
    )],
    amounts: &[],
    log_density: "log(y) - 2 * log(scale) - (y / scale)^2 / 2",
    distribution: Some(Distribution {
        below: "log1mexp((at / scale)^2 / 2)",
        above: "-(at / scale)^2 / 2",
        between: Some("-(lower / scale)^2 / 2 + log1mexp((upper - lower) * (upper + lower) / (2 * scale^2))"),
    }),
    information: Information::Closed(&[("scale", "scale", "4 / scale^2")]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 18",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    let square = m.mean * m.mean + m.variance;
    vec![if square > 0.0 { (0.5 * square).sqrt() } else { 1.0 }]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    p[0] * (2.0 * random.exponential()).sqrt()
}
