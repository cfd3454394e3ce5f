//! What can be wrong with an expression, with the place and the advice.

use super::Span;

/// A fault in a text, at a place in it.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{fault}")]
pub struct ExprError {
    /// Where in the text.
    pub span: Span,
    /// What is wrong.
    pub fault: Fault,
    /// What to do, or the nearest name; shown under the caret.
    pub advice: Option<String>,
}

/// The kinds of fault.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum Fault {
    /// The text does not follow the grammar.
    #[error("{0}")]
    Syntax(String),
    /// A name that nothing carries; the first field is what it should have been (`parameter`, `column`, `function`).
    #[error("no {0} is called {1}")]
    Unknown(&'static str, String),
    /// A function with a wrong number of arguments.
    #[error("{0} takes {1}, not {2}")]
    Arguments(&'static str, String, usize),
    /// Something of the wrong sort: a category in arithmetic, a comparison where a number belongs.
    #[error("{0}")]
    Sort(String),
}
