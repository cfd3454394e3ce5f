//! Family, design and table joined: value, gradient, Hessian, per-row scores and information of the log-likelihood.

mod axes;
#[cfg(test)]
mod checks;
pub mod closure;
mod compose;
#[cfg(test)]
mod computed_checks;
pub mod coordinates;
mod design;
mod designs;
pub mod error;
mod expectation;
mod fold;
mod formula;
mod gram;
pub mod kinks;
mod labels;
pub mod model;
mod numbering;
mod part;
mod part_rows;
mod plan;
pub mod prepare;
mod response;
mod rows;
pub mod sample;
pub mod simulate;
#[cfg(test)]
mod simulated_checks;
mod start;
mod statement;
pub mod wanted;

pub use closure::FromFunctions;
pub use coordinates::Coordinates;
pub use error::LikelihoodError;
pub use kinks::{Kink, Place, Residuals};
pub use model::Model;
pub use prepare::{prepare, prepare_for};
pub use sample::Sample;
pub use simulate::simulate;
pub use wanted::wanted;

use crate::math::{Matrix, Range, Vector};

/// A free parameter.
#[derive(Debug, Clone, PartialEq)]
pub struct Parameter {
    /// Its name as input accepts it, such as `rate.kiln.middle:soak`.
    pub name: String,
    /// Where it may lie.
    pub range: Range,
    /// What it means in words, such as `log of rate(south) / rate(north)`.
    pub meaning: String,
}

/// How much of an evaluation is wanted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Order {
    /// The value only.
    Value,
    /// Value and gradient.
    Gradient,
    /// Value, gradient and Hessian.
    Hessian,
}

/// The log-likelihood at a point, in working coordinates. What was not asked for is empty (length 0).
#[derive(Debug, Clone, PartialEq)]
pub struct Evaluation {
    /// l; NaN or -inf where it is undefined or impossible.
    pub value: f64,
    /// Gradient, length n.
    pub gradient: Vector,
    /// Hessian, n by n.
    pub hessian: Matrix,
}

/// The four matrices of the contract's section on information.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Information {
    /// Sum of E[s s'] given the columns that are not the response.
    Expected,
    /// Minus the Hessian.
    Observed,
    /// Sum of s s' over the rows.
    Outer,
    /// Bread observed, filling outer.
    Robust,
}

/// The Hessian of l with everything that is squared in the log density replaced by its tangent: where l is minus a sum
/// of squares it is never indefinite, and it foretells l further along a curved valley than the Hessian does.
#[derive(Debug, Clone, PartialEq)]
pub struct Tangent {
    /// In working coordinates, n by n.
    pub hessian: Matrix,
    /// For each parameter whether a square contains it.
    pub inside: Vec<bool>,
}

/// A log-likelihood with its parameters. `phi` are working coordinates, `theta = coordinates().theta(phi)` the
/// parameters as named; they are the same unless a design was orthogonalised.
pub trait LogLikelihood: Sync {
    /// The free parameters, in order.
    fn parameters(&self) -> &[Parameter];
    /// The map between working coordinates and parameters.
    fn coordinates(&self) -> &Coordinates;
    /// Value and, as asked, gradient and Hessian by `phi`.
    fn evaluate(&self, phi: &Vector, order: Order) -> Evaluation;
    /// `Expected` or `Outer` information in working coordinates; `None` where the family has none.
    /// Entries may be infinite for a parameter on the edge of its range.
    fn information(&self, kind: Information, phi: &Vector) -> Option<Matrix>;
    /// The model of Gauss and Newton; `None` where no square in the log density bends.
    fn tangent(&self, _phi: &Vector) -> Option<Tangent> {
        None
    }
    /// Sum of the weights of the rows.
    fn weight_total(&self) -> f64;
    /// Starting points (`theta`): the first computed from the data, the rest spread deterministically by `seed`.
    fn starts(&self, count: usize, seed: u64) -> Vec<Vector>;
    /// Whether l is known to be concave in theta, so that one start suffices when the restrictions are linear.
    fn concave(&self) -> bool;
    /// Whether the point is a collapsed one that must not count as an estimate (a mixture component on few rows);
    /// the text says which component.
    fn collapsed(&self, _phi: &Vector) -> Option<String> {
        None
    }
    /// Permutations of the parameters that leave l as it is (relabelled mixture components): each lists, for new
    /// position i, the old index. The identity is left out.
    fn relabellings(&self) -> Vec<Vec<usize>> {
        Vec::new()
    }
    /// How many cells or bins have an expected count under five at this point, and of how many; `None` where the
    /// response is neither labels nor bins.
    fn small_counts(&self, _phi: &Vector) -> Option<(usize, usize)> {
        None
    }
    /// The same likelihood over a part of its rows, on which starts can be tried cheaply; `None` where the rows are few.
    fn thinned(&self) -> Option<Box<dyn LogLikelihood>> {
        None
    }
    /// Whether observed information is what is used unless another is asked for.
    fn observed_by_default(&self) -> bool {
        false
    }
    /// How far the total mass of the density is from one at most, over some of the rows; `None` where that is not in
    /// question, or nothing says which values the response takes.
    fn mass_error(&self, _phi: &Vector) -> Option<f64> {
        None
    }
    /// The sample behind it, if its log-likelihood has kinks (`abs(u)` of something estimated) that a maximum can sit on.
    fn kinked(&self) -> Option<&Sample> {
        None
    }
    /// Whether a kink (a tie of abs, min, max) lies at this point.
    fn kink(&self, _phi: &Vector) -> bool {
        false
    }
}

/// Takes this many threads for all sums over rows from here on; results do not depend on it. Only the first call of a
/// process counts.
pub fn threads(count: usize) {
    // A pool that is there already is no fault: any number of threads gives the same answer.
    let _ = rayon::ThreadPoolBuilder::new().num_threads(count).build_global();
}
