//! One pass over the records: cells in use straight into columns.

use super::category::Interner;
use super::error::DataError;
use super::gap::{CODE_LIMIT, Gap};
use super::header::Header;
use super::number;
use super::request::Request;

/// Where the cells of a column come from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Origin {
    /// One column of the file; each record's cell stands for all rows the record unfolds to.
    Column(usize),
    /// Unfolded: each of these columns gives a row.
    Columns(Vec<usize>),
}

/// What the cells are read as.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Form {
    /// Finite numbers.
    Number,
    /// Numbers, or minus infinity for an open lower end.
    Lower,
    /// Numbers, or infinity for an open upper end.
    Upper,
    /// Labels.
    Label,
}

/// A column to be read.
#[derive(Debug, Clone)]
pub(super) struct Demand {
    pub origin: Origin,
    pub form: Form,
    /// Levels listed beforehand.
    pub levels: Vec<String>,
}

/// The cells of a column, gaps included.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Cells {
    Number(Vec<f64>),
    Label { codes: Vec<u32>, labels: Vec<String> },
}

impl Cells {
    /// Why a row has no value here.
    pub fn gap(&self, row: usize) -> Option<Gap> {
        match self {
            Cells::Number(values) => values.get(row).and_then(|x| Gap::of_number(*x)),
            Cells::Label { codes, .. } => codes.get(row).and_then(|c| Gap::of_code(*c)),
        }
    }

    /// Whether any row has no value.
    pub fn has_gaps(&self) -> bool {
        match self {
            Cells::Number(values) => values.iter().any(|x| x.is_nan()),
            Cells::Label { codes, .. } => codes.iter().any(|c| *c >= CODE_LIMIT),
        }
    }
}

/// The bytes of a table and how they are written.
pub(super) struct Sheet<'a> {
    pub file: &'a str,
    bytes: &'a [u8],
    /// Where the records after the header begin.
    body: usize,
    delimiter: u8,
    pub decimal: u8,
    /// Missing marks, trimmed.
    pub marks: Vec<Vec<u8>>,
    pub header: Header,
}

/// What a pass found.
pub(super) struct Scanned {
    /// Where each record begins; records with a wrong number of cells are not among them.
    pub starts: Vec<usize>,
    /// One a demand.
    pub cells: Vec<Cells>,
    /// Records with a wrong number of cells: where, and how many. The first ten.
    pub ragged: Vec<(usize, usize)>,
    /// How many of those there are.
    pub ragged_count: usize,
}

