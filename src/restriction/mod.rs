//! Equations to c(theta), Jacobian and curvature; roles; names; quantities.
//!
//! A restriction `left = right` stands for c = left - right = 0. One text may stand for several: a chain `a = b = c` pairs
//! neighbours (`NAME.1`, `NAME.2`), `equal(*.shape)` sets each equal to the first, and a `*` in the names of an equation
//! writes it once a level (`NAME.acme`), the same level in every name.

mod body;
mod compile;
pub mod draft;
pub mod error;
mod expand;
pub mod quantities;
pub mod system;
mod vocabulary;

pub use draft::Draft;
pub use error::RestrictionError;
pub use quantities::Quantities;
pub use system::System;

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
    /// The equation as shown: `left = right`, patterns expanded (but for those of sums).
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
