//! Points and weights over the support of a family: exact sums for counts, double-exponential rules otherwise, which take
//! heavy tails and densities that are infinite at an end alike.
//!
//! Takahasi and Mori (1974), Publications of the Research Institute for Mathematical Sciences 9.

use std::f64::consts::PI;

use super::{AMOUNTS, Family, Support, at};
use crate::expr::Scalars;
use crate::math::special::logistic;

/// Step of the double-exponential rules; at half of it the sums below stay as they are to 1e-13.
const STEP: f64 = 1.0 / 64.0;

/// Points and weights that carry all of the family's mass worth a double. `log` is its compiled log density.
pub(super) fn support(f: &Family, log: &Scalars, theta: &[f64]) -> Vec<(f64, f64)> {
    let outer = 6.6;
    let inside = |y: f64| at(log, y, theta)[0].is_finite();
    match f.support {
        Support::Unit => between(0.0, 1.0),
        Support::Nonnegative | Support::Positive => half_line(0.0, 1.0, outer, &inside),
        Support::From(name) => {
            let low = theta[f.parameters.iter().position(|p| p.name == name).unwrap()];
            half_line(low, 1.0, outer, &inside)
        }
        Support::Angle => (0..4_000).map(|k| (PI * (f64::from(k) / 2_000.0 - 1.0), PI / 2_000.0)).collect(),
        Support::Real => {
            // from the location both ways: a kink may lie there
            let centre = middle(f, theta);
            let mut out = half_line(centre, -1.0, outer, &inside);
            out.extend(half_line(centre, 1.0, outer, &inside));
            out
        }
        Support::CountOfTrials => (0..=AMOUNTS.trials as i32).map(|k| (f64::from(k), 1.0)).collect(),
        Support::CountFromOne => (1..600).map(|k| (f64::from(k), 1.0)).collect(),
        _ => (0..600).map(|k| (f64::from(k), 1.0)).collect(),
    }
}

/// The first row parameter that may be any number: the location.
fn middle(f: &Family, theta: &[f64]) -> f64 {
    f.parameters.iter().position(|p| p.range.low == f64::NEG_INFINITY).map_or(0.0, |i| theta[i])
}

/// From `low` in one direction to infinity, or to where the density ends.
fn half_line(low: f64, direction: f64, outer: f64, inside: &dyn Fn(f64) -> bool) -> Vec<(f64, f64)> {
    let place = |distance: f64| low + direction * distance;
    if !inside(place(1e5)) {
        let (mut near, mut far) = (1e-3, 1e5);
        for _ in 0..100 {
            let half = 0.5 * (near + far);
            if inside(place(half)) { near = half } else { far = half }
        }
        return between(0.0, near).into_iter().map(|(d, w)| (place(d), w)).collect();
    }
    let count = (outer / STEP) as i32;
    (-count..=count)
        .map(|k| {
            let t = f64::from(k) * STEP;
            let distance = libm::exp(0.5 * PI * libm::sinh(t));
            (place(distance), distance * 0.5 * PI * libm::cosh(t) * STEP)
        })
        .collect()
}

/// P(lower < Y <= upper) by integrating the density, in two pieces that part at the location, where there may be a kink.
pub(super) fn probability(f: &Family, log: &Scalars, theta: &[f64], lower: f64, upper: f64) -> f64 {
    let inside = |y: f64| at(log, y, theta)[0].is_finite();
    // an end is drawn in to where the density begins
    let drawn = |end: f64, other: f64| {
        let (mut out, mut into) = (end, other);
        if inside(end) || !inside(other) {
            return end;
        }
        for _ in 0..100 {
            let half = 0.5 * (out + into);
            if inside(half) { into = half } else { out = half }
        }
        into
    };
    let (low, high) = (drawn(lower, upper), drawn(upper, lower));
    let middle = middle(f, theta);
    let cut = if low < middle && middle < high { middle } else { 0.5 * (low + high) };
    let mut nodes = between(low, cut);
    nodes.extend(between(cut, high));
    nodes.iter().map(|&(y, w)| w * at(log, y, theta)[0].exp()).filter(|p| p.is_finite()).sum()
}

/// Between two ends, near the lower one to the last digit of the distance from it.
fn between(low: f64, high: f64) -> Vec<(f64, f64)> {
    let count = (5.9 / STEP) as i32;
    (-count..=count)
        .map(|k| {
            let t = f64::from(k) * STEP;
            let x = PI * libm::sinh(t);
            let p = logistic(x);
            (low + (high - low) * p, (high - low) * p * logistic(-x) * PI * libm::cosh(t) * STEP)
        })
        .filter(|&(y, _)| low < y && y < high)
        .collect()
}