impl<'a> Sheet<'a> {
    /// Reads the header. The request's delimiter and decimal sign must be ASCII.
    pub fn open(file: &'a str, bytes: &'a [u8], request: &Request) -> Result<Sheet<'a>, DataError> {
        let mut sheet = Sheet {
            file,
            bytes,
            body: 0,
            delimiter: request.delimiter as u8,
            decimal: request.decimal as u8,
            marks: request.missing.iter().map(|m| m.trim().as_bytes().to_vec()).collect(),
            header: Header::new(file, request.delimiter, &csv::ByteRecord::new()),
        };
        let mut reader = sheet.reader(0);
        let mut record = csv::ByteRecord::new();
        let names = loop {
            if !sheet.next(&mut reader, &mut record)? {
                return sheet.unusable("the file has no header", "the first line must hold the names of the columns");
            }
            let blank = record.iter().all(|cell| number::trim(cell).is_empty());
            if !blank || record.len() > 1 {
                break Header::new(file, request.delimiter, &record);
            }
        };
        if names.names.iter().all(String::is_empty) {
            return sheet.unusable("the header holds no names", "the first line must hold the names of the columns");
        }
        sheet.header = names;
        sheet.body = usize::try_from(reader.position().byte()).unwrap_or(bytes.len());
        if sheet.body >= bytes.len() {
            sheet.check_quotes(0)?;
        }
        Ok(sheet)
    }

    fn unusable<T>(&self, what: impl Into<String>, advice: &str) -> Result<T, DataError> {
        Err(DataError::Unusable { file: self.file.to_owned(), what: what.into(), advice: advice.to_owned() })
    }

    fn reader(&self, from: usize) -> csv::Reader<&'a [u8]> {
        csv::ReaderBuilder::new()
            .delimiter(self.delimiter)
            .has_headers(false)
            .flexible(true)
            .from_reader(&self.bytes[from.min(self.bytes.len())..])
    }

    fn next(&self, reader: &mut csv::Reader<&'a [u8]>, record: &mut csv::ByteRecord) -> Result<bool, DataError> {
        // Reading bytes from memory cannot fail; should the crate think otherwise, its words are passed on.
        reader.read_byte_record(record).or_else(|e| self.unusable(e.to_string(), "give a CSV file"))
    }

    /// Past line ends: where the record that is read from `at` on really begins.
    fn begin(&self, at: usize) -> usize {
        let rest = self.bytes.get(at..).unwrap_or(&[]);
        at + rest.iter().take_while(|b| matches!(b, b'\r' | b'\n')).count()
    }

    /// Reads all records, the demanded columns only. Every record gives `unfold` rows.
    pub fn scan(&self, demands: &[Demand], unfold: usize) -> Result<Scanned, DataError> {
        let width = self.header.names.len();
        let mut columns: Vec<Reading> = demands.iter().map(|d| Reading::new(d, &self.marks)).collect();
        let mut found = Scanned { starts: Vec::new(), cells: Vec::new(), ragged: Vec::new(), ragged_count: 0 };
        let mut reader = self.reader(self.body);
        let mut record = csv::ByteRecord::new();
        let mut last = self.body;
        while self.next(&mut reader, &mut record)? {
            let at = record.position().map_or(0, |p| p.byte());
            let start = self.begin(self.body + usize::try_from(at).unwrap_or(usize::MAX));
            if record.len() != width {
                let blank = record.len() == 1 && number::trim(&record[0]).is_empty();
                if blank && self.bytes.get(start) != Some(&b'"') {
                    continue;
                }
                last = start;
                found.ragged_count += 1;
                if found.ragged.len() < super::error::SHOWN {
                    found.ragged.push((start, record.len()));
                }
                continue;
            }
            if width == 1 && self.bytes.get(start) != Some(&b'"') && number::trim(&record[0]).is_empty() {
                continue;
            }
            last = start;
            found.starts.push(start);
            for (demand, column) in demands.iter().zip(&mut columns) {
                match &demand.origin {
                    Origin::Column(i) => column.push(&record[*i], unfold, self),
                    Origin::Columns(all) => all.iter().for_each(|i| column.push(&record[*i], 1, self)),
                }
            }
        }
        self.check_quotes(last)?;
        if found.starts.len().saturating_mul(unfold) >= u32::MAX as usize {
            return self.unusable("the table has more rows than fit", "read it in parts: rows number up to 4294967294");
        }
        found.cells = columns.into_iter().map(Reading::finish).collect();
        Ok(found)
    }

    /// A quote that is never closed swallows all that follows; it can only be in the last record.
    fn check_quotes(&self, start: usize) -> Result<(), DataError> {
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
            let line = self.line(self.begin(start));
            return self.unusable(
                format!("a cell of the row that starts on line {line} opens a quote that is never closed"),
                "close it; a quote inside a quoted cell is written twice",
            );
        }
        Ok(())
    }

    /// The cells of the record that begins at `start`.
    pub fn record(&self, start: usize) -> csv::ByteRecord {
        let mut record = csv::ByteRecord::new();
        // A record that was read once can be read again.
        let _ = self.reader(start).read_byte_record(&mut record);
        record
    }

    /// The sign that ends lines: a carriage return only where there is no line feed at all.
    fn line_end(&self) -> u8 {
        if self.bytes.contains(&b'\n') { b'\n' } else { b'\r' }
    }

    /// The line on which a byte stands.
    pub fn line(&self, at: usize) -> usize {
        let end = self.line_end();
        1 + self.bytes[..at.min(self.bytes.len())].iter().filter(|b| **b == end).count()
    }

    /// The lines on which records start.
    pub fn lines(&self, starts: &[usize]) -> Vec<u32> {
        let end = self.line_end();
        let (mut at, mut line) = (0, 1u32);
        starts
            .iter()
            .map(|start| {
                line = line.saturating_add(self.bytes[at..*start].iter().map(|b| u32::from(*b == end)).sum());
                at = *start;
                line
            })
            .collect()
    }
}

/// A column while it is read.
enum Reading {
    Number(Vec<f64>),
    End(Vec<f64>, f64),
    Label(Vec<u32>, Interner),
}

impl Reading {
    fn new(demand: &Demand, marks: &[Vec<u8>]) -> Reading {
        match demand.form {
            Form::Number => Reading::Number(Vec::new()),
            Form::Lower => Reading::End(Vec::new(), f64::NEG_INFINITY),
            Form::Upper => Reading::End(Vec::new(), f64::INFINITY),
            Form::Label => Reading::Label(Vec::new(), Interner::new(&demand.levels, marks)),
        }
    }

    fn push(&mut self, cell: &[u8], times: usize, sheet: &Sheet<'_>) {
        match self {
            Reading::Number(values) => {
                let x = number_cell(cell, sheet);
                if times == 1 { values.push(x) } else { values.extend(std::iter::repeat_n(x, times)) }
            }
            Reading::End(values, open) => {
                let mut x = number_cell(cell, sheet);
                if x.is_nan() {
                    let cell = number::trim(cell);
                    let is_open = cell.is_empty() || Gap::of_number(x) == Some(Gap::Missing);
                    if is_open || number::infinite(cell) == Some(*open) {
                        x = *open;
                    }
                }
                values.extend(std::iter::repeat_n(x, times));
            }
            Reading::Label(codes, interner) => {
                let code = interner.code(unquote(cell));
                codes.extend(std::iter::repeat_n(code, times));
            }
        }
    }

