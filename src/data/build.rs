//! The table from the rows that are stored.

use super::category;
use super::error::DataError;
use super::scan::Cells;
use super::table::{Column, Counts, Table, Values};
use super::work::{State, Work};

impl Work<'_> {
    pub(super) fn build(mut self) -> Result<Table, DataError> {
        let count = |state| self.states.iter().filter(|s| **s == state).count();
        let (kept, weightless) = (count(State::Kept), count(State::Weightless));
        let counts = Counts {
            read: self.states.len(),
            used: kept + weightless,
            dropped_missing: count(State::Incomplete),
            dropped_only: count(State::Filtered),
            weightless,
        };
        if counts.used == 0 {
            let what = format!(
                "no row is left: {} read, {} left out by only, {} with a missing cell",
                counts.read, counts.dropped_only, counts.dropped_missing
            );
            return self.unusable(what, "loosen data.only, or leave out the columns whose cells are missing");
        }
        if kept == 0 {
            let name = self.plan.weight.map_or("", |w| &self.plan.slots[w].name);
            return self
                .unusable(format!("all weights are zero (column {name})"), "a row counts as often as its weight says");
        }
        let whole = kept == self.states.len();
        let weights = match self.plan.weight.map(|w| &self.cells[w]) {
            Some(Cells::Number(w)) if w.iter().zip(&self.states).any(|(w, s)| *s == State::Kept && *w != 1.0) => {
                Some(self.pick(w.clone(), whole))
            }
            _ => None,
        };
        let mut columns = Vec::new();
        for slot in self.plan.outputs.clone() {
            let cells = std::mem::replace(&mut self.cells[slot], Cells::Number(Vec::new()));
            let values = match cells {
                Cells::Number(values) => Values::Number(self.pick(values, whole)),
                Cells::Label { mut codes, labels } => {
                    let used = |row: usize| matches!(self.states[row], State::Kept | State::Weightless);
                    let listed = self.plan.slots[slot].levels.len();
                    let levels = category::order(&mut codes, &labels, listed, used, self.sheet.decimal);
                    Values::Category { codes: self.pick(codes, whole), levels }
                }
            };
            columns.push(Column { name: self.plan.slots[slot].name.clone(), values });
        }
        let lines = self.lines(whole);
        Ok(Table {
            file: self.sheet.file.to_owned(),
            sha256: String::new(),
            columns,
            rows: kept,
            weights,
            counts,
            lines,
        })
    }

    /// The line of each stored row; none where row i stands on line i + 2.
    fn lines(&self, whole: bool) -> Vec<u32> {
        let unfold = self.plan.rows_a_record();
        // Each record takes one line at least: if the last stands where it would with one each, all do.
        let last = self.starts.last().map_or(0, |start| self.sheet.line(*start));
        if whole && unfold == 1 && last == self.starts.len() + 1 {
            return Vec::new();
        }
        let lines = self.sheet.lines(&self.starts);
        let lines = lines.into_iter().flat_map(|l| std::iter::repeat_n(l, unfold)).collect();
        let lines = self.pick(lines, whole);
        let plain = lines.iter().zip(2u32..).all(|(line, expected)| *line == expected);
        if plain { Vec::new() } else { lines }
    }

    /// The values of the rows that are stored.
    fn pick<T: Copy>(&self, values: Vec<T>, whole: bool) -> Vec<T> {
        if whole {
            return values;
        }
        values.iter().zip(&self.states).filter(|(_, state)| **state == State::Kept).map(|(x, _)| *x).collect()
    }
}
