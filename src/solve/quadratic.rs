//! The step: the quadratic model of the Lagrangian, maximised under linearised restrictions within the ranges.

use super::frame::Frame;
use super::local::Local;
use super::rank::Rows;
use crate::math::{Matrix, Vector};

/// Eigenvalues below this part of the largest are replaced; the certificate calls them flat below 1e-9.
const SMALLEST: f64 = 1e-10;

/// A step beyond this many radii, along a direction of positive curvature, shows the curvature to be rounding.
const FURTHEST: f64 = 1e6;

/// A quadratic model: gradient and (negated) Hessian by u, equations `j u = -c`, room to each bound.
pub(super) struct Model<'a> {
    pub frame: &'a Frame<'a>,
    pub d: &'a Vector,
    pub g: &'a Vector,
    pub w: Matrix,
    pub j: &'a Matrix,
    pub c: &'a Vector,
    pub room: Vec<f64>,
}

/// Where the model sends the point.
#[derive(Debug, Clone)]
pub(super) struct Plan {
    /// Step by u.
    pub u: Vector,
    /// Bounds active at the model's solution.
    pub edges: Vec<usize>,
    /// Decomposition of the active rows.
    pub rows: Rows,
    /// Largest amount added to an eigenvalue of the curvature.
    pub shift: f64,
    /// Part of the residuals that the step leaves, to first order (0: none).
    pub left: f64,
}

/// Newton's step on the face where the curvature is right there, else the step of a model made concave.
pub(super) fn plan(frame: &Frame, theta: &Vector, local: &Local, radius: f64) -> Option<Plan> {
    let room = frame.bounds.iter().map(|b| b.room(theta)).collect();
    let mut model = Model { frame, d: &local.d, g: &local.g, w: local.w.clone(), j: &local.j, c: &local.c, room };
    let face = local.edges();
    if let Some(plan) = model.newton(local, &face)
        && plan.u.amax() <= FURTHEST * radius
    {
        return Some(plan);
    }
    let rows = local.rows(frame, &[]);
    let shift = model.make_concave(local, &rows, radius)?;
    model.maximise(&face, shift)
}

