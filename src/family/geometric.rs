//! Geometric distribution of the trials up to the first success.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const GEOMETRIC: Family = Family {
    name: "geometric",
    response: "trials up to and with the first success: 1, 2, ...",
    support: Support::CountFromOne,
    parameters: &[RowParameter::new(
        "probability",
        Range::UNIT,
        &[Link::Logit, Link::Probit, Link::ComplementaryLogLog, Link::Log, Link::Identity],
        "probability of a success in one trial; the mean is 1 / probability",
    )],
    amounts: &[],
    log_density: "log(probability) + (y - 1) * log1p(-probability)",
    // the second form of `below` has the slope that belongs to it at probability 1
    distribution: Some(Distribution {
        below: "if(at < 1, log(0), if(probability < 0.5, log1mexp(-at * log1p(-probability)), log1p(-(1 - probability)^at)))",
        above: "if(at < 1, 0, at * log1p(-probability))",
        between: None,
    }),
    information: Information::Closed(&[("probability", "probability", "1 / (probability^2 * (1 - probability))")]),
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 5",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    // half a failure more than was seen keeps the start inside
    vec![(m.weight + 0.5) / (m.weight * m.mean.max(1.0) + 1.0)]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    (libm::log(random.uniform()) / libm::log1p(-p[0])).ceil().max(1.0)
}
