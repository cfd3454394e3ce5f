//! Where the bytes come from.

use super::error::DataError;
use std::borrow::Cow;
use std::io::Read;
use std::path::PathBuf;

/// A source of CSV.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Source {
    /// A file.
    File {
        /// Where it is.
        path: PathBuf,
        /// Its name as the user wrote it, for messages.
        shown: String,
    },
    /// Standard input, read to its end.
    Stdin,
    /// Bytes at hand.
    Text {
        /// A name for messages.
        shown: String,
        /// The bytes.
        bytes: Vec<u8>,
    },
}

impl Source {
    /// A file, shown as its path.
    pub fn file(path: impl Into<PathBuf>) -> Source {
        let path = path.into();
        Source::File { shown: path.display().to_string(), path }
    }

    /// Bytes at hand under a name.
    pub fn text(shown: impl Into<String>, bytes: impl Into<Vec<u8>>) -> Source {
        Source::Text { shown: shown.into(), bytes: bytes.into() }
    }

    /// The name in messages and results (`-` for standard input).
    pub fn shown(&self) -> &str {
        match self {
            Source::File { shown, .. } | Source::Text { shown, .. } => shown,
            Source::Stdin => "-",
        }
    }

    /// The same with its bytes at hand, so that it can be read more than once (standard input cannot).
    ///
    /// # Errors
    /// [`DataError::Io`] if it cannot be read.
    pub fn load(&self) -> Result<Source, DataError> {
        Ok(Source::Text { shown: self.shown().to_owned(), bytes: self.bytes()?.into_owned() })
    }

    pub(super) fn bytes(&self) -> Result<Cow<'_, [u8]>, DataError> {
        let io = |source| DataError::Io { file: self.shown().to_owned(), source };
        match self {
            Source::File { path, .. } => std::fs::read(path).map(Cow::Owned).map_err(io),
            Source::Stdin => {
                let mut bytes = Vec::new();
                std::io::stdin().lock().read_to_end(&mut bytes).map_err(io)?;
                Ok(Cow::Owned(bytes))
            }
            Source::Text { bytes, .. } => Ok(Cow::Borrowed(bytes)),
        }
    }
}

/// The bytes without a byte order mark; refuses what is plainly no CSV in UTF-8.
pub(super) fn sniff<'a>(file: &str, bytes: &'a [u8]) -> Result<&'a [u8], DataError> {
    let unusable = |what: &str, advice: &str| {
        Err(DataError::Unusable { file: file.to_owned(), what: what.to_owned(), advice: advice.to_owned() })
    };
    match bytes {
        [] => unusable("the file is empty", "give a CSV file: a line of column names, then one line a row"),
        [0xef, 0xbb, 0xbf, rest @ ..] if !rest.is_empty() => Ok(rest),
        [0xef, 0xbb, 0xbf] => {
            unusable("the file is empty", "give a CSV file: a line of column names, then one line a row")
        }
        [0xff, 0xfe, ..] | [0xfe, 0xff, ..] => {
            unusable("the file is UTF-16, not UTF-8", "save it as CSV in UTF-8 and read that")
        }
        [0x1f, 0x8b, ..] => unusable("the file is compressed", "unpack it first, or pipe it in and read from -"),
        [b'P', b'K', 3, 4, ..] => unusable("this is a spreadsheet or an archive, not CSV", "export the sheet as CSV"),
        _ => Ok(bytes),
    }
}

#[cfg(test)]
mod tests {
    use super::{Source, sniff};
    use crate::data::DataError;

    #[test]
    fn strips_the_byte_order_mark_and_refuses_other_formats() {
        assert_eq!(sniff("f", b"\xef\xbb\xbfa").unwrap(), b"a");
        for (bytes, part) in [
            (&b""[..], "empty"),
            (b"\xef\xbb\xbf", "empty"),
            (b"\xff\xfea\0", "UTF-16"),
            (b"\x1f\x8b\x08", "compressed"),
            (b"PK\x03\x04", "spreadsheet"),
        ] {
            assert!(sniff("f", bytes).unwrap_err().to_string().contains(part));
        }
    }

    #[test]
    fn a_missing_file_and_a_folder_are_faults_of_input_and_output() {
        for path in ["no/such/file.csv", "."] {
            let source = Source::File { path: path.into(), shown: path.into() };
            assert!(matches!(source.load(), Err(DataError::Io { .. })));
        }
    }
}
