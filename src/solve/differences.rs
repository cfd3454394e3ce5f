//! Exact derivatives against central differences at the answer.

use super::frame::{Frame, Point};
use crate::math::Vector;

/// Difference steps tried, in standard errors; a wrong derivative is wrong at all of them.
const STEPS: [f64; 5] = [3e-2, 1e-2, 1e-3, 1e-4, 1e-5];
/// A disagreement small enough not to try further steps.
const GOOD: f64 = 1e-8;

/// Largest disagreement, per standard error, of the gradient with differences of l and of the Hessian with
/// differences of the gradient, along a direction in which every parameter off its edges takes part (fourth-order
/// formula: four passes a step). `None` where no step can be made.
pub(super) fn derivatives(frame: &Frame, point: &Point, d: &Vector) -> Option<f64> {
    let v = direction(frame, point);
    if v.amax() == 0.0 {
        return None;
    }
    let step = v.component_mul(d);
    let slope = point.gradient.dot(&step);
    let bend = (&point.hessian * &step).component_mul(d);
    let mut best: Option<f64> = None;
    for h in STEPS {
        let at = |k: f64| {
            let phi = &point.phi + &step * (k * h);
            if frame.contains(&frame.theta(&phi)) { frame.gradient(&phi) } else { None }
        };
        let (Some(a), Some(b), Some(y), Some(z)) = (at(-2.0), at(-1.0), at(1.0), at(2.0)) else { continue };
        let by_value = (8.0 * (y.0 - b.0) - (z.0 - a.0)) / (12.0 * h);
        let by_gradient = ((y.1 - b.1) * 8.0 - (z.1 - a.1)).component_mul(d) / (12.0 * h);
        let first = (by_value - slope).abs() / (1.0 + slope.abs());
        let second = (by_gradient - &bend).amax() / (1.0 + bend.amax());
        let worst = first.max(second);
        if best.is_none_or(|b| worst < b) {
            best = Some(worst);
        }
        if worst < GOOD {
            break;
        }
    }
    best
}

/// Weights of alternating sign and unequal size by u, 0 where the parameter stands on an end of its range.
fn direction(frame: &Frame, point: &Point) -> Vector {
    let size = (frame.n as f64).sqrt();
    let mut v = Vector::from_fn(frame.n, |j, _| {
        let part = 0.7 + 0.6 * ((j as f64 + 1.0) * std::f64::consts::SQRT_2).fract();
        if j % 2 == 0 { part / size } else { -part / size }
    });
    let ones = Vector::from_element(frame.n, 1.0);
    for b in frame.bounds.iter().filter(|b| b.room(&point.theta) == 0.0) {
        for (j, x) in frame.bound_row(b, &ones).iter().enumerate() {
            if *x != 0.0 {
                v[j] = 0.0;
            }
        }
    }
    v
}
