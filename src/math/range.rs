//! The natural range of a parameter, open or closed at each end.

use super::Error;
use std::fmt;
use std::str::FromStr;

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

    /// Whether the value lies strictly between the ends, where derivatives have both sides.
    pub fn interior(&self, x: f64) -> bool {
        x > self.low && x < self.high
    }

    /// Whether `x` is an end that belongs to the range: an edge on which a maximum can lie.
    pub fn is_closed_end(&self, x: f64) -> bool {
        (self.low_closed && x == self.low) || (self.high_closed && x == self.high)
    }

    /// Whether either end is finite.
    pub fn is_bounded(&self) -> bool {
        self.low > f64::NEG_INFINITY || self.high < f64::INFINITY
    }

    /// The nearest value of the closed range; NaN stays NaN.
    pub fn clamp(&self, x: f64) -> f64 {
        if x < self.low {
            self.low
        } else if x > self.high {
            self.high
        } else {
            x
        }
    }

    /// Reads the written form of mathematics: `(0, inf)`, `[0, 1]`, `(-inf, 2.5]`. An infinite end counts as open
    /// whichever bracket stands there.
    ///
    /// # Errors
    /// [`Error::Range`] says what was found and what to write.
    pub fn parse(text: &str) -> Result<Range, Error> {
        let wrong = |reason: String| Error::Range { text: text.to_string(), reason };
        let trimmed = text.trim();
        let mut inner = trimmed.chars();
        let low_closed = match inner.next() {
            Some('[') => true,
            Some('(') => false,
            Some(c) => return Err(wrong(format!("it begins with `{c}` where `(` or `[` belongs"))),
            None => return Err(wrong("it is empty".to_string())),
        };
        let high_closed = match inner.next_back() {
            Some(']') => true,
            Some(')') => false,
            Some(c) => return Err(wrong(format!("it ends with `{c}` where `)` or `]` belongs"))),
            None => return Err(wrong("the closing `)` or `]` is missing".to_string())),
        };
        let ends: Vec<&str> = inner.as_str().split(',').collect();
        let [low, high] = ends.as_slice() else {
            return Err(wrong(format!(
                "between the brackets stand {} values where two belong, `low, high`",
                ends.len()
            )));
        };
        let low = end(low).map_err(|found| wrong(format!("its lower end {found}")))?;
        let high = end(high).map_err(|found| wrong(format!("its upper end {found}")))?;
        if low >= high {
            return Err(wrong(format!("its lower end {low} is not below its upper end {high}")));
        }
        Ok(Range { low, high, low_closed: low_closed && low.is_finite(), high_closed: high_closed && high.is_finite() })
    }
}

/// One end of a written range.
fn end(text: &str) -> Result<f64, String> {
    let text = text.trim();
    match text {
        "" => return Err("is missing".to_string()),
        "inf" | "+inf" => return Ok(f64::INFINITY),
        "-inf" => return Ok(f64::NEG_INFINITY),
        _ => {}
    }
    // Rust's own reader also takes `nan`, `infinity` and turns `1e999` into infinity: none is meant here.
    match text.parse::<f64>() {
        Ok(x) if x.is_finite() => Ok(x),
        _ => Err(format!("is `{text}` where a number, `inf` or `-inf` belongs")),
    }
}

impl FromStr for Range {
    type Err = Error;

    fn from_str(text: &str) -> Result<Range, Error> {
        Range::parse(text)
    }
}

impl fmt::Display for Range {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let open = if self.low_closed { '[' } else { '(' };
        let close = if self.high_closed { ']' } else { ')' };
        write!(f, "{open}{}, {}{close}", self.low, self.high)
    }
}

#[cfg(test)]
mod tests {
    use super::Range;

    #[test]
    fn written_form_round_trips() {
        for (text, range) in [
            ("(0, inf)", Range::POSITIVE),
            ("[0, inf)", Range::NONNEGATIVE),
            ("[0, 1]", Range::UNIT),
            ("(-inf, inf)", Range::ALL),
            ("(-0.5, 2]", Range { low: -0.5, high: 2.0, low_closed: false, high_closed: true }),
        ] {
            assert_eq!(Range::parse(text), Ok(range));
            assert_eq!(range.to_string(), text);
        }
        assert_eq!(Range::parse(" [ -inf ,+inf ] "), Ok(Range::ALL));
        assert_eq!(
            Range::parse("[-1e3,1e-3)"),
            Ok(Range { low: -1e3, high: 1e-3, low_closed: true, high_closed: false })
        );
    }

    #[test]
    fn faults_are_named() {
        for (text, part) in [
            ("", "it is empty"),
            ("0, 1", "begins with `0`"),
            ("[0, 1", "ends with `1`"),
            ("[", "closing"),
            ("[]", "1 values"),
            ("[0]", "1 values"),
            ("[0, 1, 2]", "3 values"),
            ("[, 1]", "lower end is missing"),
            ("[0, ]", "upper end is missing"),
            ("[zero, 1]", "lower end is `zero`"),
            ("[0, nan]", "upper end is `nan`"),
            ("[0, 1e999]", "upper end is `1e999`"),
            ("[1, 0]", "1 is not below"),
            ("[1, 1]", "1 is not below"),
            ("(inf, inf)", "not below"),
            ("\u{e9}", "begins with"),
        ] {
            match Range::parse(text) {
                Ok(r) => panic!("`{text}` was read as {r}"),
                Err(e) => {
                    assert!(e.to_string().contains(part), "{e}");
                    assert!(e.to_string().contains("(0, inf)"), "{e}");
                }
            }
        }
    }

    #[test]
    fn ends_belong_or_not() {
        let r = Range { low: 0.0, high: 1.0, low_closed: true, high_closed: false };
        assert!(r.contains(0.0) && r.is_closed_end(0.0) && !r.interior(0.0));
        assert!(!r.contains(1.0) && !r.is_closed_end(1.0));
        assert!(!r.contains(f64::NAN) && !r.interior(f64::NAN));
        assert_eq!((r.clamp(-1.0), r.clamp(2.0), r.clamp(0.5)), (0.0, 1.0, 0.5));
        assert!(r.is_bounded() && !Range::ALL.is_bounded());
    }
}
