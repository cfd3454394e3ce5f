//! What is to be inferred, and how.

use super::Warning;
use crate::likelihood::Information;
use crate::solve::Search;

/// Which tests are wanted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Tests {
    /// Score (Lagrange-multiplier) test; needs the restricted fit only.
    pub score: bool,
    /// Likelihood-ratio test.
    pub lr: bool,
    /// Wald test.
    pub wald: bool,
}

impl Tests {
    /// All three.
    pub const ALL: Tests = Tests { score: true, lr: true, wald: true };

    /// Whether the unrestricted fit has to be made.
    pub fn need_unrestricted(self) -> bool {
        self.lr || self.wald
    }
}

/// What is to be inferred, and how.
#[derive(Debug, Clone, PartialEq)]
pub struct Options {
    /// Which information; `None` takes expected where the likelihood has it and prefers it, else observed.
    pub information: Option<Information>,
    /// Which tests are wanted.
    pub tests: Tests,
    /// Confidence of the intervals, between 0 and 1.
    pub confidence: f64,
    /// How the maxima are searched.
    pub search: Search,
    /// Warnings that only the caller can know (small expected counts, say); they are listed first.
    pub warnings: Vec<Warning>,
}

impl Default for Options {
    fn default() -> Self {
        Options {
            information: None,
            tests: Tests::ALL,
            confidence: 0.95,
            search: Search::default(),
            warnings: Vec::new(),
        }
    }
}
