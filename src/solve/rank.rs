//! Orthonormal bases of the rows of a Jacobian and of the directions they leave free.

use crate::math::linear::symmetric_eigen;
use crate::math::{Matrix, Vector};

/// Residual of a normalised row, below which it counts as dependent on those before it (contract: 1e-9 of the largest).
pub(super) const DEPENDENT: f64 = 1e-9;

/// Rows taken in order; one that depends on those before it is dropped. With the kept rows normalised,
/// `A = R' Y'`, Y orthonormal; Z completes Y. Gram-Schmidt applied twice keeps Y orthonormal to rounding.
#[derive(Debug, Clone)]
pub(super) struct Rows {
    /// Indices of independent rows, in order.
    pub kept: Vec<usize>,
    /// Indices of dependent rows, in order.
    pub dropped: Vec<usize>,
    /// n by (n - rank): the free directions.
    pub z: Matrix,
    y: Matrix,
    r: Matrix,
    norms: Vec<f64>,
}

impl Rows {
    /// Decomposes the rows of `a` (m by n), each in the unit of its own norm.
    pub fn of(a: &Matrix) -> Rows {
        Rows::within(a, a.row_iter().map(|row| row.norm()).collect(), DEPENDENT)
    }

    /// Decomposes the rows of `a`, each in the unit given; dependent below `tolerance` of that unit.
    pub fn within(a: &Matrix, norms: Vec<f64>, tolerance: f64) -> Rows {
        let n = a.ncols();
        let mut kept = Vec::new();
        let mut dropped = Vec::new();
        let mut basis: Vec<Vector> = Vec::new();
        let mut columns: Vec<Vec<f64>> = Vec::new();
        for (i, &size) in norms.iter().enumerate() {
            let row = a.row(i).transpose();
            let mut column = vec![0.0; basis.len()];
            let mut rest = if size > 0.0 { row / size } else { row };
            for _ in 0..2 {
                for (k, q) in basis.iter().enumerate() {
                    let along = q.dot(&rest);
                    rest.axpy(-along, q, 1.0);
                    column[k] += along;
                }
            }
            let left = rest.norm();
            if left > tolerance && basis.len() < n {
                column.push(left);
                columns.push(column);
                basis.push(rest / left);
                kept.push(i);
            } else {
                dropped.push(i);
            }
        }
        let k = kept.len();
        let mut r = Matrix::zeros(k, k);
        for (j, column) in columns.iter().enumerate() {
            for (i, &value) in column.iter().enumerate() {
                r[(i, j)] = value;
            }
        }
        let y = if k == 0 { Matrix::zeros(n, 0) } else { Matrix::from_columns(&basis) };
        let z = complement(&y);
        Rows { kept, dropped, z, y, r, norms }
    }

    /// Shortest u with `A u = right` on the kept rows; `right` has one entry a row of A.
    pub fn solve(&self, right: &Vector) -> Vector {
        let b = Vector::from_iterator(self.kept.len(), self.kept.iter().map(|&i| right[i] / self.norms[i]));
        match self.r.tr_solve_upper_triangular(&b) {
            Some(s) if !self.kept.is_empty() => &self.y * s,
            _ => Vector::zeros(self.y.nrows()),
        }
    }

    /// Least-squares multipliers of `gradient = A' multipliers`, one a row of A, 0 for the dropped.
    pub fn multipliers(&self, gradient: &Vector) -> Vector {
        let mut out = Vector::zeros(self.norms.len());
        if self.kept.is_empty() {
            return out;
        }
        if let Some(x) = self.r.solve_upper_triangular(&self.y.tr_mul(gradient)) {
            for (k, &i) in self.kept.iter().enumerate() {
                out[i] = x[k] / self.norms[i];
            }
        }
        out
    }
}

/// Columns that complete the orthonormal columns of `y` to a basis.
fn complement(y: &Matrix) -> Matrix {
    let (n, k) = y.shape();
    let mut q = Matrix::identity(n, n);
    if k > 0 {
        y.clone().qr().q_tr_mul(&mut q);
    }
    q.transpose().columns(k, n - k).into_owned()
}

/// Eigenvalues (ascending) and vectors of a symmetric matrix; `None` where it has an entry that is not finite.
pub(super) fn eigen(m: &Matrix) -> Option<(Vec<f64>, Matrix)> {
    let (values, vectors) = symmetric_eigen(m).ok()?;
    Some((values.iter().copied().collect(), vectors))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bases_are_orthonormal_and_dependent_rows_are_the_later_ones() {
        let a = Matrix::from_row_slice(3, 4, &[1.0, 2.0, 0.0, 0.0, 2e8, 4e8, 0.0, 0.0, 0.0, 1e-8, 1e-8, 0.0]);
        let rows = Rows::of(&a);
        assert_eq!(rows.kept, vec![0, 2]);
        assert_eq!(rows.dropped, vec![1]);
        assert_eq!(rows.z.shape(), (4, 2));
        assert!((&a * &rows.z).abs().max() < 1e-7 * 1e-8 * 4e8 + 1e-6);
        assert!((rows.z.tr_mul(&rows.z) - Matrix::identity(2, 2)).abs().max() < 1e-15);
        let u = rows.solve(&Vector::from_vec(vec![3.0, 6e8, 2e-8]));
        assert!((&a * &u - Vector::from_vec(vec![3.0, 6e8, 2e-8])).abs().max() < 1e-6);
        let m = rows.multipliers(&a.tr_mul(&Vector::from_vec(vec![5.0, 0.0, 7.0])));
        assert!((m[0] - 5.0).abs() < 1e-13 && m[1] == 0.0 && (m[2] - 7.0).abs() < 1e-6);
    }

    #[test]
    fn no_rows_leave_everything_free_and_full_rows_nothing() {
        assert_eq!(Rows::of(&Matrix::zeros(0, 3)).z, Matrix::identity(3, 3));
        let all = Rows::of(&Matrix::identity(2, 2));
        assert_eq!(all.z.shape(), (2, 0));
        assert_eq!(all.solve(&Vector::from_vec(vec![1.0, 2.0])), Vector::from_vec(vec![1.0, 2.0]));
    }
}
