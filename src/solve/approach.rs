//! From far away to where Newton's model holds: steps of the model of Gauss and Newton within a trust region (Levenberg 1944,
//! Marquardt 1963; the exact region of Moré and Sorensen 1983), for log densities in which something bent is squared. There the
//! Hessian is indefinite far from the answer and its model short-sighted in a curved valley; this one is neither.
//!
//! Lengths are relative to the parameters themselves, as a start is right in its order of magnitude at best. Scales
//! outside the squares (a standard deviation) are held during a step and follow it: to go along they would have to foresee
//! how much smaller the squares become.

use super::Step;
use super::frame::{Frame, Point, infeasibility};
use super::local::{Local, scale};
use super::rank::{Rows, eigen};
use crate::math::{Matrix, Vector};

/// Most steps.
const STEPS: usize = 1_000;
/// First radius: half of each parameter.
const FIRST: f64 = 0.5;
/// A radius at which steps are rounding.
const SHORTEST: f64 = 1e-13;
/// Gain in l foretold, below which Newton takes over: a seventieth of a standard error.
const NEAR: f64 = 1e-4;
/// Least part of the foretold gain that a step must bring.
const ENOUGH: f64 = 1e-4;
/// No parameter is taken for smaller than this part of its start: one that changes its sign must get past zero.
const SMALLEST: f64 = 1e-6;

/// Where the steps led, and one line for each.
pub(super) struct Approach {
    pub point: Point,
    pub trace: Vec<Step>,
}

/// Goes from a point towards a maximum for as long as that is far. `None`: no square bends, or restrictions do.
pub(super) fn approach(frame: &Frame, first: &Point) -> Option<Approach> {
    let straight = frame.m == 0 || (frame.equations.linear() && infeasibility(&first.sides) <= 1e-9);
    if !straight || frame.map.is_some() {
        return None;
    }
    let inside = frame.tangent(&first.phi)?.inside;
    let bounds = |j: usize| frame.likelihood.parameters()[j].range;
    let held: Vec<usize> = (0..frame.n)
        .filter(|&j| {
            let range = bounds(j);
            let positive = range.low == 0.0 && range.high == f64::INFINITY;
            positive && !inside[j] && first.phi[j] > 0.0 && first.jacobian.column(j).iter().all(|&x| x == 0.0)
        })
        .collect();
    let free: Vec<usize> = (0..frame.n).filter(|j| !held.contains(j)).collect();
    let mut search = Search { frame, held, free, floor: first.phi.abs() * SMALLEST, reach: FIRST };
    let mut out = Approach { point: search.follow(first.clone()), trace: Vec::new() };
    while out.trace.len() < STEPS {
        let Some((point, part)) = search.step(&out.point) else { break };
        out.trace.push(line(frame, &out.point, out.trace.len(), part));
        out.point = search.follow(point);
    }
    Some(out)
}

fn line(frame: &Frame, point: &Point, iteration: usize, length: f64) -> Step {
    let local = Local::at(frame, point, scale(point));
    Step {
        iteration,
        log_likelihood: point.value,
        feasibility: local.infeasibility,
        stationarity: local.stationarity,
        length,
        shift: 0.0,
    }
}

struct Search<'a> {
    frame: &'a Frame<'a>,
    /// Scales outside the squares.
    held: Vec<usize>,
    free: Vec<usize>,
    floor: Vector,
    reach: f64,
}

/// A quadratic model in its own axes.
struct Axes {
    values: Vec<f64>,
    slopes: Vector,
}

impl Axes {
    /// The step to the model's maximum within the radius, and whether it ends on the rim.
    fn within(&self, radius: f64) -> (Vector, bool) {
        let step = |damping: f64| {
            Vector::from_fn(self.values.len(), |k, _| {
                if self.slopes[k] == 0.0 { 0.0 } else { self.slopes[k] / (self.values[k] + damping) }
            })
        };
        let lowest = self.values.first().copied().unwrap_or(1.0);
        let plain = step(0.0);
        if lowest > 0.0 && plain.norm() <= radius {
            return (plain, false);
        }
        let mut low = (-lowest).max(0.0);
        let mut high = low + self.slopes.norm() / radius;
        for _ in 0..200 {
            let middle = (low.max(1e-12 * high) * high).sqrt();
            // too long, or undefined at the pole
            if step(middle).norm() <= radius {
                high = middle
            } else {
                low = middle
            }
            if high - low <= 1e-10 * high {
                break;
            }
        }
        (step(high), true)
    }

