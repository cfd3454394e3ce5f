//! Dense linear algebra: rank and null space, definite solves, and the orthogonalisation of a design.

mod condition;
mod definite;
mod dot;
mod eigen;
mod householder;
mod null_space;
mod orthogonal;
mod svd;

pub use condition::scaled_condition;
pub use definite::positive_definite_inverse;
pub use eigen::symmetric_eigen;
pub use null_space::{dependent_rows, null_space};
pub use orthogonal::{Orthogonal, orthogonalise};
pub use svd::{least_squares, singular_values, svd};

use super::{Error, Matrix};

/// Refuses a matrix that holds NaN or an infinite value: the iterations below would never settle on it.
fn finite(m: &Matrix, what: &'static str) -> Result<(), Error> {
    if m.iter().all(|v| v.is_finite()) { Ok(()) } else { Err(Error::NotFinite { what }) }
}

/// Refuses a matrix that is not square.
fn square(m: &Matrix, what: &'static str) -> Result<(), Error> {
    if m.nrows() == m.ncols() { Ok(()) } else { Err(Error::Shape { what, found: m.ncols(), wanted: m.nrows() }) }
}

/// Numbers in (-1, 1) for tests, by a linear congruence (Knuth's MMIX constants).
#[cfg(test)]
fn pseudo_random(seed: u64) -> impl FnMut() -> f64 {
    let mut state = seed;
    move || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 11) as f64 / 2f64.powi(52) - 1.0
    }
}
