//! The linear map between the solver's working coordinates and the parameters as named.

use crate::math::{Matrix, Vector};

/// theta = T phi, T the identity but for blocks of coefficients whose design was orthogonalised (there T = R^-1).
#[derive(Debug, Clone, Default)]
pub struct Coordinates {
    blocks: Vec<Block>,
}

#[derive(Debug, Clone)]
struct Block {
    at: usize,
    r: Matrix,
}

impl Coordinates {
    /// The identity.
    pub fn identity() -> Self {
        Self::default()
    }

    /// Adds the block of coefficients `at .. at + r.nrows()` with phi = R theta, `r` square and invertible.
    pub fn push(&mut self, at: usize, r: Matrix) {
        self.blocks.push(Block { at, r });
    }

    /// Whether phi and theta are the same.
    pub fn is_identity(&self) -> bool {
        self.blocks.is_empty()
    }

    /// Parameters from working coordinates, with one refinement a block.
    pub fn theta(&self, phi: &Vector) -> Vector {
        let mut out = phi.clone();
        for b in &self.blocks {
            let n = b.r.nrows();
            let part = phi.rows(b.at, n).into_owned();
            let lu = b.r.clone().lu();
            if let Some(mut x) = lu.solve(&part) {
                let rest = &part - &b.r * &x;
                if let Some(dx) = lu.solve(&rest) {
                    x += dx;
                }
                out.rows_mut(b.at, n).copy_from(&x);
            }
        }
        out
    }

    /// Working coordinates from parameters.
    pub fn phi(&self, theta: &Vector) -> Vector {
        let mut out = theta.clone();
        for b in &self.blocks {
            let n = b.r.nrows();
            let part = &b.r * theta.rows(b.at, n);
            out.rows_mut(b.at, n).copy_from(&part);
        }
        out
    }

    /// T itself, n by n.
    pub fn matrix(&self, n: usize) -> Matrix {
        let mut t = Matrix::identity(n, n);
        for b in &self.blocks {
            let k = b.r.nrows();
            if let Some(inv) = b.r.clone().try_inverse() {
                t.view_mut((b.at, b.at), (k, k)).copy_from(&inv);
            }
        }
        t
    }

    /// A Jacobian by theta (m by n) turned into one by phi: J T.
    pub fn jacobian(&self, by_theta: &Matrix) -> Matrix {
        if self.is_identity() { by_theta.clone() } else { by_theta * self.matrix(by_theta.ncols()) }
    }

    /// A symmetric form by theta turned into one by phi: T' M T.
    pub fn form(&self, by_theta: &Matrix) -> Matrix {
        if self.is_identity() {
            return by_theta.clone();
        }
        let t = self.matrix(by_theta.ncols());
        t.transpose() * by_theta * t
    }

    /// A covariance by phi turned into one by theta: T C T'.
    pub fn covariance(&self, by_phi: &Matrix) -> Matrix {
        if self.is_identity() {
            return by_phi.clone();
        }
        let t = self.matrix(by_phi.ncols());
        &t * by_phi * t.transpose()
    }
}
