//! Rank and null space of a Jacobian, and which of its rows depend on others.

use super::finite;
use crate::math::{Error, Matrix, Vector};
use nalgebra::SVD;

/// Iterations allowed per row of the padded matrix; the implicit QR iteration needs two or three.
const SWEEPS: usize = 100;

/// (rank, Z, singular values) of the m x n matrix J: Z is n x (n - rank) with orthonormal columns and J Z = 0; the min(m, n)
/// singular values descend, and those at most `tol` times the largest count as zero. No rows means rank 0 and the identity.
///
/// # Errors
/// J is not finite, or the decomposition does not converge.
pub fn null_space(j: &Matrix, tol: f64) -> Result<(usize, Matrix, Vector), Error> {
    finite(j, "the Jacobian")?;
    let (m, n) = j.shape();
    if m == 0 || n == 0 || j.iter().all(|&v| v == 0.0) {
        return Ok((0, Matrix::identity(n, n), Vector::zeros(m.min(n))));
    }
    // Rows of zeros make V complete; a power of two brings the entries near one without rounding.
    let scale = libm::ldexp(1.0, -libm::ilogb(j.amax()));
    let mut padded = Matrix::zeros(m.max(n), n);
    padded.view_mut((0, 0), (m, n)).copy_from(&(j * scale));
    let svd = SVD::try_new(padded, false, true, f64::EPSILON, SWEEPS * m.max(n))
        .ok_or(Error::NoConvergence { what: "singular value decomposition" })?;
    let v_t = svd.v_t.ok_or(Error::NoConvergence { what: "singular value decomposition" })?;
    let values = svd.singular_values;
    let rank = values.iter().filter(|&&s| s > tol * values[0]).count();
    let basis = v_t.rows(rank, n - rank).transpose();
    finite(&basis, "the null space")?;
    Ok((rank, basis, values.rows(0, m.min(n)) / scale))
}

/// The rows of J which depend on those kept before them, in ascending order: what remains of such a row after
/// projection on the rows kept is at most `tol` times its own length. A row of zeros depends on nothing kept and is named too.
pub fn dependent_rows(j: &Matrix, tol: f64) -> Vec<usize> {
    let mut kept: Vec<Vector> = Vec::new();
    let mut dependent = Vec::new();
    for i in 0..j.nrows() {
        let largest = j.row(i).amax();
        let mut row: Vector = j.row(i).transpose() / if largest > 0.0 { largest } else { 1.0 };
        let length = row.norm();
        // Twice is enough (Kahan; Giraud and Langou 2002): the second pass removes what rounding left of the first.
        for _ in 0..2 {
            for q in &kept {
                let along = q.dot(&row);
                row.axpy(-along, q, 1.0);
            }
        }
        let rest = row.norm();
        if rest > tol * length {
            kept.push(row / rest);
        } else {
            dependent.push(i);
        }
    }
    dependent
}
