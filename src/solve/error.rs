//! What can be wrong with the question put to the solver. Not converging is a verdict, not an error.

/// Errors of the solve floor.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SolveError {
    /// A starting point of the wrong length.
    #[error("a starting point has {found} values, but there are {expected} parameters: give one value a parameter")]
    StartLength {
        /// Values given.
        found: usize,
        /// Parameters.
        expected: usize,
    },
    /// No starting point at all.
    #[error("there is no starting point: give at least one")]
    NoStart,
    /// The driver of the iterations failed.
    #[error("the search broke off: {0}")]
    Driver(String),
}
