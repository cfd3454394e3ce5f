//! The first line: names of columns, and where each stands.

use super::error::{DataError, clip};
use super::number;
use crate::expr::nearest;

/// The header of a file.
#[derive(Debug, Clone)]
pub(super) struct Header {
    /// Name of the source.
    pub file: String,
    delimiter: char,
    /// Names in the order of the file, trimmed.
    pub names: Vec<String>,
}

impl Header {
    /// From the cells of the first record.
    pub fn new<'c>(file: &str, delimiter: char, cells: impl Iterator<Item = &'c [u8]>) -> Header {
        let names = cells.map(|cell| super::sheet::bare(&String::from_utf8_lossy(cell)).to_owned()).collect();
        Header { file: file.to_owned(), delimiter, names }
    }

    /// Where the column of this name stands, if there is one.
    pub fn position(&self, name: &str) -> Option<usize> {
        self.names.iter().position(|n| n == name)
    }

    /// Where the one column of this name stands.
    pub fn find(&self, name: &str) -> Result<usize, DataError> {
        let fault = |what, advice| Err(DataError::Header { file: self.file.clone(), what, advice });
        let Some(at) = self.position(name) else {
            return fault(format!("no column is called {}", clip(name)), self.advice(name));
        };
        if let Some(again) = self.names[at + 1..].iter().position(|n| n == name) {
            return fault(
                format!("two columns are called {}: the {} and the {}", clip(name), nth(at), nth(at + 1 + again)),
                vec!["give one of them another name in the header".into()],
            );
        }
        Ok(at)
    }

    /// What helps where a name is not found.
    fn advice(&self, name: &str) -> Vec<String> {
        let mut lines = Vec::new();
        if let Some(near) = nearest(name, self.names.iter().map(String::as_str)) {
            lines.push(format!("nearest name: {}", clip(near)));
        }
        lines.push(format!("columns there are: {}", self.listed()));
        if let [only] = self.names.as_slice()
            && let Some(sign) = [';', '\t', ',', '|'].into_iter().find(|c| *c != self.delimiter && only.contains(*c))
        {
            lines.push(format!("are the cells parted by another sign? delimiter = \"{}\"", sign.escape_default()));
        } else if self.names.iter().all(|n| number::parse(n.as_bytes(), b'.').is_some()) {
            lines.push("the first line must hold the names of the columns".into());
        }
        lines
    }

    /// The names in a line, not all if there are many.
    pub fn listed(&self) -> String {
        const MOST: usize = 30;
        let mut there: Vec<String> = self.names.iter().take(MOST).map(|n| clip(n)).collect();
        if self.names.len() > MOST {
            there.push(format!("and {} more", self.names.len() - MOST));
        }
        there.join(", ")
    }
}

fn nth(index: usize) -> String {
    let n = index + 1;
    let end = match (n % 100, n % 10) {
        (11..=13, _) => "th",
        (_, 1) => "st",
        (_, 2) => "nd",
        (_, 3) => "rd",
        _ => "th",
    };
    format!("{n}{end}")
}

#[cfg(test)]
mod tests {
    use super::{Header, nth};

    fn header(cells: &[&str]) -> Header {
        Header::new("tiles.csv", ',', cells.iter().map(|c| c.as_bytes()))
    }

    #[test]
    fn names_are_trimmed_and_found_however_odd() {
        let h = header(&[" flaws ", "soak time", "2", "\u{3b8}", "", ""]);
        for (at, name) in ["flaws", "soak time", "2", "\u{3b8}"].into_iter().enumerate() {
            assert_eq!(h.find(name).unwrap(), at);
        }
    }

    #[test]
    fn a_name_that_is_not_there() {
        let text = header(&["flaws", "area"]).find("flwas").unwrap_err().to_string();
        assert_eq!(
            text,
            "tiles.csv: no column is called flwas\n    nearest name: flaws\n    columns there are: flaws, area"
        );
        assert!(header(&["flaws;area"]).find("area").unwrap_err().to_string().contains("delimiter = \";\""));
        assert!(header(&["1.5", "2"]).find("area").unwrap_err().to_string().contains("first line must hold the names"));
    }

    #[test]
    fn a_name_that_is_there_twice_matters_only_in_use() {
        let h = header(&["a", "b", "a"]);
        assert!(h.find("b").is_ok());
        assert!(h.find("a").unwrap_err().to_string().contains("two columns are called a: the 1st and the 3rd"));
    }

    #[test]
    fn places_in_words() {
        assert_eq!((nth(0), nth(10), nth(21)), ("1st".into(), "11th".into(), "22nd".into()));
    }
}
