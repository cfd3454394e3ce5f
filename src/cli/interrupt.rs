//! An interruption from the keyboard: nothing half-written stays behind, and the status says what happened.

use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

/// Status of an interrupted run.
const INTERRUPTED: i32 = 130;

/// The file that is being written.
static PART: Mutex<Option<PathBuf>> = Mutex::new(None);

/// Ends the program with its own status when it is interrupted.
pub fn watch() {
    let end = || {
        if let Some(part) = PART.lock().unwrap_or_else(PoisonError::into_inner).take() {
            let _ = std::fs::remove_file(part);
        }
        super::output::say("interrupted");
        std::process::exit(INTERRUPTED);
    };
    // Where no handler can be set the system ends the program its own way.
    let _ = ctrlc::set_handler(end);
}

/// Notes the file that is being written, or that none is.
pub fn writing(part: Option<&Path>) {
    *PART.lock().unwrap_or_else(PoisonError::into_inner) = part.map(Path::to_path_buf);
}