    fn gain(&self, step: &Vector) -> f64 {
        (0..step.len()).map(|k| step[k] * (self.slopes[k] - 0.5 * self.values[k] * step[k])).sum()
    }
}

impl Search<'_> {
    /// The next point and the radius its step took; `None` where the rest is Newton's, or no step helps.
    fn step(&mut self, point: &Point) -> Option<(Point, f64)> {
        let size = self.free.len();
        let spare = scale(point);
        let length = |j: usize| {
            let own = point.phi[j].abs().max(self.floor[j]);
            if own > 0.0 { own } else { spare[j] }
        };
        let d = Vector::from_iterator(size, self.free.iter().map(|&j| length(j)));
        let tangent = self.frame.tangent(&point.phi)?.hessian;
        let w = Matrix::from_fn(size, size, |a, b| -tangent[(self.free[a], self.free[b])] * d[a] * d[b]);
        let g = Vector::from_fn(size, |a, _| point.gradient[self.free[a]] * d[a]);
        let rows = Matrix::from_fn(self.frame.m, size, |i, a| point.jacobian[(i, self.free[a])] * d[a]);
        let z = Rows::of(&rows).z;
        let (values, vectors) = eigen(&(z.transpose() * &w * &z))?;
        let directions = &z * vectors;
        let axes = Axes { slopes: directions.tr_mul(&g), values };
        loop {
            let (along, rim) = axes.within(self.reach);
            let (promised, norm) = (axes.gain(&along), along.norm());
            if (!rim && promised < NEAR) || promised.is_nan() || norm < SHORTEST {
                return None;
            }
            let mut phi = point.phi.clone();
            let moved = &directions * &along;
            for (a, &j) in self.free.iter().enumerate() {
                phi[j] += moved[a] * d[a];
            }
            let inside = self.frame.contains(&self.frame.theta(&phi));
            let gain = if inside { self.frame.value(&phi) - point.value } else { f64::NAN };
            let part = if gain.is_finite() { gain / promised } else { -1.0 };
            if part < 0.25 {
                self.reach = norm * if part < 0.0 { 0.25 } else { 0.5 };
            } else if part > 0.7 && rim {
                self.reach = 3.0 * norm;
            }
            if part > ENOUGH
                && let Some(next) = self.frame.point(&phi)
            {
                return Some((next, norm));
            }
            self.reach = self.reach.min(0.5 * norm);
        }
    }

    /// Held scales brought to where l is largest by them: in one move where l = -a log s - c / s^2, as about a normal
    /// distribution.
    fn follow(&self, mut point: Point) -> Point {
        for _ in 0..4 {
            let mut logs = vec![0.0; self.held.len()];
            for (log, &j) in logs.iter_mut().zip(&self.held) {
                let s = point.phi[j];
                let (slope, curvature) = (s * point.gradient[j], s * point.gradient[j] + s * s * point.hessian[(j, j)]);
                let (c, a) = (-0.5 * curvature, -0.5 * curvature - slope);
                *log = if c > 0.0 && a > 0.0 { 0.5 * libm::log(c / a) } else { slope.signum() * 0.5 };
            }
            if logs.iter().all(|x| x.abs() < 1e-3) {
                break;
            }
            let mut part = 1.0;
            let better = loop {
                let mut phi = point.phi.clone();
                for (log, &j) in logs.iter().zip(&self.held) {
                    phi[j] *= libm::exp(part * log);
                }
                match self.frame.point(&phi) {
                    Some(next) if next.value > point.value => break Some(next),
                    _ if part < 0.05 => break None,
                    _ => part *= 0.3,
                }
            };
            match better {
                Some(next) => point = next,
                None => break,
            }
        }
        point
    }
}
