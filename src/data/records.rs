//! Records one after another. A file without quotes is cut in place, which is twice as fast as copying every cell out;
//! any other goes through the `csv` crate. Both see the same records (a test holds them to it): a line feed, a carriage
//! return or both end one, empty lines are none.

/// A walk over the records of some bytes.
pub(super) struct Records<'a> {
    bytes: &'a [u8],
    delimiter: u8,
    /// Where the record at hand begins.
    start: usize,
    /// Where reading goes on.
    end: usize,
    walk: Walk<'a>,
}

enum Walk<'a> {
    /// Where each cell begins, and one past the end of the last cell and its end sign.
    Plain(Vec<usize>),
    Quoted(Box<Quoted<'a>>),
}

struct Quoted<'a> {
    base: usize,
    reader: csv::Reader<&'a [u8]>,
    record: csv::ByteRecord,
}

impl<'a> Records<'a> {
    /// Before the first record from a place on.
    pub fn new(bytes: &'a [u8], from: usize, delimiter: u8, quotes: bool) -> Records<'a> {
        let from = from.min(bytes.len());
        let walk = if quotes {
            let mut builder = csv::ReaderBuilder::new();
            let reader = builder.delimiter(delimiter).has_headers(false).flexible(true).from_reader(&bytes[from..]);
            Walk::Quoted(Box::new(Quoted { base: from, reader, record: csv::ByteRecord::new() }))
        } else {
            Walk::Plain(Vec::new())
        };
        Records { bytes, delimiter, start: from, end: from, walk }
    }

    /// Goes to the next record; false at the end.
    pub fn advance(&mut self) -> bool {
        self.start = begin(self.bytes, self.end);
        match &mut self.walk {
            Walk::Plain(bounds) => {
                bounds.clear();
                if self.start >= self.bytes.len() {
                    return false;
                }
                bounds.push(self.start);
                for (at, b) in self.bytes[self.start..].iter().enumerate() {
                    if *b == self.delimiter {
                        bounds.push(self.start + at + 1);
                    } else if *b == b'\n' || *b == b'\r' {
                        self.end = self.start + at + 1;
                        bounds.push(self.end);
                        return true;
                    }
                }
                self.end = self.bytes.len();
                bounds.push(self.end + 1);
                true
            }
            Walk::Quoted(quoted) => {
                // Reading bytes at hand cannot fail.
                let more = quoted.reader.read_byte_record(&mut quoted.record).unwrap_or(false);
                self.end = quoted.base + usize::try_from(quoted.reader.position().byte()).unwrap_or(usize::MAX);
                more
            }
        }
    }

    /// Where the record at hand begins.
    pub fn start(&self) -> usize {
        self.start
    }

    /// Where reading goes on after it.
    pub fn end(&self) -> usize {
        self.end
    }

    /// How many cells it has.
    pub fn len(&self) -> usize {
        match &self.walk {
            Walk::Plain(bounds) => bounds.len().saturating_sub(1),
            Walk::Quoted(quoted) => quoted.record.len(),
        }
    }

    /// One of its cells.
    pub fn cell(&self, i: usize) -> &[u8] {
        match &self.walk {
            Walk::Plain(bounds) => &self.bytes[bounds[i]..bounds[i + 1] - 1],
            Walk::Quoted(quoted) => &quoted.record[i],
        }
    }
}

/// Past line ends: where the record that is read from `at` on really begins.
pub(super) fn begin(bytes: &[u8], at: usize) -> usize {
    let rest = bytes.get(at..).unwrap_or(&[]);
    at + rest.iter().take_while(|b| matches!(b, b'\r' | b'\n')).count()
}

#[cfg(test)]
mod tests {
    use super::Records;
    use proptest::collection::vec;
    use proptest::prelude::{Just, any, prop_assert_eq, prop_oneof, proptest};

    fn all(bytes: &[u8], quotes: bool) -> Vec<(usize, Vec<Vec<u8>>)> {
        let mut records = Records::new(bytes, 0, b',', quotes);
        let mut found = Vec::new();
        while records.advance() {
            found.push((records.start(), (0..records.len()).map(|i| records.cell(i).to_vec()).collect()));
        }
        found
    }

    #[test]
    fn cells_and_places() {
        let text = b"\r\na,b\r\n\n,\r1";
        let cells = |texts: &[&str]| texts.iter().map(|t| t.as_bytes().to_vec()).collect::<Vec<_>>();
        let expected = vec![(2, cells(&["a", "b"])), (8, cells(&["", ""])), (10, cells(&["1"]))];
        assert_eq!(all(text, false), expected);
        assert_eq!(all(text, true), expected);
        assert_eq!(all(b"1,\"2\n3\"\n4,5", true), vec![(0, cells(&["1", "2\n3"])), (8, cells(&["4", "5"]))]);
    }

    proptest! {
        #[test]
        fn both_walks_see_the_same(bytes in vec(prop_oneof![Just(b','), Just(b'\n'), Just(b'\r'), Just(b'a'), any::<u8>()], 0..80)) {
            let bytes: Vec<u8> = bytes.into_iter().filter(|b| *b != b'"').collect();
            prop_assert_eq!(all(&bytes, false), all(&bytes, true));
        }
    }
}
