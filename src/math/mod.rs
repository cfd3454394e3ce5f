//! Dense linear algebra helpers and special functions that no crate gives accurately. Imports no other floor.
//!
//! - [`special`]: scalar functions of the expression language, plain `fn(f64) -> f64`, NaN outside their domain.
//! - [`tail`]: upper tail probabilities of test statistics and their logarithms.
//! - [`linear`]: rank and null space, inertia, definite solves, orthogonalisation of a design.
//! - [`quadrature`]: integrals of several functions at once.
//! - [`Random`]: random numbers from a seed.
//! - [`Range`]: the natural range of a parameter and its written form.
//!
//! Transcendental functions come from the `libm` crate, not from the system, so that every machine computes the same bits.

/// A dense matrix of doubles.
pub type Matrix = nalgebra::DMatrix<f64>;
/// A dense column vector of doubles.
pub type Vector = nalgebra::DVector<f64>;
/// The Cholesky factor of a positive definite matrix.
pub type Cholesky = nalgebra::Cholesky<f64, nalgebra::Dyn>;

pub mod error;
pub mod linear;
pub mod quadrature;
pub mod random;
pub mod range;
pub mod special;
pub mod tail;

pub use error::Error;
pub use random::Random;
pub use range::Range;
