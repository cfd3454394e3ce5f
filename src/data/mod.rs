//! CSV to columns: reading, categories, derived columns, missing values, weights.

mod build;
mod category;
mod derived;
mod describe;
mod error;
mod fault;
mod gap;
mod header;
mod keep;
mod number;
mod plan;
mod read;
mod records;
mod request;
mod scan;
mod sheet;
mod source;
pub mod table;
mod work;

pub use error::{Blame, DataError, Fault, Faults};
pub use read::{names, read};
pub use request::{OnMissing, Pair, Request, Sort, Unfold, Wanted};
pub use source::Source;
pub use table::{Column, Counts, Table, Values};
