//! What the data would gain by releasing the tested restrictions: the common ground of score test and multipliers.

use super::point::Point;
use crate::likelihood::Information;
use crate::math::{Cholesky, Matrix};

/// C, V and, for the robust form, M of the contract's section on information, over an independent set of tested rows.
pub(super) struct Release {
    /// Positions, among the tested, of the rows kept; their number is the degrees of freedom.
    pub kept: Vec<usize>,
    /// Jacobian of the rows kept.
    pub h: Matrix,
    /// C = Z_A (Z_A' I Z_A)^-1 Z_A'.
    pub c: Matrix,
    /// V = H C H'.
    pub v: Matrix,
    /// M = H C J C H' (robust form), else V itself.
    pub m: Matrix,
    /// Cholesky factor of V.
    pub v_factor: Cholesky,
    /// Cholesky factor of M.
    pub m_factor: Cholesky,
}

impl Release {
    /// At a restricted or an unrestricted fit; `kept` from [`Point::independent`].
    pub fn new(point: &Point, kind: Information, kept: Vec<usize>) -> Result<Release, String> {
        let (root, parts) = point.inverse(&point.held, kind, &point.held_multipliers)?;
        let c = &root * root.transpose();
        let h = point.tested.select_rows(&kept);
        let v = &h * &c * h.transpose();
        let m = match parts.filling {
            Some(j) => &h * &c * j * &c * h.transpose(),
            None => v.clone(),
        };
        let factor = |x: &Matrix, what: &str| {
            let cholesky = super::point::symmetric(x).cholesky();
            cholesky.ok_or_else(|| {
                format!(
                    "{what} of the tested restrictions is singular with {} information; another kind may serve",
                    kind.text()
                )
            })
        };
        let v_factor = factor(&v, "the covariance")?;
        let m_factor = factor(&m, "the robust covariance")?;
        Ok(Release { kept, h, c, v, m, v_factor, m_factor })
    }
}
