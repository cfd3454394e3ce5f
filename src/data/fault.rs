//! Faults while they are collected: only the first ten are kept, in the order of the file, as places; their texts are
//! fetched from the file at the end.

use super::error::SHOWN;
use super::request::Sort;

/// What is wrong with a cell or a row.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Problem {
    /// A record with this many cells.
    Ragged(usize),
    /// A missing cell.
    Missing,
    /// A cell that cannot be read.
    Unreadable,
    /// A derived value, or a filter's, that is undefined.
    Undefined,
    /// A value that is not of this sort.
    Unfit(Sort),
    /// A label that is not listed.
    Unlisted,
    /// Both ends of an interval open; the slot is the upper end's.
    Open(usize),
    /// The lower end above the upper, whose slot this is.
    Crossed(usize),
    /// A count above the trials, whose slot this is.
    Above(usize),
}

/// A problem and its place.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Entry {
    /// Where the record begins.
    pub start: usize,
    /// Row (of the unfolded table).
    pub row: usize,
    /// The slot; `None`: the whole row, or the filter.
    pub slot: Option<usize>,
    pub problem: Problem,
}

/// The first ten problems and the number of all.
#[derive(Debug, Default)]
pub(super) struct Ledger {
    pub first: Vec<Entry>,
    pub count: usize,
}

impl Ledger {
    /// Notes a problem.
    pub fn note(&mut self, entry: Entry) {
        self.count += 1;
        let key = |e: &Entry| (e.start, e.row, e.slot);
        if self.first.len() == SHOWN {
            if self.first.last().is_some_and(|last| key(last) <= key(&entry)) {
                return;
            }
            self.first.pop();
        }
        let at = self.first.partition_point(|e| key(e) <= key(&entry));
        self.first.insert(at, entry);
    }
}

#[cfg(test)]
mod tests {
    use super::{Entry, Ledger, Problem};

    #[test]
    fn keeps_the_first_ten_in_the_order_of_the_file() {
        let mut ledger = Ledger::default();
        for i in 0..100usize {
            let start = (i * 37) % 100;
            ledger.note(Entry { start, row: start, slot: None, problem: Problem::Missing });
        }
        assert_eq!(ledger.first.iter().map(|e| e.start).collect::<Vec<_>>(), (0..10).collect::<Vec<_>>());
        assert_eq!(ledger.count, 100);
    }
}
