//! What can be wrong with restrictions and quantities.

use crate::expr::{ExprError, picture};

/// A fault, with the place in the study (or the option) it came from.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum RestrictionError {
    /// The text is no equation, or names what there is not; `text` is what `error`'s place counts in.
    #[error("{place}: {error}")]
    Expression {
        /// Dotted key of the study, or the option.
        place: String,
        /// The text.
        text: String,
        /// The fault, with its place in the text and advice.
        error: Box<ExprError>,
    },
    /// Two things with one name.
    #[error("two things are called {name}: {first} and {second}; give one of them another name")]
    Twice {
        /// The name.
        name: String,
        /// Where the first stands.
        first: String,
        /// Where the second stands.
        second: String,
    },
    /// An equation that no value of the parameters can make true.
    #[error(
        "{place}: {name} contradicts itself: in {equation} left minus right is {gap} whatever the free parameters are; \
         correct it or leave it out"
    )]
    Contradiction {
        /// Dotted key of the study, or the option.
        place: String,
        /// Name of the restriction.
        name: String,
        /// The equation.
        equation: String,
        /// left - right.
        gap: f64,
    },
    /// An equation whose two sides change in jumps only, so that no slope leads to where it holds.
    #[error(
        "{place}: {name} changes in jumps only ({equation}), and a restriction must change smoothly; write what is \
         compared as an equation"
    )]
    Jumps {
        /// Dotted key of the study, or the option.
        place: String,
        /// Name of the restriction.
        name: String,
        /// The equation.
        equation: String,
    },
    /// No restriction of this name.
    #[error("no restriction is called {name}{}", advice.as_ref().map(|a| format!("; {a}")).unwrap_or_default())]
    Unknown {
        /// The name asked for.
        name: String,
        /// The nearest name, or what there is.
        advice: Option<String>,
    },
    /// A restriction of the family, which cannot be dropped.
    #[error("{name} is brought by the family and always holds; it cannot be dropped")]
    Family {
        /// Its name.
        name: String,
    },
}

impl RestrictionError {
    /// The text with carets under the fault and the advice below, each line indented by four, where there is a text.
    pub fn picture(&self) -> Option<String> {
        match self {
            RestrictionError::Expression { text, error, .. } => Some(picture(text, error)),
            _ => None,
        }
    }
}
