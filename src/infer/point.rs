//! A fit with what every formula needs there: derivatives, Jacobians, scale, tangent spaces.

use super::information::{Sandwich, sandwich};
use crate::likelihood::{Information, LogLikelihood, Order};
use crate::math::linear::{null_space, symmetric_eigen};
use crate::math::{Matrix, Vector};
use crate::restriction::{Role, System};
use crate::solve::Fit;

/// Eigenvalues of a scaled, projected information below this part of the largest are rounding, not information.
const DEFINITE: f64 = 1e-12;
/// A scaled restriction that keeps less than this part of its length beside the others depends on them (contract,
/// section 5: singular values below 1e-9 of the largest count as zero).
const DEPENDENT: f64 = 1e-9;
/// Share of a free direction below which a parameter does not move along it; an orthonormal basis carries 1e-16 noise.
const MOTIONLESS: f64 = 1e-13;

/// A fit seen against the whole system of restrictions, in working coordinates.
pub(super) struct Point<'a> {
    /// The log-likelihood.
    pub likelihood: &'a dyn LogLikelihood,
    /// All restrictions, tested ones included, whether or not this fit imposes them.
    pub system: &'a System,
    /// The fit.
    pub fit: &'a Fit,
    /// Gradient of l.
    pub gradient: Vector,
    /// Hessian of l.
    pub hessian: Matrix,
    /// Jacobian rows of what is not tested, and of the active edges.
    pub held: Matrix,
    /// Jacobian rows of the tested restrictions.
    pub tested: Matrix,
    /// Where the tested restrictions stand in the system.
    pub tested_at: Vec<usize>,
    /// Multipliers of the whole system, those of tested restrictions set to 0.
    pub held_multipliers: Vector,
}

impl<'a> Point<'a> {
    /// `multipliers` belong to the whole system; those of tested restrictions are not looked at.
    pub fn new(likelihood: &'a dyn LogLikelihood, system: &'a System, fit: &'a Fit, multipliers: &Vector) -> Self {
        let n = fit.phi.len();
        let evaluation = likelihood.evaluate(&fit.phi, Order::Hessian);
        let jacobian = likelihood.coordinates().jacobian(&system.jacobian(&fit.theta));
        let is_tested: Vec<bool> = system.items().iter().map(|r| r.role == Role::Tested).collect();
        let tested_at: Vec<usize> = (0..is_tested.len()).filter(|&i| is_tested[i]).collect();
        let held_at: Vec<usize> = (0..is_tested.len()).filter(|&i| !is_tested[i]).collect();
        let mut edges = Matrix::zeros(fit.edges.len(), n);
        for (row, edge) in fit.edges.iter().enumerate() {
            edges[(row, edge.parameter)] = 1.0;
        }
        let edges = likelihood.coordinates().jacobian(&edges);
        let mut gradient = evaluation.gradient;
        for edge in &fit.edges {
            // An imposed edge takes no part in any direction; an infinite slope there must not become 0 times infinity.
            if !gradient[edge.parameter].is_finite() {
                gradient[edge.parameter] = 0.0;
            }
        }
        let mut held_multipliers = multipliers.clone();
        tested_at.iter().for_each(|&i| held_multipliers[i] = 0.0);
        Point {
            likelihood,
            system,
            fit,
            gradient,
            hessian: evaluation.hessian,
            held: stack(&jacobian.select_rows(&held_at), &edges),
            tested: jacobian.select_rows(&tested_at),
            tested_at,
            held_multipliers,
        }
    }

    /// The natural step of each coordinate, I_jj^-1/2, 1 where that is unavailable.
    pub fn scale(bread: &Matrix) -> Vector {
        bread.diagonal().map(|d| if d.is_finite() && d > 0.0 { d.sqrt().recip() } else { 1.0 })
    }

    /// Positions (among the tested) of restrictions independent of the held ones and of each other, in order; those that
    /// the search found redundant are left out first. Their number is rank(H Z_A), the degrees of freedom.
    pub fn independent(&self, scale: &Vector) -> Vec<usize> {
        let z = free(&self.held, scale);
        let mut kept = Vec::new();
        let mut basis: Vec<Vector> = Vec::new();
        for (position, at) in self.tested_at.iter().enumerate() {
            if self.fit.redundant.contains(at) {
                continue;
            }
            let row = self.tested.row(position);
            let length = row.transpose().component_mul(scale).norm();
            let mut rest: Vector = z.tr_mul(&row.transpose());
            // Twice is enough (Kahan; Parlett, The Symmetric Eigenvalue Problem, section 6.9).
            for _ in 0..2 {
                for b in &basis {
                    let along = b.dot(&rest);
                    rest.axpy(-along, b, 1.0);
                }
            }
            let left = rest.norm();
            if left > DEPENDENT * length {
                basis.push(rest / left);
                kept.push(position);
            }
        }
        kept
    }

