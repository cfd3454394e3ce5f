//! Generalised extreme-value distribution.

use super::gumbel::scale as gumbel_scale;
use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The range of shapes for which likelihood theory is the usual one.
pub(super) const SHAPE: Range = Range { low: -0.5, high: f64::INFINITY, low_closed: false, high_closed: false };

/// The family. With z = (y - location) / scale the reduced variable is s = log(1 + shape z) / shape, written so that it is smooth through
/// shape 0, where it is z.
pub const GEV: Family = Family {
    name: "gev",
    response: "any numbers, such as largest values of a period; bounded above where the shape is negative, below where it is positive",
    support: Support::Real,
    parameters: &[
        RowParameter::new("location", Range::ALL, &[Link::Identity, Link::Log], "near the mode of the response"),
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "unit of the distance from the location",
        ),
        RowParameter::new(
            "shape",
            SHAPE,
            &[Link::Identity],
            "heavy upper tail where positive, Gumbel at 0, an upper end where negative",
        ),
    ],
    amounts: &[],
    log_density: "-log(scale) \
                  - (1 + shape) * (y - location) / scale * log1p_over(0, shape * (y - location) / scale) \
                  - exp(-(y - location) / scale * log1p_over(0, shape * (y - location) / scale))",
    distribution: Some(Distribution {
        // beyond an end the probability is 0 or 1; far out the exponential goes below the doubles and its logarithm does not
        below: "if(shape * (at - location) / scale > -1, \
                -exp(-(at - location) / scale * log1p_over(0, shape * (at - location) / scale)), \
                if(shape < 0, 0, log(0)))",
        above: "if(shape * (at - location) / scale > -1, \
                if((at - location) / scale * log1p_over(0, shape * (at - location) / scale) > 30, \
                -(at - location) / scale * log1p_over(0, shape * (at - location) / scale) \
                - exp(-(at - location) / scale * log1p_over(0, shape * (at - location) / scale)) / 2, \
                log1mexp(exp(-(at - location) / scale * log1p_over(0, shape * (at - location) / scale)))), \
                if(shape < 0, log(0), 0))",
        // the difference of the two reduced variables in one logarithm
        between: Some(
            "if(shape * (lower - location) / scale > -1, \
             if(shape * (upper - location) / scale > -1, \
             -exp(-(upper - location) / scale * log1p_over(0, shape * (upper - location) / scale)) \
             + log1mexp(-exp(-(lower - location) / scale * log1p_over(0, shape * (lower - location) / scale)) \
             * expm1(-(upper - lower) / (scale + shape * (lower - location)) \
             * log1p_over(0, shape * (upper - lower) / (scale + shape * (lower - location))))), \
             log1mexp(exp(-(lower - location) / scale * log1p_over(0, shape * (lower - location) / scale)))), \
             if(shape < 0, log(0), if(shape * (upper - location) / scale > -1, \
             -exp(-(upper - location) / scale * log1p_over(0, shape * (upper - location) / scale)), log(0))))",
        ),
    }),
    // the closed form of Prescott and Walden (1980), Biometrika 67, loses all its digits beside shape 0
    information: Information::Computed,
    information_note: "by quadrature: the closed form loses its digits near shape 0",
    source: "Jenkinson (1955), Quarterly Journal of the Royal Meteorological Society 81; information: Prescott and Walden (1980), Biometrika 67",
    start,
    sample,
    concave: false,
};

/// The quantile of the standard law whose reduced Gumbel variable is s.
pub(super) fn standard(shape: f64, s: f64) -> f64 {
    if (shape * s).abs() < 1e-300 { s } else { libm::expm1(shape * s) / shape }
}

/// Reduced Gumbel variables of the quartiles: -log(-log p).
const QUARTILES: [f64; 3] = [-0.326_634_259_978_281, 0.366_512_920_581_664_3, 1.245_899_323_707_237_7];

/// The shape whose quartiles are as unevenly spaced as these.
fn shape_of(q: &[f64; 3]) -> f64 {
    if !(q[1] > q[0] && q[2] > q[1]) {
        return 0.0;
    }
    let wanted = (q[2] - q[1]) / (q[1] - q[0]);
    let ratio = |shape: f64| {
        let x = QUARTILES.map(|s| standard(shape, s));
        (x[2] - x[1]) / (x[1] - x[0])
    };
    let (mut low, mut high) = (-0.4, 1.5);
    for _ in 0..40 {
        let middle = 0.5 * (low + high);
        if ratio(middle) < wanted { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let spread = m.quartiles[2] - m.quartiles[0];
    let by_moments = gumbel_scale(m);
    let mut shape = known[2].unwrap_or_else(|| shape_of(&m.quartiles));
    loop {
        let [a, b, c] = QUARTILES.map(|s| standard(shape, s));
        let mut scale = if spread > 0.0 { spread / (c - a) } else { by_moments };
        if by_moments < 0.7 * scale {
            // what is left after a regression: the quartiles are those of the whole response
            scale = by_moments;
        }
        let mut scale = known[1].unwrap_or(scale);
        let mut location = known[0].unwrap_or(m.quartiles[1] - scale * b);
        // the value on the side of the end, in scales beyond it
        let outside = |location: f64, scale: f64| {
            let y = if shape < 0.0 { m.max } else { m.min };
            1.0 + shape * (y - location) / scale < 0.02
        };
        if !outside(location, scale) {
            return vec![location, scale, shape];
        }
        if known[2].is_none() {
            shape = if shape.abs() < 0.01 { 0.0 } else { 0.7 * shape };
            continue;
        }
        for _ in 0..2_000 {
            if !outside(location, scale) {
                break;
            }
            if known[1].is_none() {
                scale *= 1.2;
            } else if known[0].is_none() {
                // away from the end
                location -= 0.2 * scale * shape.signum();
            }
        }
        return vec![location, scale, shape];
    }
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    (p[0] + p[1] * standard(p[2], -libm::log(random.exponential()))).clamp(f64::MIN, f64::MAX)
}
