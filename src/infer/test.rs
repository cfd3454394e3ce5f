//! A chi-square test.

use super::tail;

/// A chi-square test.
#[derive(Debug, Clone, PartialEq)]
pub struct Test {
    /// The statistic.
    pub chi_square: f64,
    /// Degrees of freedom.
    pub df: usize,
    /// Upper-tail probability.
    pub p: f64,
    /// Its decimal logarithm, finite also where p underflows.
    pub log10_p: f64,
}

impl Test {
    /// The test of this statistic.
    pub fn new(chi_square: f64, df: usize) -> Test {
        let (p, log10_p) = tail::chi_square(chi_square, df);
        Test { chi_square, df, p, log10_p }
    }
}
