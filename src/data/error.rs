//! What can be wrong with data, said with the place and what to do.

use crate::expr::{ExprError, picture};
use std::fmt;

/// Why there is no table.
#[derive(Debug, thiserror::Error)]
pub enum DataError {
    /// The source could not be read: not the data's fault.
    #[error("{file}: {source}\n    the file must exist and be readable; - reads standard input")]
    Io {
        /// Name of the source.
        file: String,
        /// What the system says.
        source: std::io::Error,
    },
    /// What was asked contradicts itself or the columns there are.
    #[error("{0}")]
    Request(String),
    /// An expression over columns is wrong.
    #[error("{place}: {error}\n{}", picture(text, error))]
    Expression {
        /// Where it stands, as a dotted key (`data.only`, `data.derive.log_area`).
        place: String,
        /// The expression as written.
        text: String,
        /// What is wrong with it, and where in it.
        error: Box<ExprError>,
    },
    /// A column in use is not there, or there twice.
    #[error("{file}: {what}{}", under(advice))]
    Header {
        /// Name of the source.
        file: String,
        /// What is wrong.
        what: String,
        /// The nearest name, the names there are, what to do.
        advice: Vec<String>,
    },
    /// The file holds no table, or no row is left of it.
    #[error("{file}: {what}\n    {advice}")]
    Unusable {
        /// Name of the source.
        file: String,
        /// What is wrong.
        what: String,
        /// What to do.
        advice: String,
    },
    /// Cells or rows are wrong.
    #[error("{0}")]
    Faults(Faults),
}

/// Whose fault an error is; the exit status follows from it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Blame {
    /// What was asked is wrong.
    Study,
    /// The data are wrong.
    Data,
    /// The file could not be read.
    File,
}

impl DataError {
    /// Whose fault it is.
    pub fn blame(&self) -> Blame {
        match self {
            DataError::Io { .. } => Blame::File,
            DataError::Request(_) | DataError::Expression { .. } => Blame::Study,
            DataError::Header { .. } | DataError::Unusable { .. } | DataError::Faults(_) => Blame::Data,
        }
    }
}

/// The first faults of a file, in the order of its lines.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Faults {
    /// Name of the source.
    pub file: String,
    /// The first ten.
    pub first: Vec<Fault>,
    /// How many more there are.
    pub more: usize,
    /// What to do, each once.
    pub advice: Vec<String>,
}

/// How many faults are shown.
pub(super) const SHOWN: usize = 10;

/// One fault.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// Line on which the row starts.
    pub line: usize,
    /// The column, unless the whole row is wrong.
    pub column: Option<String>,
    /// What was found and what was expected.
    pub what: String,
}

impl fmt::Display for Faults {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (i, fault) in self.first.iter().enumerate() {
            let end = if i == 0 { "" } else { "\n" };
            write!(f, "{end}{}, line {}", self.file, fault.line)?;
            if let Some(column) = &fault.column {
                write!(f, ", column {}", clip(column))?;
            }
            write!(f, ": {}", fault.what)?;
        }
        match self.more {
            0 => {}
            1 => write!(f, "\nand 1 more fault")?,
            n => write!(f, "\nand {n} more faults")?,
        }
        f.write_str(&under(&self.advice))
    }
}

/// What to do about a fault.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Advice {
    Ragged,
    Encoding,
    Mark,
    Drop,
    Finite,
    TooLarge,
    Thousands,
    Decimal(char),
    Labels(String),
    Number,
    Levels,
    Undefined,
    Ends,
}

