//! The symmetric indefinite system of a Newton step under restrictions.

use super::{finite, square};
use crate::math::{Error, Matrix, Vector};
use nalgebra::{Dyn, linalg::LBLT};

/// Eigenvalue signs (plus, minus, zero).
pub type Inertia = (usize, usize, usize);

/// The factorised matrix [H + shift D, A'; A, -delta I], with H n x n, A m x n, D diagonal n x n.
///
/// Bunch-Kaufman on the matrix equilibrated by powers of two (no rounding), so that the units of parameters and restrictions
/// do not decide the pivots.
#[derive(Debug, Clone)]
pub struct Kkt {
    matrix: Matrix,
    scale: Vector,
    factor: LBLT<f64, Dyn>,
    inertia: Inertia,
    parameters: usize,
}

impl Kkt {
    /// Assembles and factorises. `scale` is the diagonal of D (all ones for the identity).
    ///
    /// # Errors
    /// Sizes that do not fit, or a value that is not finite.
    pub fn new(h: &Matrix, a: &Matrix, shift: f64, scale: &Vector, delta: f64) -> Result<Kkt, Error> {
        square(h, "the Hessian")?;
        finite(h, "the Hessian")?;
        finite(a, "the Jacobian")?;
        let (n, m) = (h.nrows(), a.nrows());
        if m > 0 && a.ncols() != n {
            return Err(Error::Shape { what: "the Jacobian", found: a.ncols(), wanted: n });
        }
        if scale.len() != n {
            return Err(Error::Shape { what: "the scale of the shift", found: scale.len(), wanted: n });
        }
        let mut matrix = Matrix::zeros(n + m, n + m);
        for i in 0..n {
            for k in 0..n {
                matrix[(i, k)] = 0.5 * (h[(i, k)] + h[(k, i)]);
            }
            matrix[(i, i)] += shift * scale[i];
            for r in 0..m {
                matrix[(i, n + r)] = a[(r, i)];
                matrix[(n + r, i)] = a[(r, i)];
            }
        }
        for r in n..n + m {
            matrix[(r, r)] = -delta;
        }
        finite(&matrix, "the shifted Hessian")?;
        let scale = equilibrate(&matrix);
        let scaled = Matrix::from_fn(n + m, n + m, |i, k| matrix[(i, k)] * scale[i] * scale[k]);
        let factor = LBLT::new(scaled);
        let inertia = inertia(&factor.d())?;
        Ok(Kkt { matrix, scale, factor, inertia, parameters: n })
    }

    /// Signs of the eigenvalues (plus, minus, zero), by Sylvester's law from the factor's blocks.
    pub fn inertia(&self) -> Inertia {
        self.inertia
    }

    /// Whether the inertia is (n, m, 0): H + shift D is positive definite on the null space of A, and A has full rank.
    pub fn is_convex_on_tangent_space(&self) -> bool {
        self.inertia == (self.parameters, self.matrix.nrows() - self.parameters, 0)
    }

    /// The solution for a right-hand side of length n + m, with at most two refinements, each kept only if it lowers the
    /// residual; none if the matrix is singular.
    pub fn solve(&self, rhs: &Vector) -> Option<Vector> {
        if self.inertia.2 > 0 || rhs.len() != self.matrix.nrows() {
            return None;
        }
        let apply = |r: &Vector| -> Option<Vector> {
            let x = self.factor.solve(&r.component_mul(&self.scale))?.component_mul(&self.scale);
            x.iter().all(|v| v.is_finite()).then_some(x)
        };
        // Judged in equilibrated units, where rows can be compared.
        let residual = |x: &Vector| {
            let r = rhs - &self.matrix * x;
            let size = r.component_mul(&self.scale).amax();
            (r, size)
        };
        let mut x = apply(rhs)?;
        let (mut r, mut size) = residual(&x);
        for _ in 0..2 {
            if size == 0.0 {
                break;
            }
            let better = &x + apply(&r)?;
            let (next, next_size) = residual(&better);
            // NaN fails the comparison and keeps the earlier solution.
            if next_size < size {
                (x, r, size) = (better, next, next_size);
            } else {
                break;
            }
        }
        Some(x)
    }
}

