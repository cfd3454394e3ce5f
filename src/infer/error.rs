//! What can be wrong with a request for inference.

/// A request that cannot be met. A fit that finds no maximum is no error: its certificate says so.
#[derive(Debug, thiserror::Error)]
pub enum InferError {
    /// The confidence is not a probability.
    #[error("confidence must lie between 0 and 1, not {0}; 0.95 is usual")]
    Confidence(f64),
    /// Expected or outer-product information was asked for and the likelihood has none.
    #[error("this likelihood has no {0} information; ask for {1} instead")]
    NoInformation(&'static str, &'static str),
    /// The search was given something it cannot work with.
    #[error(transparent)]
    Solve(#[from] crate::solve::SolveError),
}
