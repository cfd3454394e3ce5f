//! One language for all mathematics: grammar, parser, expression graph, exact derivatives, block kernel.

pub mod ast;
pub mod error;
pub mod function;
pub mod name;

pub use ast::{Ast, Kind, Operator, Relation, Span};
pub use error::{ExprError, Fault};
pub use function::Function;
pub use name::{Joiner, Name, Piece};
