//! Solves with a positive definite matrix, scaled by its diagonal so that the units of the parameters do not matter.

use crate::math::{Matrix, Vector};
use nalgebra::{Cholesky, Dyn};

/// A squared pivot of the unit-diagonal matrix below this times its size is rounding, not information.
const PIVOT: f64 = 4.0 * f64::EPSILON;

/// The factor of D M D with D = diag(M)^-1/2, and D; none if M is not positive definite beyond rounding.
fn scaled_factor(m: &Matrix) -> Option<(Cholesky<f64, Dyn>, Vector)> {
    let n = m.nrows();
    if m.ncols() != n {
        return None;
    }
    let mut scale = Vector::zeros(n);
    for i in 0..n {
        let d = m[(i, i)];
        if !(d > 0.0 && d.is_finite()) {
            return None;
        }
        scale[i] = 1.0 / d.sqrt();
    }
    let scaled = Matrix::from_fn(n, n, |i, j| 0.5 * (m[(i, j)] + m[(j, i)]) * scale[i] * scale[j]);
    if scaled.iter().any(|v| !v.is_finite()) {
        return None;
    }
    let factor = Cholesky::new(scaled)?;
    let l = factor.l_dirty();
    let least = (PIVOT * n as f64).sqrt();
    // Written so that NaN fails as well.
    (0..n).all(|i| l[(i, i)] > least).then_some((factor, scale))
}

/// M^-1 of a symmetric positive definite n x n matrix; none if it is not positive definite (or indistinguishable from a
/// singular one). Only the symmetric part counts.
pub fn positive_definite_inverse(m: &Matrix) -> Option<Matrix> {
    let (factor, scale) = scaled_factor(m)?;
    let inverse = factor.inverse();
    let n = m.nrows();
    let result = Matrix::from_fn(n, n, |i, j| 0.5 * (inverse[(i, j)] + inverse[(j, i)]) * scale[i] * scale[j]);
    result.iter().all(|v| v.is_finite()).then_some(result)
}

#[cfg(test)]
mod tests {
    use super::positive_definite_inverse;
    use crate::math::Matrix;

    #[test]
    fn units_do_not_matter() {
        // [[2, 1], [1, 3]] has inverse [[3, -1], [-1, 2]] / 5; the units are powers of two, so the scaling is exact.
        let (s, t) = (2f64.powi(-100), 2f64.powi(80));
        let m = Matrix::from_row_slice(2, 2, &[2.0 * s * s, s * t, s * t, 3.0 * t * t]);
        let Some(inverse) = positive_definite_inverse(&m) else { panic!("definite") };
        for (found, wanted) in
            [(inverse[(0, 0)], 0.6 / s / s), (inverse[(0, 1)], -0.2 / s / t), (inverse[(1, 1)], 0.4 / t / t)]
        {
            // A well-conditioned 2 x 2 inverse: a few roundings.
            assert!((found / wanted - 1.0).abs() < 4e-15, "{found} {wanted}");
        }
    }

    #[test]
    fn indefinite_singular_and_not_a_number_give_none() {
        for bad in [
            vec![1.0, 2.0, 2.0, 1.0],
            vec![1.0, 1.0, 1.0, 1.0],
            vec![0.0, 0.0, 0.0, 1.0],
            vec![-1.0, 0.0, 0.0, 1.0],
            vec![f64::NAN, 0.0, 0.0, 1.0],
            vec![1.0, f64::NAN, 0.0, 1.0],
            vec![1.0, f64::INFINITY, 0.0, 1.0],
        ] {
            let m = Matrix::from_row_slice(2, 2, &bad);
            assert!(positive_definite_inverse(&m).is_none(), "{bad:?}");
        }
    }
}