    /// Z (Z' I Z)^-1 Z' with Z the free directions under `rows`, and the filling. `Err` says in words that the matrix is
    /// not positive definite there, and which kinds would serve.
    pub fn inverse(
        &self,
        rows: &Matrix,
        kind: Information,
        multipliers: &Vector,
    ) -> Result<(Matrix, Sandwich), String> {
        let parts = sandwich(self, kind, multipliers)?;
        match projected_inverse(rows, &parts.bread) {
            Ok(c) => Ok((c, parts)),
            Err(ratio) => {
                let serving: Vec<&str> = [Information::Expected, Information::Outer, Information::Observed]
                    .into_iter()
                    .filter(|&other| other != kind && !(kind == Information::Robust && other == Information::Observed))
                    .filter(|&other| {
                        sandwich(self, other, multipliers).is_ok_and(|s| projected_inverse(rows, &s.bread).is_ok())
                    })
                    .map(Information::text)
                    .collect();
                let name =
                    if kind == Information::Robust { "observed (the bread of the robust form)" } else { kind.text() };
                let advice = match serving.as_slice() {
                    [] => "no other kind serves here either: free directions are not identified".to_string(),
                    some => format!("{} information would serve", some.join(" or ")),
                };
                Err(format!(
                    "the {name} information is not positive definite along the directions left free \
                     (smallest eigenvalue {ratio:.2e} of the largest); {advice}"
                ))
            }
        }
    }

    /// Names of parameters at a closed end of their range that are not held by an active edge: the tested restrictions put
    /// them there.
    pub fn put_on_edge(&self) -> Vec<&str> {
        let free = |j: usize| self.fit.edges.iter().all(|e| e.parameter != j);
        let on = |j: usize| {
            let (x, r) = (self.fit.theta[j], self.likelihood.parameters()[j].range);
            // A restriction is met to 1e-9 (contract, section 5), so its value may miss the end by that.
            (r.low_closed && (x - r.low).abs() <= 1e-9 * (1.0 + r.low.abs()))
                || (r.high_closed && (x - r.high).abs() <= 1e-9 * (1.0 + r.high.abs()))
        };
        (0..self.fit.theta.len())
            .filter(|&j| free(j) && on(j))
            .map(|j| self.likelihood.parameters()[j].name.as_str())
            .collect()
    }

    /// Names of the parameters on an active edge.
    pub fn edge_names(&self) -> Vec<&str> {
        self.fit.edges.iter().map(|e| self.likelihood.parameters()[e.parameter].name.as_str()).collect()
    }
}

/// One matrix above the other.
pub(super) fn stack(top: &Matrix, bottom: &Matrix) -> Matrix {
    let n = top.ncols().max(bottom.ncols());
    let mut out = Matrix::zeros(top.nrows() + bottom.nrows(), n);
    if top.nrows() > 0 {
        out.rows_mut(0, top.nrows()).copy_from(top);
    }
    if bottom.nrows() > 0 {
        out.rows_mut(top.nrows(), bottom.nrows()).copy_from(bottom);
    }
    out
}

/// A basis of the directions `rows` leave free, orthonormal in units of `scale`, n by k.
pub(super) fn free(rows: &Matrix, scale: &Vector) -> Matrix {
    let n = scale.len();
    let mut scaled = Matrix::zeros(rows.nrows(), n);
    for i in 0..rows.nrows() {
        let row = rows.row(i).transpose().component_mul(scale);
        let length = row.norm();
        if length > 0.0 {
            scaled.row_mut(i).copy_from(&(row / length).transpose());
        }
    }
    // Rows that are not finite leave nothing to stand on: no direction is called free.
    let mut z = null_space(&scaled, DEPENDENT).map_or_else(|_| Matrix::zeros(n, 0), |(_, z, _)| z);
    for j in 0..n {
        if z.row(j).norm() < MOTIONLESS {
            z.row_mut(j).fill(0.0);
        }
        z.row_mut(j).scale_mut(scale[j]);
    }
    z
}

/// C = Z (Z' I Z)^-1 Z'; `Err` holds the smallest eigenvalue of Z' I Z over the largest in size.
fn projected_inverse(rows: &Matrix, bread: &Matrix) -> Result<Matrix, f64> {
    let z = free(rows, &Point::scale(bread));
    let n = bread.nrows();
    if z.ncols() == 0 {
        return Ok(Matrix::zeros(n, n));
    }
    let inner = symmetric(&z.tr_mul(&(bread * &z)));
    let (eigenvalues, _) = symmetric_eigen(&inner).map_err(|_| f64::NAN)?;
    let (smallest, largest) = (eigenvalues[0], eigenvalues.amax());
    if !(smallest > DEFINITE * largest) {
        return Err(smallest / largest);
    }
    let factor = inner.cholesky().ok_or(smallest / largest)?;
    Ok(symmetric(&(&z * factor.solve(&z.transpose()))))
}

/// The symmetric part, so that rounding does not make a matrix lopsided.
pub(super) fn symmetric(matrix: &Matrix) -> Matrix {
    (matrix + matrix.transpose()) * 0.5
}
