//! The Lagrangian at a point, in scaled coordinates u with phi = D u.

use super::frame::{Frame, Point, gaps, infeasibility};
use super::rank::{Rows, eigen};
use crate::math::{Matrix, Vector};

/// An edge multiplier below this, in log-likelihood per standard error, has no sign.
const WEAK: f64 = 1e-9;

/// Largest standard error believed, relative to 1 + |phi|: beyond it the information is rounding.
const WIDEST: f64 = 1e8;

/// Newton's step in a coordinate by itself, relative to 1 + |phi|, beyond which its curvature is rounding.
const FURTHEST: f64 = 1e10;

/// d_j = 1 / sqrt(|Hessian_jj|), 1 where that is not to be had.
pub(super) fn scale(point: &Point) -> Vector {
    Vector::from_fn(point.phi.len(), |j, _| {
        let (information, size) = (point.hessian[(j, j)].abs(), 1.0 + point.phi[j].abs());
        let d = 1.0 / information.sqrt();
        let real = information > 0.0 && point.gradient[j].abs() <= FURTHEST * size * information;
        if real && d.is_finite() { d.min(WIDEST * size) } else { 1.0 }
    })
}

/// First and second order at a point, with least-squares multipliers.
#[derive(Debug, Clone)]
pub(super) struct Local {
    /// Scale D.
    pub d: Vector,
    /// Gradient of l by u.
    pub g: Vector,
    /// Jacobian by u, m by n.
    pub j: Matrix,
    /// left - right.
    pub c: Vector,
    /// Minus the Hessian of the Lagrangian by u.
    pub w: Matrix,
    /// One multiplier a restriction.
    pub lambda: Vector,
    /// Bounds on which the point stands and which hold it, with their outward multipliers (not negative).
    pub face: Vec<(usize, f64)>,
    /// Largest component of the Lagrangian's gradient by u.
    pub stationarity: f64,
    /// Largest residual in standard errors: |c_i| over the norm of its row by u.
    pub violation: f64,
    /// Largest residual as the contract measures it.
    pub infeasibility: f64,
}

impl Local {
    /// At a point, scaled by `d`.
    pub fn at(frame: &Frame, point: &Point, d: Vector) -> Local {
        let g = point.gradient.component_mul(&d);
        let mut j = point.jacobian.clone();
        for (k, mut column) in j.column_iter_mut().enumerate() {
            column *= d[k];
        }
        let c = gaps(&point.sides);
        let mut face: Vec<usize> = (0..frame.bounds.len())
            .filter(|&b| frame.bounds[b].closed && frame.bounds[b].room(&point.theta) == 0.0)
            .collect();
        let (multipliers, rest) = loop {
            let a = stack(frame, &j, &d, &face);
            let multipliers = Rows::of(&a).multipliers(&g);
            let rest = &g - a.tr_mul(&multipliers);
            // The edge that holds the point back most against the slope of l lets go.
            let wrong = (0..face.len())
                .map(|k| (k, multipliers[frame.m + k] * a.row(frame.m + k).norm()))
                .filter(|&(_, x)| x < -WEAK)
                .min_by(|x, y| x.1.total_cmp(&y.1));
            match wrong {
                Some((k, _)) => face.remove(k),
                None => break (multipliers, rest),
            };
        };
        let lambda = multipliers.rows(0, frame.m).into_owned();
        let mut w = frame.curvature(point, &lambda);
        for ((r, k), x) in (0..frame.n).flat_map(|k| (0..frame.n).map(move |r| (r, k))).zip(w.iter_mut()) {
            *x *= d[r] * d[k];
        }
        let violation = (0..frame.m)
            .map(|i| (c[i].abs(), j.row(i).norm()))
            .filter(|&(_, norm)| norm > 0.0)
            .fold(0.0, |worst: f64, (c, norm)| worst.max(c / norm));
        Local {
            stationarity: rest.amax(),
            violation,
            infeasibility: infeasibility(&point.sides),
            face: face.iter().enumerate().map(|(k, &b)| (b, multipliers[frame.m + k].max(0.0))).collect(),
            d,
            g,
            j,
            c,
            w,
            lambda,
        }
    }

    /// How far the point is from satisfying the first-order conditions; 0 at a solution.
    pub fn error(&self) -> f64 {
        // A residual of 1e-9 fails the certificate, a stationarity of 1e-7 does: weigh them alike.
        self.stationarity.max(self.violation).max(100.0 * self.infeasibility)
    }

    /// Bounds of the face, for stacking.
    pub fn edges(&self) -> Vec<usize> {
        self.face.iter().map(|f| f.0).collect()
    }

    /// Bounds of the face whose multiplier has a sign.
    pub fn strong(&self, frame: &Frame) -> Vec<usize> {
        let holds = |&&(b, x): &&(usize, f64)| x * frame.bound_row(&frame.bounds[b], &self.d).norm() > WEAK;
        self.face.iter().filter(holds).map(|f| f.0).collect()
    }

    /// Jacobian of restrictions and of the given edges, decomposed.
    pub fn rows(&self, frame: &Frame, edges: &[usize]) -> Rows {
        Rows::of(&stack(frame, &self.j, &self.d, edges))
    }

    /// Eigenvalues (ascending) of the curvature along the columns of z, and the eigenvectors by u.
    pub fn spectrum(&self, z: &Matrix) -> Option<(Vec<f64>, Matrix)> {
        let (values, vectors) = eigen(&(z.transpose() * &self.w * z))?;
        Some((values, z * vectors))
    }
}

/// The Jacobian by u, with a row for each of the given bounds below it.
pub(super) fn stack(frame: &Frame, j: &Matrix, d: &Vector, edges: &[usize]) -> Matrix {
    let m = j.nrows();
    let mut a = Matrix::zeros(m + edges.len(), frame.n);
    a.rows_mut(0, m).copy_from(j);
    for (k, &b) in edges.iter().enumerate() {
        a.row_mut(m + k).copy_from(&frame.bound_row(&frame.bounds[b], d).transpose());
    }
    a
}
