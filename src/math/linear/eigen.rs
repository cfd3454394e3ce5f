//! Eigenvalues of a symmetric matrix.

use super::{finite, square};
use crate::math::{Error, Matrix, Vector};
use nalgebra::SymmetricEigen;

/// Sweeps allowed per row: the implicit QR iteration needs two or three.
const SWEEPS: usize = 100;

/// Eigenvalues in ascending order and the matching orthonormal eigenvectors as columns, each with its largest component
/// positive. Only the symmetric part of the n x n matrix counts.
///
/// # Errors
/// Not square, not finite, or no convergence.
pub fn symmetric_eigen(m: &Matrix) -> Result<(Vector, Matrix), Error> {
    square(m, "the matrix of an eigenvalue problem")?;
    finite(m, "the matrix of an eigenvalue problem")?;
    let n = m.nrows();
    if n == 0 {
        return Ok((Vector::zeros(0), Matrix::zeros(0, 0)));
    }
    let symmetric = Matrix::from_fn(n, n, |i, j| 0.5 * m[(i, j)] + 0.5 * m[(j, i)]);
    let found = SymmetricEigen::try_new(symmetric, f64::EPSILON, SWEEPS * n)
        .ok_or(Error::NoConvergence { what: "eigenvalue iteration" })?;
    let mut order: Vec<usize> = (0..n).collect();
    order.sort_by(|&a, &b| found.eigenvalues[a].total_cmp(&found.eigenvalues[b]));
    let values = Vector::from_fn(n, |i, _| found.eigenvalues[order[i]]);
    let mut vectors = Matrix::zeros(n, n);
    for (to, &from) in order.iter().enumerate() {
        let column = found.eigenvectors.column(from);
        let largest = column.iamax();
        let sign = if column[largest] < 0.0 { -1.0 } else { 1.0 };
        vectors.set_column(to, &(column * sign));
    }
    finite(&vectors, "the eigenvectors")?;
    Ok((values, vectors))
}

#[cfg(test)]
mod tests {
    use super::symmetric_eigen;
    use crate::math::{Error, Matrix};

    #[test]
    fn known_spectrum() {
        // Second differences: eigenvalues 2 - 2 cos(k pi / (n + 1)).
        let n = 7;
        let m = Matrix::from_fn(n, n, |i, j| match i.abs_diff(j) {
            0 => 2.0,
            1 => -1.0,
            _ => 0.0,
        });
        let Ok((values, vectors)) = symmetric_eigen(&m) else { panic!("converges") };
        for k in 0..n {
            let wanted = 2.0 - 2.0 * libm::cos((k as f64 + 1.0) * std::f64::consts::PI / (n as f64 + 1.0));
            // Backward stable: a few eps of the norm, 4.
            assert!((values[k] - wanted).abs() < 1e-14);
        }
        assert!((&m * &vectors - &vectors * Matrix::from_diagonal(&values)).amax() < 1e-14);
        assert!((vectors.transpose() * &vectors - Matrix::identity(n, n)).amax() < 1e-14);
    }

    #[test]
    fn bad_matrices_are_errors() {
        assert!(matches!(symmetric_eigen(&Matrix::from_element(2, 2, f64::NAN)), Err(Error::NotFinite { .. })));
        assert!(matches!(symmetric_eigen(&Matrix::zeros(2, 3)), Err(Error::Shape { .. })));
        assert!(symmetric_eigen(&Matrix::zeros(0, 0)).is_ok());
        assert!(symmetric_eigen(&Matrix::zeros(3, 3)).is_ok());
    }
}
