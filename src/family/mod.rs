//! The library of likelihoods: each one room, described as data.

pub mod binomial;
#[cfg(test)]
mod checks;
pub mod exponential;
pub mod link;
pub mod listing;
pub mod normal;
pub mod poisson;

pub use link::Link;
pub use listing::Listing;

use crate::math::Range;

/// What a response of the family looks like; the reader checks the data against it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Support {
    /// Any finite number.
    Real,
    /// Numbers >= 0.
    Nonnegative,
    /// Whole numbers >= 0.
    Count,
    /// Whole numbers from 0 to the number of trials.
    CountOfTrials,
}

/// A row parameter of a family.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RowParameter {
    /// Its name, such as `mean`.
    pub name: &'static str,
    /// Natural range.
    pub range: Range,
    /// Links it may have with terms; the first is the default.
    pub links: &'static [Link],
    /// In words.
    pub meaning: &'static str,
}

/// A univariate family. The formulas are texts of the expression language over `y` (or `lower`, `upper`), the row
/// parameters, and `exposure` or `trials`; they are the very texts that are computed.
#[derive(Debug, Clone, Copy)]
pub struct Family {
    /// Name in a study.
    pub name: &'static str,
    /// The response in words.
    pub response: &'static str,
    /// What the response may be.
    pub support: Support,
    /// Row parameters, in order.
    pub parameters: &'static [RowParameter],
    /// log f(y).
    pub log_density: &'static str,
    /// log P(Y > lower), log P(Y < upper) and log P(lower < Y < upper), where the family has them.
    pub censored: Option<Censored>,
    /// Expected information of one row: (row parameter, row parameter, text), symmetric, zero where not listed.
    pub information: &'static [(&'static str, &'static str, &'static str)],
    /// How the information is got, in words.
    pub information_note: &'static str,
    /// Where the method or the density is published.
    pub source: &'static str,
    /// Moment estimates from values with weights: one number a row parameter.
    pub start: fn(&Moments) -> Vec<f64>,
    /// Whether l is concave in the row parameters or under each default link.
    pub concave: bool,
}

/// The formulas for a response known only to lie in an interval.
#[derive(Debug, Clone, Copy)]
pub struct Censored {
    /// log P(Y > lower)
    pub above: &'static str,
    /// log P(Y < upper)
    pub below: &'static str,
    /// log P(lower < Y < upper)
    pub between: &'static str,
}

/// Weighted moments of a response, from which starting values are computed.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Moments {
    /// Sum of the weights.
    pub weight: f64,
    /// Weighted mean (per unit of exposure, or per trial).
    pub mean: f64,
    /// Weighted variance about it (divisor the weight).
    pub variance: f64,
    /// Smallest value.
    pub min: f64,
    /// Largest value.
    pub max: f64,
}

/// The table: a new family is a room of its own and a row here.
pub const FAMILIES: &[&Family] = &[&binomial::BINOMIAL, &exponential::EXPONENTIAL, &normal::NORMAL, &poisson::POISSON];

impl Family {
    /// The family of this name.
    pub fn named(name: &str) -> Option<&'static Family> {
        FAMILIES.iter().copied().find(|f| f.name == name)
    }
}
