//! The restrictions as the solver sees them.

use crate::math::{Matrix, Vector};
use crate::restriction::{Sides, System};

/// m equations in n parameters. A [`System`] is one; the solver's own tests write theirs as functions.
pub(super) trait Equations {
    fn len(&self) -> usize;
    fn name(&self, i: usize) -> &str;
    fn linear(&self) -> bool;
    fn sides(&self, theta: &Vector) -> Vec<Sides>;
    /// m by n.
    fn jacobian(&self, theta: &Vector) -> Matrix;
    /// Sum of multiplier times Hessian, n by n.
    fn curvature(&self, theta: &Vector, multipliers: &Vector) -> Matrix;
}

impl Equations for System {
    fn len(&self) -> usize {
        self.items().len()
    }

    fn name(&self, i: usize) -> &str {
        &self.items()[i].name
    }

    fn linear(&self) -> bool {
        self.items().iter().all(|r| r.linear)
    }

    fn sides(&self, theta: &Vector) -> Vec<Sides> {
        System::sides(self, theta)
    }

    fn jacobian(&self, theta: &Vector) -> Matrix {
        System::jacobian(self, theta)
    }

    fn curvature(&self, theta: &Vector, multipliers: &Vector) -> Matrix {
        System::curvature(self, theta, multipliers)
    }
}
