//! What can be wrong with a model or with data for it.

use crate::expr::ExprError;

/// Why a likelihood could not be prepared.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum LikelihoodError {
    /// The model statement is wrong at this place of the study.
    #[error("{message}")]
    Statement {
        /// Dotted key of the study, such as `model.mean.link`.
        place: String,
        /// What is wrong.
        message: String,
        /// What to do.
        advice: Option<String>,
    },
    /// An expression of the model is wrong.
    #[error("{error}")]
    Expression {
        /// Dotted key of the study.
        place: String,
        /// The fault, with its place in the text.
        error: ExprError,
    },
    /// A value of the data does not fit the model; file, line and column are in the message.
    #[error("{0}")]
    Data(String),
}

impl LikelihoodError {
    pub(super) fn statement(place: impl Into<String>, message: impl Into<String>, advice: impl Into<String>) -> Self {
        let advice: String = advice.into();
        LikelihoodError::Statement {
            place: place.into(),
            message: message.into(),
            advice: (!advice.is_empty()).then_some(advice),
        }
    }

    pub(super) fn expression(place: impl Into<String>) -> impl FnOnce(ExprError) -> Self {
        let place = place.into();
        move |error| LikelihoodError::Expression { place, error }
    }
}
