//! Laplace (double exponential) distribution.
//!
//! The density has a kink at its median. Maxima sit there, with the location in a response: the search meets such rows exactly
//! and counts the kink as stationary where the slopes of its two sides enclose zero.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const LAPLACE: Family = Family {
    name: "laplace",
    response: "any numbers",
    support: Support::Real,
    parameters: &[
        RowParameter::new("location", Range::ALL, &[Link::Identity, Link::Log], "mean and median of the response"),
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "expected distance of the response from the location",
        ),
    ],
    amounts: &[],
    log_density: "-log(2 * scale) - abs(y - location) / scale",
    distribution: Some(Distribution {
        below: "if(at < location, (at - location) / scale - log(2), log1p(-exp((location - at) / scale) / 2))",
        above: "if(at < location, log1p(-exp((at - location) / scale) / 2), (location - at) / scale - log(2))",
        // on one side of the kink as for the exponential; across it both parts are positive and nothing cancels
        between: Some(
            "if(upper <= location, (upper - location) / scale - log(2) + log1mexp((upper - lower) / scale), \
             if(lower >= location, (location - lower) / scale - log(2) + log1mexp((upper - lower) / scale), \
             log(-expm1((lower - location) / scale) / 2 - expm1((location - upper) / scale) / 2)))",
        ),
    }),
    information: Information::Closed(&[("location", "location", "1 / scale^2"), ("scale", "scale", "1 / scale^2")]),
    information_note: "closed form",
    source: "Kotz, Kozubowski and Podgorski (2001), The Laplace Distribution and Generalizations, ch. 2",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    // quartiles lie log(2) scales from the median; an outlier moves them little
    let spread = 0.5 * (m.quartiles[2] - m.quartiles[0]) / std::f64::consts::LN_2;
    let moment = (0.5 * m.variance).sqrt();
    let scale = if spread > 0.0 { spread.min(moment) } else { moment };
    vec![m.quartiles[1], if scale > 0.0 { scale } else { m.quartiles[1].abs().max(1.0) }]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let distance = p[1] * random.exponential();
    if random.uniform() < 0.5 { p[0] - distance } else { p[0] + distance }
}
