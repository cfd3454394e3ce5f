//! Equations to c(theta), Jacobian and curvature; roles; names.

use crate::math::{Matrix, Vector};

/// What a restriction is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Role {
    /// Brought by the family; always imposed.
    Family,
    /// Always imposed, never tested.
    Maintained,
    /// The hypothesis.
    Tested,
}

/// One scalar equation `left = right`.
#[derive(Debug, Clone, PartialEq)]
pub struct Restriction {
    /// `same_slope`, `same_slope.1` for a link of a chain, `one.acme` for one a level.
    pub name: String,
    /// Its role.
    pub role: Role,
    /// The equation as shown: `left = right`, patterns expanded.
    pub equation: String,
    /// Whether it is linear in the parameters.
    pub linear: bool,
}

/// The two sides of a restriction at a point.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Sides {
    /// Left side.
    pub left: f64,
    /// Right side.
    pub right: f64,
}

/// All restrictions of a problem, in the order family, maintained, tested.
#[derive(Debug, Clone, Default)]
pub struct System {
    items: Vec<Restriction>,
    parameters: usize,
}

impl System {
    /// The restrictions, in order.
    pub fn items(&self) -> &[Restriction] {
        &self.items
    }

    /// Both sides of each at theta.
    pub fn sides(&self, _theta: &Vector) -> Vec<Sides> {
        Vec::new()
    }

    /// Jacobian of left - right by theta, m by n.
    pub fn jacobian(&self, _theta: &Vector) -> Matrix {
        Matrix::zeros(self.items.len(), self.parameters)
    }

    /// Sum of multiplier times Hessian of left - right, n by n.
    pub fn curvature(&self, _theta: &Vector, _multipliers: &Vector) -> Matrix {
        Matrix::zeros(self.parameters, self.parameters)
    }

    /// The system of those restrictions only for which `keep` holds.
    pub fn only(&self, keep: impl Fn(&Restriction) -> bool) -> System {
        System { items: self.items.iter().filter(|r| keep(r)).cloned().collect(), parameters: self.parameters }
    }
}
