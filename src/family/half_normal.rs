//! Half-normal distribution: the size of a normal variable of mean 0.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const HALF_NORMAL: Family = Family {
    name: "half_normal",
    response: "numbers >= 0",
    support: Support::Nonnegative,
    parameters: &[RowParameter::new(
        "sd",
        Range::POSITIVE,
        &[Link::Log, Link::Identity],
        "standard deviation of the normal variable that is folded at 0",
    )],
    amounts: &[],
    log_density: "log(2 / pi) / 2 - log(sd) - (y / sd)^2 / 2",
    distribution: Some(Distribution {
        below: "normal_log_interval(-at / sd, at / sd)",
        above: "log(2) + normal_log_cdf(-at / sd)",
        between: Some("log(2) + normal_log_interval(lower / sd, upper / sd)"),
    }),
    information: Information::Closed(&[("sd", "sd", "2 / sd^2")]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 13",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    let square = m.mean * m.mean + m.variance;
    vec![if square > 0.0 { square.sqrt() } else { 1.0 }]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    p[0] * random.normal().abs()
}
