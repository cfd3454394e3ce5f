//! Rank and null space of a Jacobian, and which of its rows depend on others.

use super::{finite, svd};
use crate::math::{Error, Matrix, Vector};

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
    let (_, values, v) = svd(j)?;
    let rank = values.iter().filter(|&&s| s > tol * values[0]).count();
    // With at least as many rows as columns V is square and holds the basis; else its columns span the rows only.
    let basis =
        if m >= n { v.columns(rank, n - rank).into_owned() } else { complement(&v.columns(0, rank).into_owned()) };
    finite(&basis, "the null space")?;
    Ok((rank, basis, values))
}

/// n x (n - r) orthonormal columns that complete the n x r orthonormal ones given: the last columns of a product of r
/// Householder reflections.
fn complement(q: &Matrix) -> Matrix {
    let (n, r) = q.shape();
    let mut work = q.clone();
    let mut result = Matrix::zeros(n, n - r);
    for k in 0..n - r {
        result[(r + k, k)] = 1.0;
    }
    for k in 0..r {
        let mut v = work.view((k, k), (n - k, 1)).into_owned();
        let length = v.norm();
        v[0] += length.copysign(v[0]);
        let size = v.norm_squared();
        for j in k + 1..r {
            reflect(&mut work, k, j, &v, size);
        }
        work.view_mut((k, k), (n - k, 1)).copy_from(&v);
    }
    for k in (0..r).rev() {
        let v = work.view((k, k), (n - k, 1)).into_owned();
        let size = v.norm_squared();
        for j in 0..n - r {
            reflect(&mut result, k, j, &v, size);
        }
    }
    result
}

/// Rows k.. of column j less 2 v v'/size times themselves.
fn reflect(m: &mut Matrix, k: usize, j: usize, v: &Matrix, size: f64) {
    let along = 2.0 * (0..v.nrows()).map(|i| v[i] * m[(k + i, j)]).sum::<f64>() / size;
    for i in 0..v.nrows() {
        m[(k + i, j)] -= along * v[i];
    }
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

#[cfg(test)]
mod tests {
    use super::{dependent_rows, null_space};
    use crate::math::linear::pseudo_random;
    use crate::math::{Error, Matrix};

    #[test]
    fn random_matrices_of_every_shape_and_rank() {
        let mut next = pseudo_random(1);
        for case in 0..600 {
            let (m, n) = (case % 8, 1 + case / 8 % 9);
            let r = (case / 72) % (m.min(n) + 1);
            let units: Vec<f64> = (0..m).map(|_| 10f64.powf(2.0 * next())).collect();
            let left = Matrix::from_fn(m, r, |i, _| next() * units[i]);
            let right = Matrix::from_fn(r, n, |_, _| next());
            let j = left * right;
            let Ok((rank, z, values)) = null_space(&j, 1e-9) else { panic!("case {case}") };
            // A random factor is close to rank-deficient now and then; its own singular values tell.
            if values.iter().any(|s| (1e-13..1e-7).contains(&(s / values[0]))) {
                continue;
            }
            assert_eq!(rank, r, "case {case}, {m} x {n}: {values}");
            assert_eq!(z.shape(), (n, n - r));
            assert_eq!(values.len(), m.min(n));
            // Backward stable: a few eps of the norm.
            assert!((&j * &z).amax() <= 2e-14 * j.norm(), "case {case}: {}", (&j * &z).amax());
            assert!((z.transpose() * &z - Matrix::identity(n - r, n - r)).amax() < 1e-14);
            // The sum of squares of all singular values is that of the entries.
            assert!((values.norm() - j.norm()).abs() <= 1e-13 * j.norm(), "case {case}");
        }
    }

    #[test]
    fn shares_that_sum_to_one() {
        let Ok((rank, z, values)) = null_space(&Matrix::from_element(1, 3, 1.0), 1e-9) else { panic!("converges") };
        assert_eq!((rank, z.shape()), (1, (3, 2)));
        assert!((values[0] - 3f64.sqrt()).abs() < 1e-15);
        for k in 0..2 {
            assert!(z.column(k).sum().abs() < 1e-15);
        }
    }

    #[test]
    fn empty_zero_and_bad_matrices() {
        assert_eq!(null_space(&Matrix::zeros(0, 3), 1e-9).map(|f| (f.0, f.1)), Ok((0, Matrix::identity(3, 3))));
        assert_eq!(null_space(&Matrix::zeros(2, 3), 1e-9).map(|f| (f.0, f.1)), Ok((0, Matrix::identity(3, 3))));
        assert_eq!(null_space(&Matrix::zeros(2, 0), 1e-9).map(|f| f.0), Ok(0));
        for bad in [f64::NAN, f64::INFINITY] {
            let mut j = Matrix::identity(2, 3);
            j[(1, 2)] = bad;
            assert!(matches!(null_space(&j, 1e-9), Err(Error::NotFinite { .. })));
        }
        // Far from one: no overflow on the way.
        for size in [1e-300, 1e300] {
            let Ok((rank, z, values)) =
                null_space(&Matrix::from_row_slice(2, 3, &[size, 0.0, 0.0, 0.0, size, size]), 1e-9)
            else {
                panic!("converges")
            };
            assert_eq!((rank, z.ncols()), (2, 1));
            assert!((values[0] / size - 2f64.sqrt()).abs() < 1e-14);
        }
    }

    #[test]
    fn dependent_rows_are_named_in_order() {
        let j = Matrix::from_row_slice(
            6,
            3,
            &[1.0, -1.0, 0.0, 0.0, 1e8, -1e8, 1e-8, 0.0, -1e-8, 0.0, 0.0, 0.0, 1.0, 1.0, 1.0, 0.0, 2.0, 7.0],
        );
        // a = b, b = c (in other units) give a = c; zero; three rows fill the space.
        assert_eq!(dependent_rows(&j, 1e-9), vec![2, 3, 5]);
        assert_eq!(dependent_rows(&Matrix::zeros(0, 3), 1e-9), Vec::<usize>::new());
        // Nearly parallel, but by more than the tolerance.
        assert_eq!(dependent_rows(&Matrix::from_row_slice(2, 2, &[1.0, 0.0, 1.0, 1e-8]), 1e-9), Vec::<usize>::new());
        assert_eq!(dependent_rows(&Matrix::from_row_slice(2, 2, &[1.0, 0.0, 1.0, 1e-10]), 1e-9), vec![1]);
    }
}
