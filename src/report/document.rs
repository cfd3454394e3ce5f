//! All that one fit has to tell, whatever the format.

use crate::infer::Outcome;

/// What was read.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct DataFacts {
    /// The file as the user named it, `-` for standard input; `None` without data.
    pub file: Option<String>,
    /// SHA-256 of its bytes; `None` without data.
    pub sha256: Option<String>,
    /// Rows in the file.
    pub rows_read: usize,
    /// Rows kept.
    pub rows_used: usize,
    /// Rows dropped, for whatever reason.
    pub rows_dropped: usize,
    /// Sum of the weights.
    pub weight_total: f64,
}

/// A parameter with what it means.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Named {
    /// Name as input accepts it.
    pub name: String,
    /// In words; may be empty.
    pub meaning: String,
}

/// What was fitted.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ModelFacts {
    /// The study's title; may be empty.
    pub title: String,
    /// Family.
    pub family: String,
    /// Free parameters, in the order of the estimates.
    pub parameters: Vec<Named>,
    /// What was fitted, without a full stop: `flaws: poisson with rate by kiln, exposure area`.
    pub sentence: String,
}

/// All that one fit has to tell.
#[derive(Debug, Clone, PartialEq)]
pub struct Document {
    /// Of many fits by group: the columns and the labels of this one.
    pub group: Option<Vec<(String, String)>>,
    /// What was read.
    pub data: DataFacts,
    /// What was fitted.
    pub model: ModelFacts,
    /// What was inferred.
    pub outcome: Outcome,
}
