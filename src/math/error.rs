//! What can go wrong on this floor.

/// An error of the math floor.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum Error {
    /// A written range that cannot be read.
    #[error("the range `{text}` cannot be read: {reason}; write for example `(0, inf)`, `[0, 1]` or `[0, inf)`")]
    Range {
        /// What was written.
        text: String,
        /// What is wrong with it.
        reason: String,
    },
    /// A matrix or vector holds NaN or an infinite value.
    #[error("{what} holds a value that is not finite")]
    NotFinite {
        /// Which matrix or vector.
        what: &'static str,
    },
    /// Sizes do not fit together.
    #[error("{what} has the wrong size: {found} where {wanted} is needed")]
    Shape {
        /// Which matrix or vector.
        what: &'static str,
        /// Rows, columns or length found.
        found: usize,
        /// What was needed.
        wanted: usize,
    },
    /// An iterative decomposition did not settle within its limit.
    #[error("the {what} did not converge")]
    NoConvergence {
        /// Which decomposition.
        what: &'static str,
    },
    /// The matrix has no inverse in double precision.
    #[error("{what} is singular")]
    Singular {
        /// Which matrix.
        what: &'static str,
    },
}
