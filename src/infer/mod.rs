//! Covariances, multipliers, score, likelihood-ratio and Wald tests, warnings.

mod block;
mod covariance;
mod error;
mod information;
mod kind;
mod labelling;
mod likelihood_ratio;
mod multipliers;
mod options;
mod point;
mod release;
mod run;
mod score;
mod test;
#[cfg(test)]
mod tests;
mod wald;
mod warning;

pub use error::InferError;
pub use options::{Options, Tests};
pub use run::run;
pub use test::Test;
pub use warning::Warning;

/// Words of the floors below that a result is told in.
pub use crate::{likelihood::Information, restriction::Role};

use crate::math::Matrix;
use crate::solve::{End, Fit};

/// One estimate.
#[derive(Debug, Clone, PartialEq)]
pub struct Estimate {
    /// Parameter or quantity.
    pub name: String,
    /// Value.
    pub value: f64,
    /// Standard error; `None` with the reason in `Block::reasons`.
    pub se: Option<f64>,
    /// Lower limit, unclipped.
    pub lower: Option<f64>,
    /// Upper limit, unclipped.
    pub upper: Option<f64>,
    /// On which end of its range it stands.
    pub edge: Option<End>,
}

/// One multiplier.
#[derive(Debug, Clone, PartialEq)]
pub struct Multiplier {
    /// Name of the restriction.
    pub name: String,
    /// Its role.
    pub role: Role,
    /// Its equation.
    pub equation: String,
    /// lambda; `None` where it is undetermined.
    pub value: Option<f64>,
    /// Standard error (tested ones).
    pub se: Option<f64>,
    /// lambda / se.
    pub z: Option<f64>,
    /// Two-sided p of z.
    pub p: Option<f64>,
    /// left - right at the unrestricted estimate.
    pub gap: Option<f64>,
    /// Why value, se, z or p are missing.
    pub reason: Option<String>,
    /// Why the gap is missing.
    pub gap_reason: Option<String>,
}

/// One fit with what is inferred from it.
#[derive(Debug, Clone, PartialEq)]
pub struct Block {
    /// The fit.
    pub fit: Fit,
    /// Estimates; empty unless the verdict is a strict maximum.
    pub estimates: Vec<Estimate>,
    /// Covariance of the estimates, n by n; `None` with the reason.
    pub covariance: Option<Matrix>,
    /// Derived quantities.
    pub quantities: Vec<Estimate>,
    /// Multipliers, family then maintained then tested (maintained ones only for the unrestricted fit).
    pub multipliers: Vec<Multiplier>,
    /// Why the covariance is missing.
    pub reason: Option<String>,
}

/// All that is inferred from one problem. A test that cannot be given is an `Err` with the reason.
#[derive(Debug, Clone, PartialEq)]
pub struct Outcome {
    /// Which information the tests and covariances use.
    pub information: Information,
    /// Confidence of the intervals.
    pub confidence: f64,
    /// Restricted fit.
    pub restricted: Block,
    /// Unrestricted fit; `Err` with the reason when it was not made. One that failed is there with its verdict and no
    /// estimates.
    pub unrestricted: Result<Block, String>,
    /// Score test.
    pub score: Result<Test, String>,
    /// Likelihood-ratio test.
    pub lr: Result<Test, String>,
    /// Wald test.
    pub wald: Result<Test, String>,
    /// Warnings.
    pub warnings: Vec<Warning>,
}
