//! Dense linear algebra: rank and null space, inertia, definite solves, and the orthogonalisation of a design.

mod definite;
mod eigen;
mod kkt;
mod null_space;
mod orthogonal;

pub use definite::{positive_definite_inverse, quadratic_form_inverse};
pub use eigen::symmetric_eigen;
pub use kkt::{Inertia, Kkt};
pub use null_space::{dependent_rows, null_space};
pub use orthogonal::{Orthogonal, centred_condition, orthogonalise, scaled_condition};

use super::{Error, Matrix};

/// Refuses a matrix that holds NaN or an infinite value: the iterations below would never settle on it.
fn finite(m: &Matrix, what: &'static str) -> Result<(), Error> {
    if m.iter().all(|v| v.is_finite()) { Ok(()) } else { Err(Error::NotFinite { what }) }
}

/// Refuses a matrix that is not square.
fn square(m: &Matrix, what: &'static str) -> Result<(), Error> {
    if m.nrows() == m.ncols() { Ok(()) } else { Err(Error::Shape { what, found: m.ncols(), wanted: m.nrows() }) }
}
