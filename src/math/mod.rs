//! Dense linear algebra helpers and special functions that no crate gives accurately. Imports no other floor.

/// A dense matrix of doubles.
pub type Matrix = nalgebra::DMatrix<f64>;
/// A dense column vector of doubles.
pub type Vector = nalgebra::DVector<f64>;

pub mod range;

pub use range::Range;
