//! The set of points where given restrictions hold and given edges are kept: small moves on it, without passes.

use super::frame::{Frame, gaps};
use super::local::stack;
use super::rank::Rows;
use crate::math::{Matrix, Vector};
use crate::restriction::Sides;

/// Restrictions kept, with the edges held.
pub(super) struct Manifold<'a> {
    pub frame: &'a Frame<'a>,
    pub d: &'a Vector,
    pub kept: Vec<usize>,
    pub edges: Vec<usize>,
}

impl Manifold<'_> {
    /// Basis of the free directions by u at a point with this Jacobian by phi.
    pub fn free(&self, jacobian: &Matrix) -> Matrix {
        Rows::of(&self.rows(jacobian)).z
    }

    /// The point near phi on the manifold, with the sides of all restrictions there; `None` where undefined.
    pub fn nearby(&self, phi: &Vector) -> Option<(Vec<Sides>, Vector)> {
        let mut phi = phi.clone();
        for _ in 0..8 {
            if self.kept.is_empty() {
                break;
            }
            let (sides, jacobian) = self.frame.restrictions(&phi)?;
            let c = gaps(&sides);
            let mut right = Vector::zeros(self.kept.len() + self.edges.len());
            for (k, &i) in self.kept.iter().enumerate() {
                right[k] = -c[i];
            }
            let u = Rows::of(&self.rows(&jacobian)).solve(&right);
            phi += u.component_mul(self.d);
            if u.amax() < 1e-14 {
                break;
            }
        }
        let sides = self.frame.sides(&self.frame.theta(&phi))?;
        Some((sides, phi))
    }

    fn rows(&self, by_phi: &Matrix) -> Matrix {
        let j = by_u(by_phi, self.d);
        let picked = Matrix::from_fn(self.kept.len(), self.frame.n, |i, k| j[(self.kept[i], k)]);
        stack(self.frame, &picked, self.d, &self.edges)
    }
}

/// A Jacobian by phi turned into one by u.
pub(super) fn by_u(jacobian: &Matrix, d: &Vector) -> Matrix {
    Matrix::from_fn(jacobian.nrows(), jacobian.ncols(), |i, k| jacobian[(i, k)] * d[k])
}
