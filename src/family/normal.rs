//! Normal distribution.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const NORMAL: Family = Family {
    name: "normal",
    response: "any numbers",
    support: Support::Real,
    parameters: &[
        RowParameter::new("mean", Range::ALL, &[Link::Identity, Link::Log], "expected value of the response"),
        RowParameter::new("sd", Range::POSITIVE, &[Link::Log, Link::Identity], "standard deviation of the response"),
    ],
    amounts: &[],
    log_density: "-log(sd) - ((y - mean) / sd)^2 / 2 - log(2 * pi) / 2",
    distribution: Some(Distribution {
        below: "normal_log_cdf((at - mean) / sd)",
        above: "normal_log_cdf((mean - at) / sd)",
        between: Some("normal_log_interval((lower - mean) / sd, (upper - mean) / sd)"),
    }),
    information: Information::Closed(&[("mean", "mean", "1 / sd^2"), ("sd", "sd", "2 / sd^2")]),
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 13",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    // a response without spread leaves sd open at zero: begin away from it and let the search find out
    let sd = if m.variance > 0.0 { m.variance.sqrt() } else { m.mean.abs().max(1.0) };
    vec![m.mean, sd]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    p[0] + p[1] * random.normal()
}
