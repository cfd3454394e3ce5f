//! What the lexer hands to the parser.

use super::{Name, Span};

/// A token and where it stands.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Token {
    pub kind: Lexeme,
    pub span: Span,
}

/// What a token is.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Lexeme {
    Number(f64),
    /// One plain piece standing alone: a name, a function, or one of `and or not pi if sum`.
    Word(String),
    /// Any other name or pattern.
    Name(Name),
    /// A text in single quotes standing alone.
    Text(String),
    Mark(Mark),
    End,
}

/// Operators and punctuation.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    Plus,
    Minus,
    Star,
    Slash,
    Caret,
    Open,
    Close,
    Comma,
    Less,
    AtMost,
    More,
    AtLeast,
    Equal,
    Unequal,
}
