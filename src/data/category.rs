//! Labels to codes while reading, and the order of levels afterwards.

use super::gap::{CODE_LIMIT, Gap};
use super::number;
use super::sheet::bare;
use std::collections::HashMap;

/// Gives each label a code, in the order met; levels listed beforehand come first.
pub(super) struct Interner {
    /// Bytes of cells (trimmed of ASCII spaces) to codes, gaps included.
    codes: HashMap<Vec<u8>, u32>,
    labels: Vec<String>,
}

impl Interner {
    /// With the listed levels as the first codes; marks are missing.
    pub fn new(levels: &[String], marks: &[Vec<u8>]) -> Interner {
        let mut codes: HashMap<Vec<u8>, u32> = levels.iter().map(|l| l.as_bytes().to_vec()).zip(0..).collect();
        codes.insert(Vec::new(), Gap::Unreadable.code());
        codes.extend(marks.iter().map(|m| (m.clone(), Gap::Missing.code())));
        Interner { codes, labels: levels.to_vec() }
    }

    /// The code of a cell.
    pub fn code(&mut self, cell: &[u8]) -> u32 {
        let cell = number::trim(cell);
        match self.codes.get(cell) {
            Some(code) => *code,
            None => self.learn(cell),
        }
    }

    fn learn(&mut self, cell: &[u8]) -> u32 {
        let Ok(text) = std::str::from_utf8(cell) else { return Gap::Unreadable.code() };
        let label = text.trim();
        if let Some(code) = self.codes.get(label.as_bytes()) {
            return *code;
        }
        // More labels than codes would need more memory than rows allow; such a cell is no label.
        let code = u32::try_from(self.labels.len()).unwrap_or(u32::MAX);
        if code >= CODE_LIMIT {
            return Gap::Unreadable.code();
        }
        self.labels.push(label.to_owned());
        self.codes.insert(label.as_bytes().to_vec(), code);
        code
    }

    /// The labels by code.
    pub fn into_labels(self) -> Vec<String> {
        self.labels
    }
}

/// The order of levels that are not listed: by value if all are numbers, else bytewise.
pub(super) fn sort(levels: &mut [String], decimal: u8) {
    let value = |l: &String| number::parse(l.as_bytes(), decimal);
    if levels.iter().all(|l| value(l).is_some()) {
        levels.sort_by(|a, b| {
            let (x, y) = (value(a).unwrap_or(0.0), value(b).unwrap_or(0.0));
            x.total_cmp(&y).then_with(|| a.cmp(b))
        });
    } else {
        levels.sort();
    }
}

/// Codes into `labels` rewritten as codes into `levels`, the labels that rows in use hold, in their order. With
/// `listed` levels those stand as they are (they are the first labels).
pub(super) fn order(
    codes: &mut [u32],
    labels: &[String],
    listed: usize,
    used: impl Fn(usize) -> bool,
    decimal: u8,
) -> Vec<String> {
    if listed > 0 {
        return labels[..listed].to_vec();
    }
    let mut seen = vec![false; labels.len()];
    for (row, code) in codes.iter().enumerate() {
        if let Some(flag) = seen.get_mut(*code as usize)
            && used(row)
        {
            *flag = true;
        }
    }
    let mut levels: Vec<String> = labels.iter().zip(&seen).filter(|(_, s)| **s).map(|(l, _)| l.clone()).collect();
    sort(&mut levels, decimal);
    let place: HashMap<&str, u32> = levels.iter().map(String::as_str).zip(0..).collect();
    let map: Vec<u32> =
        labels.iter().map(|l| place.get(l.as_str()).copied().unwrap_or(Gap::Unreadable.code())).collect();
    for code in codes {
        *code = map.get(*code as usize).copied().unwrap_or(*code);
    }
    levels
}

/// Numbers as labels, for a derived column read as a category: written as short as reads back the same.
pub(super) fn from_numbers(values: &[f64], interner: &mut Interner) -> Vec<u32> {
    let mut last: Option<(u64, u32)> = None;
    values
        .iter()
        .map(|x| match (Gap::of_number(*x), last) {
            (Some(gap), _) => gap.code(),
            (None, Some((bits, code))) if bits == x.to_bits() => code,
            _ => {
                // Adding zero makes minus zero plain.
                let code = interner.code(format!("{}", x + 0.0).as_bytes());
                last = Some((x.to_bits(), code));
                code
            }
        })
        .collect()
}

/// A cell as a label, for messages about labels.
pub(super) fn label_of(cell: &[u8]) -> String {
    bare(&String::from_utf8_lossy(cell)).to_owned()
}

#[cfg(test)]
mod tests {
    use super::{Interner, from_numbers, order, sort};
    use crate::data::gap::Gap;

    fn texts(labels: &[&str]) -> Vec<String> {
        labels.iter().map(|l| (*l).to_owned()).collect()
    }

    #[test]
    fn labels_get_codes_and_marks_are_gaps() {
        let mut interner = Interner::new(&texts(&["north"]), &[b"NA".to_vec()]);
        let codes: Vec<u32> =
            ["south", " north ", "NA", "", "south\u{a0}"].iter().map(|c| interner.code(c.as_bytes())).collect();
        assert_eq!(codes, [1, 0, Gap::Missing.code(), Gap::Unreadable.code(), 1]);
        assert_eq!(interner.code(&[0xff]), Gap::Unreadable.code());
        assert_eq!(interner.into_labels(), texts(&["north", "south"]));
    }

    #[test]
    fn numbers_sort_by_value_and_texts_bytewise() {
        let mut levels = texts(&["10", "9", "-1", "9.0"]);
        sort(&mut levels, b'.');
        assert_eq!(levels, texts(&["-1", "9", "9.0", "10"]));
        let mut levels = texts(&["10", "9", "b", "B"]);
        sort(&mut levels, b'.');
        assert_eq!(levels, texts(&["10", "9", "B", "b"]));
    }

    #[test]
    fn levels_of_rows_not_in_use_vanish() {
        let labels = texts(&["south", "north", "west"]);
        let mut codes = [0, 1, 2, 0];
        assert_eq!(order(&mut codes, &labels, 0, |row| row != 2, b'.'), texts(&["north", "south"]));
        assert_eq!((codes[0], codes[1], codes[3]), (1, 0, 1));
        let mut codes = [0, 1, 2, 0];
        assert_eq!(order(&mut codes, &labels, 3, |_| true, b'.'), labels);
        assert_eq!(codes, [0, 1, 2, 0]);
    }

    #[test]
    fn numbers_become_labels() {
        let mut interner = Interner::new(&[], &[]);
        let codes = from_numbers(&[1.0, 1.0, -0.0, 0.5, 0.0, Gap::Missing.number()], &mut interner);
        assert_eq!(codes, [0, 0, 1, 2, 1, Gap::Missing.code()]);
        assert_eq!(interner.into_labels(), texts(&["1", "0", "0.5"]));
    }
}
