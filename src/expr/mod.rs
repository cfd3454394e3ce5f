//! One language for all mathematics: grammar, parser, expression graph, exact derivatives, block kernel.

pub mod ast;
mod blame;
pub mod caret;
mod climb;
pub mod error;
pub mod function;
mod lexer;
pub mod name;
pub mod nearest;
pub mod parse;
mod print;
mod sorts;
mod token;

pub use ast::{Ast, Kind, Operator, Relation, Span};
pub use caret::{caret, picture};
pub use error::{ExprError, Fault};
pub use function::Function;
pub use name::{Joiner, Name, Piece};
pub use nearest::nearest;
pub use parse::{Equation, parse_condition, parse_equation, parse_expression};
