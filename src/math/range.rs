//! The natural range of a parameter, open or closed at each end.

/// An interval `[low, high]`, `(low, high]`, ...; infinite ends are open.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Range {
    /// Lower end.
    pub low: f64,
    /// Upper end.
    pub high: f64,
    /// Whether `low` itself belongs.
    pub low_closed: bool,
    /// Whether `high` itself belongs.
    pub high_closed: bool,
}

impl Range {
    /// All real numbers.
    pub const ALL: Range = Range { low: f64::NEG_INFINITY, high: f64::INFINITY, low_closed: false, high_closed: false };
    /// Open at zero: standard deviations and shapes.
    pub const POSITIVE: Range = Range { low: 0.0, high: f64::INFINITY, low_closed: false, high_closed: false };
    /// Closed at zero: rates.
    pub const NONNEGATIVE: Range = Range { low: 0.0, high: f64::INFINITY, low_closed: true, high_closed: false };
    /// Shares and probabilities.
    pub const UNIT: Range = Range { low: 0.0, high: 1.0, low_closed: true, high_closed: true };

    /// Whether the value belongs.
    pub fn contains(&self, x: f64) -> bool {
        (x > self.low || (self.low_closed && x == self.low)) && (x < self.high || (self.high_closed && x == self.high))
    }
}
