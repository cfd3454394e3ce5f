//! The tree a text parses to. Every node keeps the bytes of the text it came from.

use super::{Function, Name};

/// Bytes `start..end` of the text that was parsed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Span {
    /// First byte.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
}

/// An expression or a condition.
#[derive(Debug, Clone, PartialEq)]
pub struct Ast {
    /// What it is.
    pub kind: Kind,
    /// Where it stands.
    pub span: Span,
}

/// The kinds of node.
#[derive(Debug, Clone, PartialEq)]
pub enum Kind {
    /// A number; `pi` is one too.
    Number(f64),
    /// A text in single quotes standing alone: a label in a comparison with a category.
    Text(String),
    /// A parameter, column, let or quantity; may hold `*` where a pattern is allowed (head of a restriction's names).
    Name(Name),
    /// Unary minus.
    Negate(Box<Ast>),
    /// `+ - * / ^`.
    Binary(Operator, Box<Ast>, Box<Ast>),
    /// A function of the table in [`Function`].
    Call(Function, Vec<Ast>),
    /// `sum(pattern)`.
    Sum(Name),
    /// `if(condition, a, b)`.
    If(Box<Ast>, Box<Ast>, Box<Ast>),
    /// A comparison, true or false.
    Compare(Relation, Box<Ast>, Box<Ast>),
    /// `a and b`.
    And(Box<Ast>, Box<Ast>),
    /// `a or b`.
    Or(Box<Ast>, Box<Ast>),
    /// `not a`.
    Not(Box<Ast>),
}

/// Arithmetic operators.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Operator {
    /// `+`
    Add,
    /// `-`
    Subtract,
    /// `*`
    Multiply,
    /// `/`
    Divide,
    /// `^`
    Power,
}

/// Comparison relations.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Relation {
    /// `<`
    Less,
    /// `<=`
    AtMost,
    /// `>`
    More,
    /// `>=`
    AtLeast,
    /// `=`
    Equal,
    /// `!=`
    Unequal,
}
