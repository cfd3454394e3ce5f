//! CSV to columns: reading, categories, derived columns, missing values, weights.

pub mod table;

pub use table::{Column, Counts, Table, Values};
