//! One pass over the records: cells in use straight into columns.

use super::category::Interner;
use super::error::DataError;
use super::gap::{CODE_LIMIT, Gap};
use super::number;
use super::sheet::{Sheet, bare};

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
            Cells::Number(values) => values.chunks(1024).any(|c| c.iter().fold(false, |found, x| found | x.is_nan())),
            Cells::Label { codes, .. } => {
                codes.chunks(1024).any(|c| c.iter().fold(false, |found, x| found | (*x >= CODE_LIMIT)))
            }
        }
    }
}

/// What a pass found.
#[derive(Default)]
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

impl Sheet<'_> {
    /// Reads all records, the demanded columns only. Every record gives `unfold` rows.
    pub fn scan(&self, demands: &[Demand], unfold: usize) -> Result<Scanned, DataError> {
        let width = self.header.names.len();
        let rows = self.rows_guess();
        let mut columns: Vec<Reading> =
            demands.iter().map(|d| Reading::new(d, &self.marks, rows.saturating_mul(unfold))).collect();
        let mut found = Scanned { starts: Vec::with_capacity(rows), ..Scanned::default() };
        let mut records = self.records(self.body);
        let mut last = self.body;
        while records.advance() {
            if (records.len() != width || width == 1) && self.is_blank(&records) {
                continue;
            }
            last = records.start();
            if records.len() != width {
                found.ragged_count += 1;
                if found.ragged.len() < super::error::SHOWN {
                    found.ragged.push((last, records.len()));
                }
                continue;
            }
            found.starts.push(last);
            for (demand, column) in demands.iter().zip(&mut columns) {
                match &demand.origin {
                    Origin::Column(i) => column.push(records.cell(*i), unfold, self),
                    Origin::Columns(all) => all.iter().for_each(|i| column.push(records.cell(*i), 1, self)),
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
}

/// A column while it is read.
enum Reading {
    Number(Vec<f64>),
    End(Vec<f64>, f64),
    Label(Vec<u32>, Interner),
}

impl Reading {
    fn new(demand: &Demand, marks: &[Vec<u8>], rows: usize) -> Reading {
        match demand.form {
            Form::Number => Reading::Number(Vec::with_capacity(rows)),
            Form::Lower => Reading::End(Vec::with_capacity(rows), f64::NEG_INFINITY),
            Form::Upper => Reading::End(Vec::with_capacity(rows), f64::INFINITY),
            Form::Label => Reading::Label(Vec::with_capacity(rows), Interner::new(&demand.levels, marks)),
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

/// The same for bytes that may not be text.
fn unquote(cell: &[u8]) -> &[u8] {
    match cell {
        [b' ' | b'\t', ..] => std::str::from_utf8(cell).map_or(cell, |text| bare(text).as_bytes()),
        _ => cell,
    }
}

#[cfg(test)]
mod tests {
    use super::{Cells, Demand, Form, Origin, Sheet};
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
    fn numbers_quoted_after_a_space_are_taken_as_meant() {
        assert_eq!(numbers("a,b\n \"1\",2\n", Origin::Column(0), 1).0, [1.0]);
    }
}
