//! Which trial points are good enough: better in the log-likelihood or in the restrictions (filter method of
//! Fletcher and Leyffer 2002, with the switching condition of Waechter and Biegler 2006).

use super::frame::{Frame, Point, gaps};
use crate::math::{Matrix, Vector};
use crate::restriction::Sides;

/// Least relative gain in one of the two measures.
const MARGIN: f64 = 1e-5;
/// Least part of the predicted gain in l.
const ARMIJO: f64 = 1e-4;
/// Residuals below this many standard errors are no residuals to the filter: the certificate asks for much less
/// than that makes, and rounding makes such.
const NOISE: f64 = 1e-10;

/// Pairs of (violation, -l) that no later point may be worse than in both.
#[derive(Debug, Clone)]
pub(super) struct Filter {
    weights: Vec<f64>,
    pairs: Vec<(f64, f64)>,
    cap: f64,
}

impl Filter {
    /// For a search from a point, whose Jacobian by phi and scale set the unit of each restriction.
    pub fn new(sides: &[Sides], jacobian: &Matrix, d: &Vector) -> Filter {
        let weights = weights(jacobian, d);
        let mut filter = Filter { weights, pairs: Vec::new(), cap: f64::INFINITY };
        filter.cap = 1e4 * filter.violation(sides).max(1.0);
        filter
    }

    /// Sum of residuals in standard errors.
    pub fn violation(&self, sides: &[Sides]) -> f64 {
        let sum: f64 = gaps(sides).iter().zip(&self.weights).map(|(c, w)| c.abs() / w).sum();
        (sum - NOISE).max(0.0)
    }

    /// Smallest norm of a row by u, in units of what it was where the search began.
    pub fn shrunk(&self, by_u: &Matrix) -> f64 {
        by_u.row_iter().zip(&self.weights).map(|(row, w)| row.norm() / w).fold(f64::INFINITY, f64::min)
    }

    /// Whether a point with this violation and l is not dominated.
    pub fn admits(&self, violation: f64, value: f64) -> bool {
        violation <= self.cap
            && self.pairs.iter().all(|&(v, f)| violation <= (1.0 - MARGIN) * v || -value <= f - MARGIN * v)
    }

    /// Forbids points that are worse than this one in both measures.
    pub fn add(&mut self, violation: f64, value: f64) {
        self.pairs.retain(|&(v, f)| v < violation || f < -value);
        self.pairs.push((violation, -value));
    }
}

/// Norms of the rows by u, 1 for an empty row.
pub(super) fn weights(jacobian: &Matrix, d: &Vector) -> Vec<f64> {
    jacobian
        .row_iter()
        .map(|row| {
            let norm = row.transpose().component_mul(d).norm();
            if norm > 0.0 && norm.is_finite() { norm } else { 1.0 }
        })
        .collect()
}

/// The test of one line search: where it starts and what the model promises.
pub(super) struct Test<'a> {
    filter: &'a Filter,
    violation: f64,
    value: f64,
    slope: f64,
}

/// What became of a trial point.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Trial {
    /// Accepted for its gain in l.
    Gain,
    /// Accepted; the start of the step joins the filter.
    Filtered,
    /// Refused.
    Refused,
}

impl<'a> Test<'a> {
    /// `slope`: directional derivative of l along the full step.
    pub fn new(filter: &'a Filter, from: &Point, slope: f64) -> Self {
        Test { filter, violation: filter.violation(&from.sides), value: from.value, slope }
    }

    /// Judges a trial at step length `length`.
    pub fn judge(&self, length: f64, sides: &[Sides], value: f64) -> Trial {
        let violation = self.filter.violation(sides);
        // Differences of l below its own rounding say nothing.
        let rounding = 1e-14 * (1.0 + self.value.abs());
        if !value.is_finite() || !self.filter.admits(violation, value + rounding) {
            return Trial::Refused;
        }
        let promising = self.slope > 0.0 && length * libm::pow(self.slope, 2.3) > libm::pow(self.violation, 1.1);
        if promising {
            let enough = value + rounding >= self.value + ARMIJO * length * self.slope;
            // A gain bought with a large violation is left to the correction step.
            return if enough && violation <= (1e3 * self.violation).max(1e2) { Trial::Gain } else { Trial::Refused };
        }
        let better =
            violation <= (1.0 - MARGIN) * self.violation || value + rounding >= self.value + MARGIN * self.violation;
        if better { Trial::Filtered } else { Trial::Refused }
    }

    /// Next step length after a refusal: the minimum of the parabola through what is known, within a tenth and a half.
    pub fn shorter(&self, length: f64, value: f64) -> f64 {
        if !value.is_finite() {
            return 0.25 * length;
        }
        let lost = self.slope * length - (value - self.value);
        let best =
            if lost > 0.0 && self.slope > 0.0 { self.slope * length * length / (2.0 * lost) } else { 0.5 * length };
        best.clamp(0.1 * length, 0.5 * length)
    }
}

/// Violation of the restrictions in the filter's unit at phi; `None` where they are undefined.
pub(super) fn sides_at(frame: &Frame, phi: &Vector) -> Option<Vec<Sides>> {
    frame.sides(&frame.theta(phi))
}