/// Powers of two which bring every row's largest entry near one, by a few symmetric sweeps (Ruiz 2001).
fn equilibrate(m: &Matrix) -> Vector {
    let n = m.nrows();
    let mut scale = Vector::from_element(n, 1.0);
    for _ in 0..5 {
        let step = Vector::from_fn(n, |i, _| {
            let largest = (0..n).map(|k| (m[(i, k)] * scale[i] * scale[k]).abs()).fold(0.0, f64::max);
            if largest > 0.0 && largest.is_finite() { libm::ldexp(1.0, -(libm::ilogb(largest) / 2)) } else { 1.0 }
        });
        scale.component_mul_assign(&step);
    }
    scale
}

/// Signs of the 1 x 1 and 2 x 2 blocks of a block diagonal matrix. A block that is rounding beside the largest counts as
/// zero.
fn inertia(d: &Matrix) -> Result<Inertia, Error> {
    finite(d, "the factorisation")?;
    let n = d.nrows();
    let least = f64::EPSILON * n as f64 * d.amax();
    let (mut plus, mut minus, mut zero) = (0, 0, 0);
    let mut count = |value: f64| {
        if value.abs() <= least {
            zero += 1;
        } else if value > 0.0 {
            plus += 1;
        } else {
            minus += 1;
        }
    };
    let mut k = 0;
    while k < n {
        if k + 1 < n && d[(k + 1, k)] != 0.0 {
            let (p, q, r) = (d[(k, k)], d[(k + 1, k + 1)], d[(k + 1, k)]);
            let middle = 0.5 * (p + q);
            let radius = libm::hypot(0.5 * (p - q), r);
            count(middle + radius);
            count(middle - radius);
            k += 2;
        } else {
            count(d[(k, k)]);
            k += 1;
        }
    }
    Ok((plus, minus, zero))
}

#[cfg(test)]
mod tests {
    use super::Kkt;
    use crate::math::linear::{pseudo_random, symmetric_eigen};
    use crate::math::{Error, Matrix, Vector};

    #[test]
    fn inertia_agrees_with_the_eigenvalues_and_solves_are_accurate() {
        let mut next = pseudo_random(7);
        for case in 0..500 {
            let (n, m) = (1 + case % 7, (case / 7) % 4);
            let units: Vec<f64> = (0..n).map(|_| 2f64.powf(20.0 * next())).collect();
            let shift = if case % 3 == 0 { 0.5 } else { 0.0 };
            let delta = if case % 2 == 0 { 1e-3 } else { 0.0 };
            if delta == 0.0 && m > n {
                continue;
            }
            let d = Vector::from_fn(n, |i, _| units[i] * units[i]);
            let plain = Matrix::from_fn(n, n, |_, _| next());
            let h = Matrix::from_fn(n, n, |i, k| (plain[(i, k)] + plain[(k, i)]) * units[i] * units[k]);
            let a = Matrix::from_fn(m, n, |_, k| next() * units[k]);
            let Ok(kkt) = Kkt::new(&h, &a, shift, &d, delta) else { panic!("case {case}") };
            // The same matrix with the units taken out has the same inertia (Sylvester).
            let mut whole = Matrix::zeros(n + m, n + m);
            for i in 0..n {
                for k in 0..n {
                    whole[(i, k)] = plain[(i, k)] + plain[(k, i)] + if i == k { shift } else { 0.0 };
                }
                for r in 0..m {
                    whole[(i, n + r)] = a[(r, i)] / units[i];
                    whole[(n + r, i)] = a[(r, i)] / units[i];
                }
            }
            for r in n..n + m {
                whole[(r, r)] = -delta;
            }
            let Ok((values, _)) = symmetric_eigen(&whole) else { panic!("case {case}") };
            if values.iter().any(|v| v.abs() < 1e-10) {
                continue;
            }
            let plus = values.iter().filter(|v| **v > 0.0).count();
            assert_eq!(kkt.inertia(), (plus, n + m - plus, 0), "case {case}");
            let wanted = Vector::from_fn(n + m, |i, _| next() / if i < n { units[i] } else { 1.0 });
            let rhs = &kkt.matrix * &wanted;
            let Some(found) = kkt.solve(&rhs) else { panic!("case {case}") };
            let condition = values.amax() / values.iter().fold(f64::INFINITY, |l, v| l.min(v.abs()));
            for i in 0..n + m {
                let unit = if i < n { units[i] } else { 1.0 };
                // Normwise backward stable: eps times the condition number in the units' own scale, a factor for the size.
                assert!(
                    (found[i] - wanted[i]).abs() * unit < 1e-14 * condition.max(10.0),
                    "case {case}: {found} {wanted}"
                );
            }
        }
    }