impl fmt::Display for Advice {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Advice::Ragged => {
                f.write_str("every row needs as many cells as the header; quote cells that hold the delimiter")
            }
            Advice::Encoding => f.write_str("save the file in UTF-8"),
            Advice::Mark => {
                f.write_str("if such a cell means missing, list its text among the missing marks (data.missing)")
            }
            Advice::Drop => {
                f.write_str("fill the cells in, or leave such rows out and have them counted: on_missing = \"drop\"")
            }
            Advice::Finite => f.write_str("infinity stands for an open end in response_lower and response_upper only"),
            Advice::TooLarge => f.write_str("choose a larger unit: doubles end near 1.8e308"),
            Advice::Thousands => f.write_str("write numbers without thousands separators"),
            Advice::Decimal(sign) => write!(f, "if the file writes decimals with {sign}, say so: decimal = \"{sign}\""),
            Advice::Labels(column) => write!(
                f,
                "if the cells of {0} are labels, say so under [data.category]: {1} = []",
                clip(column),
                key(column)
            ),
            Advice::Number => f.write_str(
                "correct the cell, or list its text among the missing marks (data.missing) if it means missing",
            ),
            Advice::Levels => f.write_str("correct the label, or add it to the levels under [data.category]"),
            Advice::Undefined => f.write_str("correct the cells, or leave such rows out: only = \"...\""),
            Advice::Ends => f.write_str("a row seen exactly has two equal ends; an open end is an empty cell"),
        }
    }
}

/// A name as a TOML key.
pub(super) fn key(name: &str) -> String {
    let plain = !name.is_empty() && name.bytes().all(|b| b.is_ascii_alphanumeric() || b == b'_' || b == b'-');
    if plain { name.to_owned() } else { format!("\"{}\"", name.escape_debug()) }
}

/// A text for a message: one line, no control characters, not too long.
pub(super) fn clip(text: &str) -> String {
    const LONGEST: usize = 60;
    let mut shown: String = text.chars().take(LONGEST).flat_map(char::escape_debug).collect();
    // Quotes need no escape here.
    shown = shown.replace("\\'", "'").replace("\\\"", "\"");
    if text.chars().nth(LONGEST).is_some() {
        shown.push_str("...");
    }
    shown
}

/// The bytes of a cell for a message, in double quotes.
pub(super) fn quote(cell: &[u8]) -> String {
    match std::str::from_utf8(cell) {
        Ok(text) => format!("\"{}\"", clip(text)),
        Err(_) => format!("\"{}\"", clip(&String::from_utf8_lossy(cell))),
    }
}

/// Lines of advice below a message.
fn under(advice: &[String]) -> String {
    advice.iter().map(|line| format!("\n    {line}")).collect()
}

#[cfg(test)]
mod tests {
    use super::{DataError, Fault, Faults, clip, key, quote};
    use crate::expr::{ExprError, Fault as ExprFault, Span};

    #[test]
    fn faults_read_line_by_line_with_the_advice_once() {
        let fault = |line, column: Option<&str>| Fault {
            line,
            column: column.map(str::to_owned),
            what: "found \"x\", expected a number".into(),
        };
        let faults = Faults {
            file: "tiles.csv".into(),
            first: vec![fault(3, Some("soak")), fault(9, None)],
            more: 2,
            advice: vec!["correct them".into()],
        };
        assert_eq!(
            DataError::Faults(faults).to_string(),
            "tiles.csv, line 3, column soak: found \"x\", expected a number\n\
             tiles.csv, line 9: found \"x\", expected a number\n\
             and 2 more faults\n    correct them"
        );
    }

    #[test]
    fn texts_are_shown_on_one_line_and_not_whole() {
        assert_eq!(quote(b"a\nb\0\"c'"), "\"a\\nb\\0\"c'\"");
        assert_eq!(clip(&"x".repeat(1000)).len(), 63);
        assert!(quote(&[b'a', 0xff]).contains('a'));
        assert_eq!((key("a_1"), key("soak time")), ("a_1".to_owned(), "\"soak time\"".to_owned()));
    }

    #[test]
    fn an_expression_is_pointed_at() {
        let error = ExprError {
            span: Span { start: 7, end: 11 },
            fault: ExprFault::Unknown("column", "aera".into()),
            advice: Some("nearest name: area".into()),
        };
        let error =
            DataError::Expression { place: "data.only".into(), text: "log(x)\naera".into(), error: Box::new(error) };
        assert_eq!(
            error.to_string(),
            "data.only: no column is called aera\n    aera\n    ^^^^\n    nearest name: area"
        );
    }
}
