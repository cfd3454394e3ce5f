//! The Lagrangian, the Newton iteration, globalisation, edges, starts, certificate.

pub mod certificate;
pub mod error;

mod approach;
mod confirm;
mod degenerate;
mod differences;
mod equations;
mod escape;
mod filter;
mod flat;
mod frame;
mod kinks;
mod local;
mod manifold;
mod newton;
mod quadratic;
mod rank;
mod restore;
mod run;
mod second;
mod starts;
mod ties;
mod verdict;

#[cfg(test)]
mod testing;
#[cfg(test)]
mod tests;

pub use certificate::{Certificate, Direction, Verdict};
pub use error::SolveError;

use crate::likelihood::LogLikelihood;
use crate::math::Vector;
use crate::restriction::System;

/// What is to be maximised, and under what.
#[derive(Clone, Copy)]
pub struct Problem<'a> {
    /// The log-likelihood.
    pub likelihood: &'a dyn LogLikelihood,
    /// The restrictions imposed.
    pub restrictions: &'a System,
}

/// Maximises the log-likelihood under the restrictions within the parameters' ranges, from the likelihood's own
/// starts and the `extra` ones (theta; such as the restricted estimate when the unrestricted one is sought).
///
/// Newton's iteration on the Lagrangian with exact second derivatives: sequential quadratic steps in the null space
/// of the restrictions (Nocedal and Wright, *Numerical Optimization*, chapter 18), a filter line search, active edges.
/// A first start far from the answer of a curve goes by the model of Gauss and Newton until Newton's holds.
///
/// # Errors
/// A start of the wrong length, or none. Not converging is a verdict of the certificate, with its reason.
pub fn maximise(problem: Problem, search: &Search, extra: &[Vector]) -> Result<Fit, SolveError> {
    starts::maximise(problem.likelihood, problem.restrictions, search, extra)
}

/// How the search is done.
#[derive(Debug, Clone, PartialEq)]
pub struct Search {
    /// Starting points; `None`: one where l is concave and the restrictions linear, else 20.
    pub starts: Option<usize>,
    /// Seed of the spread starts.
    pub seed: u64,
    /// Most iterations of one start.
    pub iterations: usize,
    /// Whether an independent method must agree.
    pub second_opinion: bool,
}

impl Default for Search {
    fn default() -> Self {
        Search { starts: None, seed: 1, iterations: 200, second_opinion: false }
    }
}

/// Which end of its range a parameter stands on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// The lower end.
    Lower,
    /// The upper end.
    Upper,
}

/// A parameter on a closed end of its range at the answer.
#[derive(Debug, Clone, PartialEq)]
pub struct Edge {
    /// Index of the parameter.
    pub parameter: usize,
    /// Which end.
    pub end: End,
    /// Its multiplier nu: slope of l in the edge's position, in the parameter's unit.
    pub multiplier: f64,
}

/// The best point found and why it may be believed (or not).
#[derive(Debug, Clone, PartialEq)]
pub struct Fit {
    /// Working coordinates.
    pub phi: Vector,
    /// Parameters as named.
    pub theta: Vector,
    /// l there.
    pub log_likelihood: f64,
    /// One multiplier a restriction, in the order of the system; 0 for one dropped as redundant.
    pub multipliers: Vector,
    /// Where the maximum sits at a kink of l: the slope of l by phi, among those between its two sides, with which the
    /// first-order conditions hold.
    pub slope: Option<Vector>,
    /// Active edges.
    pub edges: Vec<Edge>,
    /// Indices of restrictions that depend on the others at the answer (redundant).
    pub redundant: Vec<usize>,
    /// The certificate.
    pub certificate: Certificate,
    /// One line an iteration of the best start.
    pub trace: Vec<Step>,
}

/// One iteration.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Step {
    /// Iteration, from 0.
    pub iteration: usize,
    /// l.
    pub log_likelihood: f64,
    /// Largest scaled residual of a restriction.
    pub feasibility: f64,
    /// Largest scaled component of the Lagrangian's gradient.
    pub stationarity: f64,
    /// Step length taken, 0 to 1.
    pub length: f64,
    /// Multiple of the scaling matrix added to the Hessian to correct its inertia.
    pub shift: f64,
}
