//! What can be wrong with a study.

use super::source::{At, Shown, Sources};

/// A fault at a place, before it is shown.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// Where.
    pub at: Option<At>,
    /// What is wrong.
    pub message: String,
    /// What to do.
    pub advice: Option<String>,
}

impl Fault {
    /// A fault at a place.
    pub fn at(at: At, message: impl Into<String>) -> Fault {
        Fault { at: Some(at), message: message.into(), advice: None }
    }

    /// A fault of the study as a whole.
    pub fn of_all(message: impl Into<String>) -> Fault {
        Fault { at: None, message: message.into(), advice: None }
    }

    /// With advice.
    pub fn advise(self, advice: impl Into<String>) -> Fault {
        Fault { advice: Some(advice.into()), ..self }
    }

    /// As a reader sees it.
    pub fn show(&self, sources: &Sources) -> Shown {
        sources.show(self.at, &self.message, self.advice.as_deref())
    }
}

/// Why there is no study.
#[derive(Debug, thiserror::Error)]
pub enum StudyError {
    /// The file cannot be read.
    #[error("{path} could not be read: {why}")]
    File {
        /// The file as the user wrote it.
        path: String,
        /// The system's reason.
        why: std::io::Error,
    },
    /// The study or the command line is wrong.
    #[error("{0}")]
    Wrong(Shown),
}
