//! One result, rendered as text, JSON and CSV.
//!
//! [`Document`] holds every fact of one fit; each rendering is a function from it to a `String`.

pub mod csv;
pub mod document;
mod estimates;
mod failure;
pub mod json;
pub mod listing;
pub mod number;
mod object;
#[cfg(test)]
mod sample;
#[cfg(test)]
mod schema;
pub mod text;
pub mod words;

pub use document::{DataFacts, Document, ModelFacts, Named};

/// The JSON Schema (draft 2020-12) of what [`json::render`] writes.
pub const FIT_SCHEMA: &str = include_str!("fit.schema.json");

/// The one line of caution on every result.
pub const CAUTION: &str = "These probabilities are approximations and no release or safety decision by themselves; \
                           your own standards and licensed practice decide.";
