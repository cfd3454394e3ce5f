//! A chi-square test.

use crate::math::tail::{chi_square_log10_upper, chi_square_upper};

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
        let df_as_float = df as f64;
        Test {
            chi_square,
            df,
            p: chi_square_upper(chi_square, df_as_float),
            log10_p: chi_square_log10_upper(chi_square, df_as_float),
        }
    }
}
