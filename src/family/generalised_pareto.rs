//! Generalised Pareto distribution of what exceeds a known threshold.

use super::gev::{SHAPE, standard};
use super::{Amounts, Distribution, Family, Given, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family. The reduced variable log(1 + shape z) / shape, z = (y - threshold) / scale, is smooth through shape 0, where it is z.
pub const GENERALISED_PARETO: Family = Family {
    name: "generalised_pareto",
    response: "numbers at or above the known threshold; bounded above where the shape is negative",
    support: Support::From("threshold"),
    parameters: &[
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "the density at the threshold is 1 / scale",
        ),
        RowParameter::new(
            "shape",
            SHAPE,
            &[Link::Identity],
            "heavy tail where positive, exponential at 0, an upper end where negative",
        ),
        RowParameter {
            name: "threshold",
            range: Range::ALL,
            links: &[],
            meaning: "smallest value there can be; known",
            given: Given::KnownAs(0.0),
        },
    ],
    amounts: &[],
    log_density: "-log(scale) - (1 + shape) * (y - threshold) / scale * log1p_over(0, shape * (y - threshold) / scale)",
    distribution: Some(Distribution {
        // beyond the upper end the probability is 0 or 1; an end below the threshold is as good as the threshold
        below: "if(shape * max(at - threshold, 0) / scale > -1, \
                log1mexp(max(at - threshold, 0) / scale * log1p_over(0, shape * max(at - threshold, 0) / scale)), 0)",
        above: "if(shape * max(at - threshold, 0) / scale > -1, \
                -max(at - threshold, 0) / scale * log1p_over(0, shape * max(at - threshold, 0) / scale), log(0))",
        between: Some(
            "if(shape * max(lower - threshold, 0) / scale > -1, \
             -max(lower - threshold, 0) / scale * log1p_over(0, shape * max(lower - threshold, 0) / scale) \
             + if(shape * (upper - threshold) / scale > -1, \
             log1mexp((upper - max(lower, threshold)) / (scale + shape * max(lower - threshold, 0)) \
             * log1p_over(0, shape * (upper - max(lower, threshold)) / (scale + shape * max(lower - threshold, 0)))), 0), log(0))",
        ),
    }),
    information: Information::Closed(&[
        ("scale", "scale", "1 / ((1 + 2 * shape) * scale^2)"),
        ("scale", "shape", "1 / ((1 + shape) * (1 + 2 * shape) * scale)"),
        ("shape", "shape", "2 / ((1 + shape) * (1 + 2 * shape))"),
    ]),
    information_note: "closed form, by Smith (1984), in Statistical Extremes and Applications; the threshold is known",
    source: "Pickands (1975), Annals of Statistics 3; Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 20",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let threshold = known[2].unwrap_or(0.0);
    let half = m.quartiles[1] - threshold;
    // the third quartile exceeds the median by 2^shape medians; Pickands (1975)
    let ratio = (m.quartiles[2] - m.quartiles[1]) / half;
    let by_quartiles = if half > 0.0 && ratio > 0.0 { libm::log2(ratio).clamp(-0.4, 1.5) } else { 0.0 };
    let mut shape = known[1].unwrap_or(by_quartiles);
    let mean = m.mean - threshold;
    loop {
        let by_median = half / standard(shape, std::f64::consts::LN_2);
        let mut scale = known[0].unwrap_or(if by_median > 0.0 {
            by_median
        } else if mean > 0.0 {
            mean
        } else {
            1.0
        });
        let outside = |scale: f64| 1.0 + shape * (m.max - threshold) / scale < 0.02;
        if outside(scale) && known[1].is_none() {
            shape = if shape > -0.01 { 0.0 } else { 0.7 * shape };
            continue;
        }
        if outside(scale) && known[0].is_none() {
            scale = -shape * (m.max - threshold) / 0.98;
        }
        return vec![scale, shape, threshold];
    }
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    (p[2] + p[0] * standard(p[1], random.exponential())).min(f64::MAX)
}