    #[test]
    fn a_restricted_least_squares_by_hand() {
        // min (x^2 + y^2) / 2 with x + y = 1: x = y = 1/2, multiplier -1/2 in this sign convention.
        let Ok(kkt) = Kkt::new(
            &Matrix::identity(2, 2),
            &Matrix::from_element(1, 2, 1.0),
            0.0,
            &Vector::from_element(2, 1.0),
            0.0,
        ) else {
            panic!("regular")
        };
        assert_eq!(kkt.inertia(), (2, 1, 0));
        assert!(kkt.is_convex_on_tangent_space());
        let Some(x) = kkt.solve(&Vector::from_vec(vec![0.0, 0.0, 1.0])) else { panic!("regular") };
        for (found, wanted) in x.iter().zip([0.5, 0.5, -0.5]) {
            assert!((found - wanted).abs() < 1e-15);
        }
    }

    #[test]
    fn singular_and_bad_systems() {
        let ones = Vector::from_element(2, 1.0);
        let none = Matrix::zeros(0, 2);
        // A repeated restriction: one zero eigenvalue.
        let twice = Matrix::from_element(2, 2, 1.0);
        let Ok(kkt) = Kkt::new(&Matrix::identity(2, 2), &twice, 0.0, &ones, 0.0) else { panic!("finite") };
        assert_eq!(kkt.inertia(), (2, 1, 1));
        assert!(!kkt.is_convex_on_tangent_space() && kkt.solve(&Vector::zeros(4)).is_none());
        // The regularisation makes it regular.
        let Ok(kkt) = Kkt::new(&Matrix::identity(2, 2), &twice, 0.0, &ones, 1e-8) else { panic!("finite") };
        assert_eq!(kkt.inertia(), (2, 2, 0));
        // A flat direction, then lifted by the shift.
        let Ok(kkt) = Kkt::new(&Matrix::zeros(2, 2), &none, 0.0, &ones, 0.0) else { panic!("finite") };
        assert_eq!(kkt.inertia(), (0, 0, 2));
        let Ok(kkt) = Kkt::new(&Matrix::zeros(2, 2), &none, 1.0, &ones, 0.0) else { panic!("finite") };
        assert_eq!(kkt.inertia(), (2, 0, 0));
        let bad = Matrix::from_element(2, 2, f64::NAN);
        assert!(matches!(Kkt::new(&bad, &none, 0.0, &ones, 0.0), Err(Error::NotFinite { .. })));
        assert!(matches!(Kkt::new(&Matrix::identity(2, 2), &bad, 0.0, &ones, 0.0), Err(Error::NotFinite { .. })));
        assert!(matches!(Kkt::new(&Matrix::identity(2, 2), &none, f64::NAN, &ones, 0.0), Err(Error::NotFinite { .. })));
        assert!(matches!(Kkt::new(&Matrix::zeros(2, 3), &none, 0.0, &ones, 0.0), Err(Error::Shape { .. })));
        assert!(matches!(Kkt::new(&Matrix::identity(3, 3), &twice, 0.0, &ones, 0.0), Err(Error::Shape { .. })));
        assert!(matches!(
            Kkt::new(&Matrix::identity(2, 2), &none, 0.0, &Vector::zeros(1), 0.0),
            Err(Error::Shape { .. })
        ));
    }
}
