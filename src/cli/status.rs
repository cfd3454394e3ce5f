//! How the program ends.

use std::process::ExitCode;

/// Exit statuses. Where several apply, the one named first wins.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Status {
    /// The command line or the study is wrong.
    Study = 2,
    /// The data are wrong.
    Data = 3,
    /// A file could not be read or written.
    File = 5,
    /// No trustworthy restricted maximum, or a gate without a p.
    NoMaximum = 4,
    /// The gate closed.
    Closed = 1,
    /// Done.
    Done = 0,
}

impl From<Status> for ExitCode {
    fn from(status: Status) -> ExitCode {
        ExitCode::from(status as u8)
    }
}

/// Why a command ends early: the status and the message for standard error.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Stop {
    /// The status.
    pub status: Status,
    /// What is said.
    pub message: String,
}

impl Stop {
    /// The study or the command line is wrong.
    pub fn study(message: impl std::fmt::Display) -> Stop {
        Stop { status: Status::Study, message: message.to_string() }
    }

    /// The data are wrong.
    pub fn data(message: impl std::fmt::Display) -> Stop {
        Stop { status: Status::Data, message: message.to_string() }
    }

    /// A file could not be read or written.
    pub fn file(message: impl std::fmt::Display) -> Stop {
        Stop { status: Status::File, message: message.to_string() }
    }
}

impl From<crate::study::StudyError> for Stop {
    fn from(error: crate::study::StudyError) -> Stop {
        match error {
            crate::study::StudyError::File { .. } => Stop::file(error),
            crate::study::StudyError::Wrong(_) => Stop::study(error),
        }
    }
}

impl From<crate::data::DataError> for Stop {
    fn from(error: crate::data::DataError) -> Stop {
        use crate::data::Blame;
        match error.blame() {
            Blame::Study => Stop::study(error),
            Blame::Data => Stop::data(error),
            Blame::File => Stop::file(error),
        }
    }
}
