//! A fit with what every formula needs there: derivatives, Jacobians, scale, tangent spaces.

use super::information::{Sandwich, sandwich};
use crate::likelihood::{Information, LogLikelihood, Order, Parameter};
use crate::math::linear::{dependent_rows, null_space, symmetric_eigen};
use crate::math::{Matrix, Vector};
use crate::restriction::{Role, System};
use crate::solve::{Edge, End, Fit};

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
    /// Active edges that no restriction imposed by the fit already implies.
    pub edges: Vec<Edge>,
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
    /// `imposes_tested` says whether the fit imposes the tested restrictions. `multipliers` belong to the whole system;
    /// those of tested restrictions are not looked at.
    pub fn new(
        likelihood: &'a dyn LogLikelihood,
        system: &'a System,
        fit: &'a Fit,
        imposes_tested: bool,
        multipliers: &Vector,
    ) -> Self {
        let evaluation = likelihood.evaluate(&fit.phi, Order::Hessian);
        let jacobian = likelihood.coordinates().jacobian(&system.jacobian(&fit.theta));
        let is_tested: Vec<bool> = system.items().iter().map(|r| r.role == Role::Tested).collect();
        let tested_at: Vec<usize> = (0..is_tested.len()).filter(|&i| is_tested[i]).collect();
        let held_at: Vec<usize> = (0..is_tested.len()).filter(|&i| !is_tested[i]).collect();
        let tested = jacobian.select_rows(&tested_at);
        let maintained = jacobian.select_rows(&held_at);
        // An edge that the restrictions alone imply adds nothing; the whole slope there belongs to their multipliers.
        let imposed = if imposes_tested { jacobian } else { maintained.clone() };
        let all = edge_rows(likelihood, &fit.edges);
        let first = imposed.nrows();
        let implied = dependent_rows(&stack(&imposed, &all), DEPENDENT);
        let edges: Vec<Edge> = fit
            .edges
            .iter()
            .enumerate()
            .filter(|(k, _)| !implied.contains(&(first + k)))
            .map(|(_, e)| e.clone())
            .collect();
        let held = stack(&maintained, &edge_rows(likelihood, &edges));
        // At a kink the slope that the first-order conditions hold with, not that of one side.
        let mut gradient = fit.slope.clone().unwrap_or(evaluation.gradient);
        if gradient.iter().any(|x| !x.is_finite()) {
            // A parameter that cannot move takes part in no direction; its slope must not become 0 times infinity.
            let pinned = pinned(&held, gradient.len());
            gradient.iter_mut().zip(pinned).filter(|(x, pinned)| *pinned && !x.is_finite()).for_each(|(x, _)| *x = 0.0);
        }
        let mut held_multipliers = multipliers.clone();
        tested_at.iter().for_each(|&i| held_multipliers[i] = 0.0);
        Point {
            likelihood,
            system,
            fit,
            edges,
            gradient,
            hessian: evaluation.hessian,
            held,
            tested,
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

    /// C = Z (Z' I Z)^-1 Z' by its root, with Z the free directions under `rows`, and what was inverted. `Err` says in
    /// words that the matrix is not positive definite there, and which kinds would serve.
    pub fn inverse(
        &self,
        rows: &Matrix,
        kind: Information,
        multipliers: &Vector,
    ) -> Result<(Matrix, Sandwich), String> {
        let parts = sandwich(self, kind, multipliers, rows)?;
        match root_of_inverse(rows, &parts.bread) {
            Ok(root) => Ok((root, parts)),
            Err(ratio) => {
                let serving: Vec<&str> = [Information::Expected, Information::Outer, Information::Observed]
                    .into_iter()
                    .filter(|&other| other != kind && !(kind == Information::Robust && other == Information::Observed))
                    .filter(|&other| {
                        sandwich(self, other, multipliers, rows).is_ok_and(|s| root_of_inverse(rows, &s.bread).is_ok())
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

    /// Which end of its range each parameter stands on.
    pub fn ends(&self) -> Vec<Option<End>> {
        // A restriction is met to 1e-9 (contract, section 5), so its value may miss the end by that.
        let near = |x: f64, end: f64| (x - end).abs() <= 1e-9 * (1.0 + end.abs());
        let end = |(p, &x): (&Parameter, &f64)| match p.range {
            r if r.low_closed && near(x, r.low) => Some(End::Lower),
            r if r.high_closed && near(x, r.high) => Some(End::Upper),
            _ => None,
        };
        self.likelihood.parameters().iter().zip(self.fit.theta.iter()).map(end).collect()
    }

    /// Names of parameters that the tested restrictions put on an end of their range.
    pub fn put_on_edge(&self) -> Vec<&str> {
        let pinned = pinned(&self.held, self.fit.theta.len());
        let names = self.likelihood.parameters().iter().map(|p| p.name.as_str());
        let all = names.zip(self.ends()).zip(pinned);
        all.filter(|((_, end), pinned)| end.is_some() && !pinned).map(|((name, _), _)| name).collect()
    }

    /// Names of the parameters on an active edge.
    pub fn edge_names(&self) -> Vec<&str> {
        self.edges.iter().map(|e| self.likelihood.parameters()[e.parameter].name.as_str()).collect()
    }
}

/// Rows e_j of these edges, by working coordinates.
fn edge_rows(likelihood: &dyn LogLikelihood, edges: &[Edge]) -> Matrix {
    let mut rows = Matrix::zeros(edges.len(), likelihood.parameters().len());
    edges.iter().enumerate().for_each(|(k, edge)| rows[(k, edge.parameter)] = 1.0);
    likelihood.coordinates().jacobian(&rows)
}

/// Which of `n` coordinates cannot move under `rows`.
pub(super) fn pinned(rows: &Matrix, n: usize) -> Vec<bool> {
    let z = free(rows, &Vector::from_element(n, 1.0));
    (0..n).map(|j| z.row(j).norm() <= DEPENDENT).collect()
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

/// R with R R' = Z (Z' I Z)^-1 Z', n by the number of free directions; `Err` holds the smallest eigenvalue of Z' I Z over
/// the largest in size. Through the root what cannot vary keeps a variance of 0 to rounding, which C itself would cancel
/// to half the digits.
fn root_of_inverse(rows: &Matrix, bread: &Matrix) -> Result<Matrix, f64> {
    let z = free(rows, &Point::scale(bread));
    if z.ncols() == 0 {
        return Ok(z);
    }
    let inner = symmetric(&z.tr_mul(&(bread * &z)));
    let (eigenvalues, _) = symmetric_eigen(&inner).map_err(|_| f64::NAN)?;
    let (smallest, largest) = (eigenvalues[0], eigenvalues.amax());
    let definite = smallest > DEFINITE * largest;
    let factor = inner.cholesky().filter(|_| definite).ok_or(smallest / largest)?;
    let half = factor.l().solve_lower_triangular(&z.transpose()).ok_or(smallest / largest)?;
    Ok(half.transpose())
}

/// The symmetric part, so that rounding does not make a matrix lopsided.
pub(super) fn symmetric(matrix: &Matrix) -> Matrix {
    (matrix + matrix.transpose()) * 0.5
}
