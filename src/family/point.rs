//! All mass at one value: a component of mixtures, for values that come up more often than any density gives them.

use super::{Amounts, Distribution, Family, Given, Information, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const POINT: Family = Family {
    name: "point",
    response: "one value (useful as a component of a mixture: zero inflation)",
    support: Support::Lump("at"),
    parameters: &[RowParameter { given: Given::Known, ..RowParameter::new("at", Range::ALL, &[], "the value") }],
    amounts: &[],
    log_density: "if(y = at, 0, log(0))",
    distribution: Some(Distribution {
        below: "if(q >= at, 0, log(0))",
        above: "if(q >= at, log(0), 0)",
        between: None,
    }),
    information: Information::Closed(&[]),
    information_note: "nothing is estimated",
    source: "common practice",
    start,
    sample,
    concave: true,
};

fn start(_: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    vec![known[0].unwrap_or(0.0)]
}

fn sample(p: &[f64], _: &Amounts, _: &mut Random) -> f64 {
    p[0]
}
