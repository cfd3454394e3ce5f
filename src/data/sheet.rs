//! The bytes of a table: its header, where rows stand, and single cells for messages.

use super::error::DataError;
use super::header::Header;
use super::number;
use super::records::Records;
use super::request::Request;

/// The bytes of a table and how they are written.
pub(super) struct Sheet<'a> {
    pub file: &'a str,
    bytes: &'a [u8],
    /// Whether there is any quote: without, cells are read in place.
    quotes: bool,
    /// Where the records after the header begin.
    pub body: usize,
    delimiter: u8,
    pub decimal: u8,
    /// Missing marks, trimmed.
    pub marks: Vec<Vec<u8>>,
    pub header: Header,
}

impl<'a> Sheet<'a> {
    /// Reads the header. The request's delimiter and decimal sign must be ASCII.
    pub fn open(file: &'a str, bytes: &'a [u8], request: &Request) -> Result<Sheet<'a>, DataError> {
        let mut sheet = Sheet {
            file,
            bytes,
            quotes: bytes.contains(&b'"'),
            body: 0,
            delimiter: request.delimiter as u8,
            decimal: request.decimal as u8,
            marks: request.missing.iter().map(|m| m.trim().as_bytes().to_vec()).collect(),
            header: Header::new(file, request.delimiter, std::iter::empty()),
        };
        let mut records = sheet.records(0);
        let names = loop {
            if !records.advance() {
                return sheet.unusable("the file has no header", "the first line must hold the names of the columns");
            }
            if records.len() > 1 || !number::trim(records.cell(0)).is_empty() {
                break Header::new(file, request.delimiter, (0..records.len()).map(|i| records.cell(i)));
            }
        };
        if names.names.iter().all(String::is_empty) {
            return sheet.unusable("the header holds no names", "the first line must hold the names of the columns");
        }
        sheet.header = names;
        sheet.body = records.end();
        if sheet.body >= bytes.len() {
            sheet.check_quotes(0)?;
        }
        Ok(sheet)
    }

    pub fn unusable<T>(&self, what: impl Into<String>, advice: &str) -> Result<T, DataError> {
        Err(DataError::Unusable { file: self.file.to_owned(), what: what.into(), advice: advice.to_owned() })
    }

    /// The records from a place on.
    pub fn records(&self, from: usize) -> Records<'a> {
        Records::new(self.bytes, from, self.delimiter, self.quotes)
    }

    /// Whether the record that begins here is one of spaces only, which is no row. A quoted nothing is a cell.
    pub fn is_blank(&self, records: &Records<'_>) -> bool {
        records.len() == 1 && number::trim(records.cell(0)).is_empty() && self.bytes.get(records.start()) != Some(&b'"')
    }

    /// A quote that is never closed swallows all that follows; it can only be in the last record.
    pub fn check_quotes(&self, start: usize) -> Result<(), DataError> {
        #[derive(PartialEq)]
        enum State {
            Start,
            Bare,
            Quoted,
            Closing,
        }
        let mut state = State::Start;
        for b in &self.bytes[start.min(self.bytes.len())..] {
            state = match (state, b) {
                (State::Start, b'"') => State::Quoted,
                (State::Quoted, b'"') => State::Closing,
                (State::Closing, b'"') => State::Quoted,
                (State::Quoted, _) => State::Quoted,
                (_, b) if *b == self.delimiter => State::Start,
                (_, b'\r' | b'\n') => State::Start,
                _ => State::Bare,
            };
        }
        if state == State::Quoted {
            let line = self.line(super::records::begin(self.bytes, start));
            return self.unusable(
                format!("a cell of the row that starts on line {line} opens a quote that is never closed"),
                "close it; a quote inside a quoted cell is written twice",
            );
        }
        Ok(())
    }

    /// One cell of the record that begins at `start`.
    pub fn cell(&self, start: usize, column: usize) -> Option<Vec<u8>> {
        let mut records = self.records(start);
        (records.advance() && column < records.len()).then(|| records.cell(column).to_vec())
    }

    /// About how many rows there are, from the length of the first ones; never more than could be.
    pub fn rows_guess(&self) -> usize {
        let body = &self.bytes[self.body.min(self.bytes.len())..];
        let sample = &body[..body.len().min(1 << 16)];
        let lines = count(sample, self.line_end()) + 1;
        let guess = body.len() / sample.len().max(1) * lines;
        (guess + guess / 32).min(body.len() / self.header.names.len().max(1) + 1)
    }

    /// The sign that ends lines: a carriage return only where there is no line feed at all.
    fn line_end(&self) -> u8 {
        if self.bytes.contains(&b'\n') { b'\n' } else { b'\r' }
    }

    /// The line on which a byte stands.
    pub fn line(&self, at: usize) -> usize {
        let end = self.line_end();
        1 + count(&self.bytes[..at.min(self.bytes.len())], end)
    }

    /// The lines on which records start.
    pub fn lines(&self, starts: &[usize]) -> Vec<u32> {
        let end = self.line_end();
        let (mut at, mut line) = (0, 1u32);
        starts
            .iter()
            .map(|start| {
                let lines = count(&self.bytes[at..*start], end);
                line = line.saturating_add(u32::try_from(lines).unwrap_or(u32::MAX));
                at = *start;
                line
            })
            .collect()
    }
}

/// How often a byte stands in some.
fn count(bytes: &[u8], byte: u8) -> usize {
    // Short chunks counted in bytes vectorise best.
    bytes.chunks(192).map(|c| usize::from(c.iter().map(|b| u8::from(*b == byte)).sum::<u8>())).sum()
}

/// A text without spaces round it; a quote after a space (which does not quote in CSV) is taken as meant.
pub(super) fn bare(text: &str) -> &str {
    let trimmed = text.trim();
    let spaced = text.starts_with(char::is_whitespace);
    match trimmed.strip_prefix('"').and_then(|t| t.strip_suffix('"')) {
        Some(inner) if spaced && !inner.contains('"') => inner.trim(),
        _ => trimmed,
    }
}

#[cfg(test)]
mod tests {
    use super::{Sheet, bare};
    use crate::data::request::Request;

    #[test]
    fn an_open_quote_is_found() {
        for text in ["a,b\n1,\"2\n3,4\n", "a,\"b\n1,2", "a,b\n1,\"\"\"", "a\n\""] {
            let open = Sheet::open("f", text.as_bytes(), &Request::default());
            let error = open.and_then(|s| s.scan(&[], 1).map(|_| ())).unwrap_err().to_string();
            assert!(error.contains("never closed"), "{error}");
        }
        let sheet = Sheet::open("f", b"a,b\n1,\"x\"\"\"\n", &Request::default()).unwrap();
        assert!(sheet.scan(&[], 1).is_ok());
    }

    #[test]
    fn quotes_after_a_space_are_taken_as_meant() {
        assert_eq!((bare(" \"north\" "), bare("\"north\""), bare("  n  ")), ("north", "\"north\"", "n"));
    }

    #[test]
    fn rows_are_guessed_within_reason() {
        let text = format!("a,b\n{}", "1,2\n".repeat(100_000));
        let guess = Sheet::open("f", text.as_bytes(), &Request::default()).unwrap().rows_guess();
        assert!((90_000..210_000).contains(&guess), "{guess}");
        let blank = format!("a,b\n{}", "\n".repeat(100_000));
        assert!(Sheet::open("f", blank.as_bytes(), &Request::default()).unwrap().rows_guess() < 60_000);
    }
}
