//! Where results and messages go. A closed pipe is no fault; files appear whole or not at all.

use std::fs;
use std::io::{self, ErrorKind, Write};
use std::path::{Path, PathBuf};

use super::interrupt::writing;
use super::status::Stop;

/// Says something on standard error; nobody listening is no fault.
pub fn say(message: &str) {
    let mut err = io::stderr().lock();
    let _ = writeln!(err, "{message}");
}

/// Writes a result to the file, or to standard output.
///
/// # Errors
/// When it cannot be written; a reader that left early is no error.
pub fn deliver(result: &str, file: Option<&Path>) -> Result<(), Stop> {
    match file {
        Some(path) => whole(path, result),
        None => {
            let mut out = io::stdout().lock();
            match out.write_all(result.as_bytes()).and_then(|()| out.flush()) {
                Err(e) if e.kind() != ErrorKind::BrokenPipe => {
                    Err(Stop::file(format!("standard output could not be written: {e}")))
                }
                _ => Ok(()),
            }
        }
    }
}

/// Writes a file whole or not at all: to a temporary one beside it that then takes its name.
pub fn whole(path: &Path, text: &str) -> Result<(), Stop> {
    let fail = |e: io::Error| Stop::file(format!("{} could not be written: {e}", path.display()));
    if special(path) {
        return fs::write(path, text).map_err(fail);
    }
    let beside = beside(path);
    writing(Some(&beside));
    let done = fs::File::create(&beside)
        .and_then(|mut f| f.write_all(text.as_bytes()).and_then(|()| f.sync_all()))
        .and_then(|()| fs::rename(&beside, path));
    if done.is_err() {
        let _ = fs::remove_file(&beside);
    }
    writing(None);
    done.map_err(fail)
}

/// Tries whether a file could be written, so that a long fit does not end in a full stop.
pub fn writable(path: &Path) -> Result<(), Stop> {
    if special(path) {
        return Ok(());
    }
    let fail = |e: io::Error| {
        Stop::file(format!(
            "{} could not be written: {e}\n    the folder must exist and take new files",
            path.display()
        ))
    };
    if path.is_dir() {
        return Err(fail(io::Error::new(ErrorKind::IsADirectory, "it is a folder")));
    }
    let beside = beside(path);
    fs::File::create(&beside).and_then(|_| fs::remove_file(&beside)).map_err(fail)
}

/// A device or a pipe: nothing to rename.
fn special(path: &Path) -> bool {
    fs::metadata(path).is_ok_and(|m| !m.is_file() && !m.is_dir())
}

fn beside(path: &Path) -> PathBuf {
    let name = path.file_name().map(|n| n.to_string_lossy().into_owned()).unwrap_or_default();
    path.with_file_name(format!(".{name}.{}.part", std::process::id()))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn files_appear_whole_and_leave_nothing_beside_them() {
        let folder = std::env::temp_dir().join(format!("guyline-output-{}", std::process::id()));
        fs::create_dir_all(&folder).unwrap();
        let path = folder.join("a.json");
        writable(&path).unwrap();
        assert!(!path.exists());
        whole(&path, "one").unwrap();
        whole(&path, "two").unwrap();
        assert_eq!(fs::read_to_string(&path).unwrap(), "two");
        assert_eq!(fs::read_dir(&folder).unwrap().count(), 1);
        assert!(whole(&folder.join("no/b"), "x").is_err());
        assert!(writable(&folder.join("no/b")).is_err());
        assert!(writable(&folder).is_err());
        fs::remove_dir_all(&folder).unwrap();
    }
}