impl Model<'_> {
    /// The plain step on a face; `None` if the curvature there is not that of a maximum, a bound is crossed or an
    /// edge pulls inwards.
    fn newton(&self, local: &Local, face: &[usize]) -> Option<Plan> {
        let rows = local.rows(self.frame, face);
        let (values, vectors) = local.spectrum(&rows.z)?;
        if let (Some(&low), Some(&high)) = (values.first(), values.last())
            && low <= SMALLEST * high
        {
            return None;
        }
        let residual = stacked(&-self.c, face.len());
        let normal = rows.solve(&residual);
        let slope = vectors.tr_mul(&(self.g - &self.w * &normal));
        let tangent = Vector::from_iterator(values.len(), slope.iter().zip(&values).map(|(s, v)| s / v));
        let u = normal + vectors * tangent;
        let crosses =
            (0..self.room.len()).any(|b| !face.contains(&b) && self.outward(b).dot(&u) > self.room[b] * (1.0 + 1e-12));
        let multipliers = rows.multipliers(&(self.g - &self.w * &u));
        let inward = (0..face.len()).any(|k| multipliers[self.frame.m + k] < 0.0);
        if crosses || inward || u.iter().any(|x| !x.is_finite()) {
            return None;
        }
        Some(self.finish(u, face.to_vec(), rows, 0.0))
    }

    /// Replaces eigenvalues on the null space of the restrictions that are not positive by positive ones: their
    /// absolute value, at least so large that the step along them stays within `radius`. Returns the largest change.
    fn make_concave(&mut self, local: &Local, rows: &Rows, radius: f64) -> Option<f64> {
        let (values, vectors) = local.spectrum(&rows.z)?;
        let largest = values.iter().fold(0.0, |a: f64, v| a.max(v.abs()));
        let normal = rows.solve(&-self.c);
        let slope = vectors.tr_mul(&(self.g - &self.w * &normal));
        let mut shift: f64 = 0.0;
        for (k, &value) in values.iter().enumerate() {
            let better = if value > SMALLEST * largest && value > 0.0 {
                value.max(slope[k].abs() / (FURTHEST * radius))
            } else {
                let floor = (SMALLEST * largest).max(slope[k].abs() / radius).max(value.abs());
                if floor > 0.0 { floor } else { 1.0 }
            };
            if better > value {
                let v = vectors.column(k);
                self.w.ger(better - value, &v, &v, 1.0);
                shift = shift.max(better - value);
            }
        }
        Some(shift)
    }

    /// Maximises the concave model by active sets. Equations need not hold at the start: while bounds stop the way
    /// to them, the part still missing shrinks with every piece gone.
    pub fn maximise(&self, face: &[usize], shift: f64) -> Option<Plan> {
        let m = self.frame.m.min(self.j.nrows());
        let mut u = Vector::zeros(self.frame.n);
        let mut missing = -self.c;
        let mut edges = face.to_vec();
        let limit = 20 + 6 * self.room.len();
        for turn in 0..limit {
            let rows = Rows::of(&super::local::stack(self.frame, self.j, self.d, &edges));
            let normal = rows.solve(&stacked(&missing, edges.len()));
            let slope = self.g - &self.w * &u;
            let reduced = rows.z.transpose() * &self.w * &rows.z;
            let right = rows.z.tr_mul(&(&slope - &self.w * &normal));
            let tangent = if reduced.nrows() == 0 {
                Vector::zeros(0)
            } else {
                reduced.clone().cholesky().map(|l| l.solve(&right)).or_else(|| reduced.lu().solve(&right))?
            };
            let q = normal + &rows.z * tangent;
            if q.iter().any(|x| !x.is_finite()) {
                return None;
            }
            let late = turn > limit / 2;
            let stop = self.first_bound(&u, &q, &edges, late);
            let part = stop.map_or(1.0, |s| s.1);
            u.axpy(part, &q, 1.0);
            missing.axpy(-part, &(self.j * &q), 1.0);
            if let Some((b, _)) = stop {
                edges.push(b);
                continue;
            }
            let multipliers = rows.multipliers(&(self.g - &self.w * &u));
            let sizes = (0..edges.len()).map(|k| (k, multipliers[m + k] * self.outward(edges[k]).norm()));
            let wrong = sizes.filter(|&(_, x)| x < -1e-12);
            let release =
                if late { wrong.min_by_key(|&(k, _)| edges[k]) } else { wrong.min_by(|a, b| a.1.total_cmp(&b.1)) };
            match release {
                Some((k, _)) => {
                    edges.remove(k);
                }
                None => return Some(self.finish(u, edges, rows, shift)),
            }
        }
        None
    }

    /// The first bound on the way from u along q, with the part of q that leads there.
    fn first_bound(&self, u: &Vector, q: &Vector, edges: &[usize], late: bool) -> Option<(usize, f64)> {
        let tiny = 1e-14 * q.amax();
        let mut first: Option<(usize, f64)> = None;
        for b in (0..self.room.len()).filter(|b| !edges.contains(b)) {
            let row = self.outward(b);
            let speed = row.dot(q);
            if speed <= tiny * row.norm() {
                continue;
            }
            let part = ((self.room[b] - row.dot(u)) / speed).max(0.0);
            let sooner = first.is_none_or(|f| if late { part < f.1 } else { part <= f.1 });
            if part < 1.0 && sooner {
                first = Some((b, part));
            }
        }
        first
    }

    fn outward(&self, b: usize) -> Vector {
        self.frame.bound_row(&self.frame.bounds[b], self.d)
    }

    fn finish(&self, u: Vector, edges: Vec<usize>, rows: Rows, shift: f64) -> Plan {
        let after = self.c + self.j * &u;
        let sizes = (0..self.c.len()).map(|i| (after[i].abs(), self.j.row(i).norm())).filter(|&(_, norm)| norm > 0.0);
        let left = sizes.fold(0.0, |worst: f64, (c, norm)| worst.max(c / norm));
        Plan { u, edges, rows, shift, left }
    }
}

/// A right-hand side for restrictions, continued by zeros for `edges` edges.
pub(super) fn stacked(c: &Vector, edges: usize) -> Vector {
    c.clone().resize_vertically(c.len() + edges, 0.0)
}
