//! One language for all mathematics: grammar, parser, expression graph, exact derivatives, block kernel.

#[cfg(test)]
mod agreement;
mod allocate;
pub mod ast;
mod blame;
pub mod build;
pub mod caret;
mod climb;
mod derive;
mod derive_tail;
mod emit;
pub mod error;
pub mod function;
pub mod graph;
pub mod kernel;
mod lexer;
pub mod lower;
pub mod name;
pub mod nearest;
mod normal;
pub mod parse;
mod print;
pub mod program;
pub mod rows;
pub mod scalars;
mod sorts;
pub mod squares;
mod token;
mod units;
mod value;
mod vector;

pub use ast::{Ast, Kind, Operator, Relation, Span};
pub use build::{Scope, build};
pub use caret::{caret, picture};
pub use error::{ExprError, Fault};
pub use function::Function;
pub use graph::{Graph, Id, Sign, Variable};
pub use kernel::{Registers, Store, blocks};
pub use lower::{Layout, compile, preparation};
pub use name::{Joiner, Name, Piece};
pub use nearest::nearest;
pub use parse::{Equation, parse_condition, parse_equation, parse_expression};
pub use program::{BLOCK, Block, Output, Program};
pub use rows::{ColumnView, evaluate as evaluate_rows};
pub use scalars::Scalars;
pub use squares::Square;
