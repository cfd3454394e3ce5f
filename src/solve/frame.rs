//! What stays the same during a search: the likelihood, the restrictions, the ranges; and points evaluated in it.

use std::cell::Cell;

use super::End;
use super::equations::Equations;
use crate::likelihood::{LogLikelihood, Order, Tangent};
use crate::math::{Matrix, Vector};
use crate::restriction::Sides;

/// Share of the way to an open end that one step may go.
const TOWARDS_OPEN: f64 = 0.9;

/// A finite end of a parameter's range.
#[derive(Debug, Clone)]
pub(super) struct Bound {
    pub parameter: usize,
    pub end: End,
    pub at: f64,
    pub closed: bool,
}

impl Bound {
    /// +1 at an upper end, -1 at a lower: outwards.
    pub fn sign(&self) -> f64 {
        match self.end {
            End::Lower => -1.0,
            End::Upper => 1.0,
        }
    }

    /// How far theta may still go; 0 on a closed end.
    pub fn room(&self, theta: &Vector) -> f64 {
        let distance = (self.sign() * (self.at - theta[self.parameter])).max(0.0);
        if self.closed { distance } else { TOWARDS_OPEN * distance }
    }
}

/// The problem in working coordinates.
pub(super) struct Frame<'a> {
    pub likelihood: &'a dyn LogLikelihood,
    pub equations: &'a dyn Equations,
    pub n: usize,
    pub m: usize,
    pub bounds: Vec<Bound>,
    /// T of theta = T phi; `None` for the identity.
    pub map: Option<Matrix>,
    passes: Cell<usize>,
}

/// A point with all that is known there. Everything in it is finite.
#[derive(Debug, Clone)]
pub(super) struct Point {
    pub phi: Vector,
    pub theta: Vector,
    pub value: f64,
    pub gradient: Vector,
    pub hessian: Matrix,
    pub sides: Vec<Sides>,
    /// By phi, m by n.
    pub jacobian: Matrix,
}

/// left - right of each restriction.
pub(super) fn gaps(sides: &[Sides]) -> Vector {
    Vector::from_iterator(sides.len(), sides.iter().map(|s| s.left - s.right))
}

/// max |c| / (1 + |left| + |right|).
pub(super) fn infeasibility(sides: &[Sides]) -> f64 {
    sides.iter().map(|s| (s.left - s.right).abs() / (1.0 + s.left.abs() + s.right.abs())).fold(0.0, f64::max)
}

impl<'a> Frame<'a> {
    pub fn new(likelihood: &'a dyn LogLikelihood, equations: &'a dyn Equations) -> Self {
        let parameters = likelihood.parameters();
        let n = parameters.len();
        let mut bounds = Vec::new();
        for (j, p) in parameters.iter().enumerate() {
            let ends = [(End::Lower, p.range.low, p.range.low_closed), (End::Upper, p.range.high, p.range.high_closed)];
            for (end, at, closed) in ends {
                if at.is_finite() {
                    bounds.push(Bound { parameter: j, end, at, closed });
                }
            }
        }
        let coordinates = likelihood.coordinates();
        let map = (!coordinates.is_identity()).then(|| coordinates.matrix(n));
        Frame { likelihood, equations, n, m: equations.len(), bounds, map, passes: Cell::new(0) }
    }

    /// Passes over the data so far.
    pub fn passes(&self) -> usize {
        self.passes.get()
    }

    /// Name of a parameter.
    pub fn name(&self, j: usize) -> &str {
        &self.likelihood.parameters()[j].name
    }

    /// theta by phi, closed ends hit to rounding made exact.
    pub fn theta(&self, phi: &Vector) -> Vector {
        let mut theta = self.likelihood.coordinates().theta(phi);
        if self.map.is_some() {
            for b in self.bounds.iter().filter(|b| b.closed) {
                let x = &mut theta[b.parameter];
                if (*x - b.at).abs() <= 1e-14 * (b.at.abs() + x.abs() + phi.amax()) {
                    *x = b.at;
                }
            }
        }
        theta
    }

    /// phi by theta.
    pub fn phi(&self, theta: &Vector) -> Vector {
        self.likelihood.coordinates().phi(theta)
    }