    fn finish(self) -> Cells {
        match self {
            Reading::Number(values) | Reading::End(values, _) => Cells::Number(values),
            Reading::Label(codes, interner) => Cells::Label { codes, labels: interner.into_labels() },
        }
    }
}

/// The number in a cell, or a gap.
fn number_cell(raw: &[u8], sheet: &Sheet<'_>) -> f64 {
    let cell = number::trim(raw);
    // Marks come first: some files write 999 for missing. The usual single mark, the empty cell, needs no comparison.
    let usual = matches!(sheet.marks.as_slice(), [mark] if mark.is_empty());
    if (usual && cell.is_empty()) || (!usual && sheet.marks.iter().any(|m| m == cell)) {
        return Gap::Missing.number();
    }
    number::parse(cell, sheet.decimal).unwrap_or_else(|| second_look(raw, sheet))
}

/// Cells in spaces that are not ASCII, or quoted after a space.
#[cold]
fn second_look(raw: &[u8], sheet: &Sheet<'_>) -> f64 {
    let Ok(text) = std::str::from_utf8(raw) else { return Gap::Unreadable.number() };
    let plain = bare(text).as_bytes();
    if sheet.marks.iter().any(|m| m == plain) {
        return Gap::Missing.number();
    }
    number::parse(plain, sheet.decimal).unwrap_or(Gap::Unreadable.number())
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

/// The same for bytes that may not be text.
fn unquote(cell: &[u8]) -> &[u8] {
    match cell {
        [b' ' | b'\t', ..] => std::str::from_utf8(cell).map_or(cell, |text| bare(text).as_bytes()),
        _ => cell,
    }
}

#[cfg(test)]
mod tests {
    use super::{Cells, Demand, Form, Origin, Sheet, bare};
    use crate::data::request::Request;

    fn numbers(text: &str, origin: Origin, unfold: usize) -> (Vec<f64>, Vec<u32>, Vec<(usize, usize)>) {
        let sheet = Sheet::open("f", text.as_bytes(), &Request::default()).unwrap();
        let scanned = sheet.scan(&[Demand { origin, form: Form::Number, levels: Vec::new() }], unfold).unwrap();
        let Cells::Number(values) = &scanned.cells[0] else { panic!("numbers were asked for") };
        (values.clone(), sheet.lines(&scanned.starts), scanned.ragged)
    }

    #[test]
    fn lines_are_those_an_editor_shows() {
        for (text, lines) in [
            ("a,b\n1,2\n3,4\n", vec![2, 3]),
            ("a,b\r\n1,2\r\n3,4\r\n", vec![2, 3]),
            ("a,b\r1,2\r3,4", vec![2, 3]),
            ("\r\n\r\na,b\r\n\r\n1,2\r\n\r\n\r\n3,4", vec![5, 8]),
            ("a,\"b\nc\"\n1,\"2\"\n3,4", vec![3, 4]),
            ("a,b\n1,\"2\r\n\"\n3,4\n", vec![2, 4]),
            ("a,b\n  \n1,2\n\n3,4\n", vec![3, 5]),
        ] {
            let (values, found, ragged) = numbers(text, Origin::Column(0), 1);
            assert_eq!((values, found, ragged), (vec![1.0, 3.0], lines, vec![]), "{text:?}");
        }
    }

    #[test]
    fn ragged_rows_are_set_apart() {
        let (values, _, ragged) = numbers("a,b\n1\n2,3\n4,5,6\n", Origin::Column(0), 1);
        assert_eq!((values, ragged), (vec![2.0], vec![(4, 1), (10, 3)]));
    }

    #[test]
    fn unfolding_interleaves() {
        let (values, _, _) = numbers("a,b\n1,2\n3,4\n", Origin::Columns(vec![1, 0]), 2);
        assert_eq!(values, [2.0, 1.0, 4.0, 3.0]);
        let (values, _, _) = numbers("a,b\n1,2\n3,4\n", Origin::Column(0), 2);
        assert_eq!(values, [1.0, 1.0, 3.0, 3.0]);
    }

    #[test]
    fn an_open_quote_is_found() {
        for text in ["a,b\n1,\"2\n3,4\n", "a,\"b\n1,2", "a,b\n1,\"\"\"", "a\n\""] {
            let open = Sheet::open("f", text.as_bytes(), &Request::default());
            let error = open.and_then(|s| s.scan(&[], 1).map(|_| ())).unwrap_err().to_string();
            assert!(error.contains("never closed"), "{error}");
        }
        assert!(numbers("a,b\n1,\"x\"\"\"\n", Origin::Column(0), 1).2.is_empty());
    }

    #[test]
    fn quotes_after_a_space_are_taken_as_meant() {
        assert_eq!((bare(" \"north\" "), bare("\"north\""), bare("  n  ")), ("north", "\"north\"", "n"));
        assert_eq!(numbers("a,b\n \"1\",2\n", Origin::Column(0), 1).0, [1.0]);
    }
}
