//! What can be wrong with an expression, with the place and the advice.

use super::{Name, Span, nearest};

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
    /// A pattern that no name fits; the first field is what the names are (`parameter`, `column`).
    #[error("no {0} matches {1}")]
    Unmatched(&'static str, String),
    /// A function with a wrong number of arguments.
    #[error("{0} takes {1}, not {2}")]
    Arguments(&'static str, String, usize),
    /// Something of the wrong sort: a category in arithmetic, a comparison where a number belongs.
    #[error("{0}")]
    Sort(String),
}

impl ExprError {
    /// A text that breaks the grammar.
    pub fn syntax(span: Span, message: impl Into<String>) -> Self {
        ExprError { span, fault: Fault::Syntax(message.into()), advice: None }
    }

    /// Something of the wrong sort.
    pub fn sort(span: Span, message: impl Into<String>) -> Self {
        ExprError { span, fault: Fault::Sort(message.into()), advice: None }
    }

    /// A name or pattern that fits nothing among `candidates`, with the nearest of them as advice.
    pub fn unknown<'a>(
        span: Span,
        what: &'static str,
        name: &Name,
        candidates: impl IntoIterator<Item = &'a str>,
    ) -> Self {
        let text = name.to_string();
        if !name.is_pattern() {
            let advice = nearest(&text, candidates).map(|n| format!("nearest name: {n}"));
            return ExprError { span, fault: Fault::Unknown(what, text), advice };
        }
        // A pattern is near to a name with the same pieces starred.
        let patterns: Vec<String> =
            candidates.into_iter().filter_map(|c| Some(Name::parse(c).ok()?.starred_as(name)?.to_string())).collect();
        let near = nearest(&text, patterns.iter().map(String::as_str));
        let advice = near.map(|n| format!("nearest that fits something: {n}"));
        ExprError { span, fault: Fault::Unmatched(what, text), advice }
    }

    /// The same fault with this advice.
    pub fn advise(mut self, advice: impl Into<String>) -> Self {
        self.advice = Some(advice.into());
        self
    }
}