    /// `phi + D u`, kept inside closed ends exactly.
    pub fn moved(&self, phi: &Vector, u: &Vector, d: &Vector) -> Vector {
        let step = u.component_mul(d);
        let mut out = phi + &step;
        if self.map.is_none() {
            for b in self.bounds.iter().filter(|b| b.closed) {
                let j = b.parameter;
                let x = &mut out[j];
                // A step meant to end on the edge misses it by a rounding: of what was added, or of the solution of
                // the linear system, in which a standard error is 1.
                let slip = 4.0 * f64::EPSILON * (phi[j].abs() + step[j].abs() + d[j]);
                if b.sign() * (*x - b.at) > -slip {
                    *x = b.at;
                }
            }
        }
        out
    }

    /// Whether theta lies in all ranges.
    pub fn contains(&self, theta: &Vector) -> bool {
        self.likelihood.parameters().iter().zip(theta.iter()).all(|(p, &x)| p.range.contains(x))
    }

    /// l at phi.
    pub fn value(&self, phi: &Vector) -> f64 {
        self.passes.set(self.passes.get() + 1);
        self.likelihood.evaluate(phi, Order::Value).value
    }

    /// Gradient of l at phi with its value; `None` where either is not finite.
    pub fn gradient(&self, phi: &Vector) -> Option<(f64, Vector)> {
        self.passes.set(self.passes.get() + 1);
        let e = self.likelihood.evaluate(phi, Order::Gradient);
        (e.value.is_finite() && e.gradient.iter().all(|x| x.is_finite())).then_some((e.value, e.gradient))
    }

    /// The model of Gauss and Newton at phi, where l has one and it is finite.
    pub fn tangent(&self, phi: &Vector) -> Option<Tangent> {
        let tangent = self.likelihood.tangent(phi)?;
        self.passes.set(self.passes.get() + 1);
        tangent.hessian.iter().all(|x| x.is_finite()).then_some(tangent)
    }

    /// Both sides at phi, and the Jacobian by phi; `None` where something is not finite.
    pub fn restrictions(&self, phi: &Vector) -> Option<(Vec<Sides>, Matrix)> {
        let theta = self.theta(phi);
        let sides = self.sides(&theta)?;
        let mut jacobian = self.equations.jacobian(&theta);
        if let Some(t) = &self.map {
            jacobian *= t;
        }
        jacobian.iter().all(|x| x.is_finite()).then_some((sides, jacobian))
    }

    /// Both sides at theta; `None` where one is not finite.
    pub fn sides(&self, theta: &Vector) -> Option<Vec<Sides>> {
        let sides = self.equations.sides(theta);
        sides.iter().all(|s| s.left.is_finite() && s.right.is_finite()).then_some(sides)
    }

    /// Everything at phi; `None` where something is not finite.
    pub fn point(&self, phi: &Vector) -> Option<Point> {
        let (sides, jacobian) = self.restrictions(phi)?;
        self.passes.set(self.passes.get() + 1);
        let e = self.likelihood.evaluate(phi, Order::Hessian);
        let finite = e.value.is_finite()
            && e.gradient.len() == self.n
            && e.gradient.iter().chain(e.hessian.iter()).all(|x| x.is_finite());
        finite.then(|| Point {
            phi: phi.clone(),
            theta: self.theta(phi),
            value: e.value,
            gradient: e.gradient,
            hessian: e.hessian,
            sides,
            jacobian,
        })
    }

    /// Minus the Hessian of the Lagrangian by phi.
    pub fn curvature(&self, point: &Point, multipliers: &Vector) -> Matrix {
        let mut w = -&point.hessian;
        if self.m > 0 && multipliers.iter().any(|&x| x != 0.0) {
            let c = self.equations.curvature(&point.theta, multipliers);
            w += match &self.map {
                Some(t) => t.transpose() * c * t,
                None => c,
            };
        }
        w
    }

    /// Row of a bound by scaled coordinates u (phi = D u): outward positive.
    pub fn bound_row(&self, b: &Bound, d: &Vector) -> Vector {
        let mut row = Vector::zeros(self.n);
        match &self.map {
            Some(t) => row.copy_from(&t.row(b.parameter).transpose()),
            None => row[b.parameter] = 1.0,
        }
        row.component_mul_assign(d);
        row * b.sign()
    }
}
