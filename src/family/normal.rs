//! Normal distribution.

use super::{Censored, Family, Link, Moments, RowParameter, Support};
use crate::math::Range;

/// The family.
pub const NORMAL: Family = Family {
    name: "normal",
    response: "any numbers",
    support: Support::Real,
    parameters: &[
        RowParameter {
            name: "mean",
            range: Range::ALL,
            links: &[Link::Identity, Link::Log],
            meaning: "expected value of the response",
        },
        RowParameter {
            name: "sd",
            range: Range::POSITIVE,
            links: &[Link::Log, Link::Identity],
            meaning: "standard deviation of the response",
        },
    ],
    log_density: "-log(sd) - ((y - mean) / sd)^2 / 2 - log(2 * pi) / 2",
    censored: Some(Censored {
        above: "normal_log_cdf((mean - lower) / sd)",
        below: "normal_log_cdf((upper - mean) / sd)",
        between: "normal_log_interval((lower - mean) / sd, (upper - mean) / sd)",
    }),
    information: &[("mean", "mean", "1 / sd^2"), ("sd", "sd", "2 / sd^2")],
    information_note: "closed form",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 13",
    start,
    concave: true,
};

fn start(m: &Moments) -> Vec<f64> {
    // a response without spread leaves sd open at zero: begin away from it and let the search find out
    let sd = if m.variance > 0.0 { m.variance.sqrt() } else { m.mean.abs().max(1.0) };
    vec![m.mean, sd]
}
