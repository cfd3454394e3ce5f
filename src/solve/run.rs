//! One start: repaired, then driven by argmin to its end.

use argmin::core::Executor;

use super::approach::{Approach, approach};
use super::error::SolveError;
use super::frame::{Frame, Point, infeasibility};
use super::local::scale;
use super::newton::{Ended, Iterate, Known, Newton};
use super::restore::restore;
use crate::math::{Range, Vector};

/// Moves tried round a start at which l is undefined.
const MOVES: usize = 40;

/// What became of a start.
pub(super) enum Outcome<'a> {
    /// Newton ran and ended somewhere.
    Ran(Box<Newton<'a>>),
    /// The restrictions could not be met: the point where they are missed least.
    Infeasible {
        /// Working coordinates.
        phi: Vector,
        /// By how much, as the contract measures it.
        missed: f64,
    },
    /// l or a restriction is undefined there and at all points tried round it.
    Undefined(Vector),
}

/// Repairs a start (theta) and runs Newton from it.
pub(super) fn run<'a>(
    frame: &'a Frame<'a>,
    start: &Vector,
    iterations: usize,
    known: Known,
) -> Result<Outcome<'a>, SolveError> {
    let point = match repair(frame, start) {
        Ok(point) => point,
        Err(outcome) => return Ok(outcome),
    };
    drive(Newton::new(frame, *point, known), iterations).map(Outcome::Ran)
}

/// Runs Newton from where the approach from a start led; `None` where l has no approach or the start is near already.
pub(super) fn led<'a>(
    frame: &'a Frame<'a>,
    start: &Vector,
    iterations: usize,
) -> Result<Option<Box<Newton<'a>>>, SolveError> {
    let Ok(point) = repair(frame, start) else { return Ok(None) };
    let Some(Approach { point, trace }) = approach(frame, &point).filter(|a| !a.trace.is_empty()) else {
        return Ok(None);
    };
    let mut newton = Newton::new(frame, point, Known::new());
    newton.trace = trace;
    drive(newton, iterations).map(Some)
}

/// Runs Newton to its end.
fn drive(newton: Newton, iterations: usize) -> Result<Box<Newton>, SolveError> {
    let first = newton.point.phi.as_slice().to_vec();
    let result = Executor::new((), newton)
        .configure(|state: Iterate| state.param(first).max_iters(iterations as u64))
        .run()
        .map_err(|e| e.downcast::<SolveError>().unwrap_or_else(|e| SolveError::Driver(e.to_string())))?;
    let mut newton = result.solver;
    newton.ended.get_or_insert(Ended::Limit);
    Ok(Box::new(newton))
}

/// Into the ranges, on the restrictions, and to where l is defined.
fn repair<'a>(frame: &Frame, start: &Vector) -> Result<Box<Point>, Outcome<'a>> {
    let inside = within(frame, start);
    let mut missed: Option<(Vector, f64)> = None;
    for k in 0..MOVES {
        let theta = if k == 0 { inside.clone() } else { within(frame, &nudged(&inside, k)) };
        let phi = frame.phi(&theta);
        let Some(sides) = frame.sides(&theta) else { continue };
        if frame.m == 0 || infeasibility(&sides) <= super::restore::FEASIBLE {
            match frame.point(&phi) {
                Some(point) => return Ok(Box::new(point)),
                None => continue,
            }
        }
        let here = frame.point(&phi);
        let d = match &here {
            Some(point) => scale(point),
            None => phi.map(|x| x.abs().max(1.0)),
        };
        let Some(back) = restore(frame, &phi, &d) else { continue };
        if back.feasible() {
            // Where l is undefined on the restrictions nearby, but not here, the way to them is left to Newton.
            match frame.point(&back.phi).or(here) {
                Some(point) => return Ok(Box::new(point)),
                None => continue,
            }
        }
        if missed.as_ref().is_none_or(|(_, m)| back.infeasibility < *m) {
            missed = Some((back.phi, back.infeasibility));
        }
        if frame.equations.linear() || k >= 5 {
            break;
        }
    }
    Err(match missed {
        Some((phi, missed)) => Outcome::Infeasible { phi, missed },
        None => Outcome::Undefined(frame.phi(&inside)),
    })
}

/// Every parameter in its range, off the open ends.
fn within(frame: &Frame, theta: &Vector) -> Vector {
    let parameters = frame.likelihood.parameters();
    Vector::from_fn(theta.len(), |j, _| {
        let (range, x) = (&parameters[j].range, theta[j]);
        if range.contains(x) && x.is_finite() { x } else { nearest(range, if x.is_nan() { 0.0 } else { x }) }
    })
}

/// The value in the range nearest to x; a hundredth inside an open end.
fn nearest(range: &Range, x: f64) -> f64 {
    let width = range.high - range.low;
    let margin = |end: f64| if width.is_finite() { 0.01 * width } else { 0.01 * end.abs().max(1.0) };
    if x <= range.low {
        if range.low_closed {
            range.low
        } else if range.low.is_finite() {
            range.low + margin(range.low)
        } else {
            -1e6
        }
    } else if x >= range.high {
        if range.high_closed {
            range.high
        } else if range.high.is_finite() {
            range.high - margin(range.high)
        } else {
            1e6
        }
    } else {
        x
    }
}

/// A point round theta by an additive recurrence, further away the later.
fn nudged(theta: &Vector, k: usize) -> Vector {
    let reach = 0.05 * 1.2f64.powi(k as i32);
    let mut ratio = 0.5;
    Vector::from_fn(theta.len(), |j, _| {
        ratio = (ratio + std::f64::consts::SQRT_2).fract();
        let at = (k as f64 * (0.1 + ratio)).fract();
        theta[j] + reach * (2.0 * at - 1.0) * theta[j].abs().max(1.0)
    })
}
