//! What rows that are kept must hold: no missing cells, values of the right sort, listed labels, ends in order.

use super::fault::Problem;
use super::gap::Gap;
use super::plan::{Kind, Place};
use super::request::{OnMissing, Pair, Sort};
use super::scan::{Cells, Form};
use super::work::{State, Work};

impl Work<'_> {
    /// Cells without a value in rows that are kept.
    pub(super) fn gaps(&mut self) {
        for slot in 0..self.cells.len() {
            if !self.cells[slot].has_gaps() {
                continue;
            }
            let derived = matches!(self.plan.slots[slot].place, Place::Derived(_));
            for row in 0..self.states.len() {
                let Some(gap) = self.cells[slot].gap(row) else { continue };
                match (gap, self.states[row]) {
                    (_, State::Filtered) => {}
                    (Gap::Unreadable, _) => self.note(row, Some(slot), Problem::Unreadable),
                    (Gap::Undefined, State::Kept) => self.note(row, Some(slot), Problem::Undefined),
                    // A derived value is missing because an input is, and that is said of the input.
                    (Gap::Missing, State::Kept) if !derived => match self.request.on_missing {
                        OnMissing::Drop => self.states[row] = State::Incomplete,
                        OnMissing::Stop => self.note(row, Some(slot), Problem::Missing),
                    },
                    (Gap::Missing | Gap::Undefined | Gap::Untried, _) => {}
                }
            }
        }
    }

    /// Values that are not what their column must hold.
    pub(super) fn values(&mut self) {
        let mut found = Vec::new();
        for (at, (slot, cells)) in self.plan.slots.iter().zip(&self.cells).enumerate() {
            match cells {
                Cells::Number(values) => {
                    let end = matches!(slot.kind, Kind::Fixed(Form::Lower | Form::Upper));
                    for sort in &slot.sorts {
                        if *sort == Sort::Number && !end {
                            // Nothing else was read.
                            continue;
                        }
                        let fits =
                            |x: f64| sort.allows(x) || (end && x.is_infinite() && *sort != Sort::Number) || x.is_nan();
                        let bad = values.iter().zip(&self.states).enumerate();
                        let bad = bad.filter(|(_, (x, state))| !fits(**x) && **state == State::Kept);
                        found.extend(bad.map(|(row, _)| (row, at, Problem::Unfit(*sort))));
                    }
                }
                Cells::Label { codes, .. } if !slot.levels.is_empty() => {
                    let bad = codes.iter().zip(&self.states).enumerate().filter(|(_, (code, state))| {
                        matches!(state, State::Kept | State::Weightless)
                            && **code as usize >= slot.levels.len()
                            && Gap::of_code(**code).is_none()
                    });
                    found.extend(bad.map(|(row, _)| (row, at, Problem::Unlisted)));
                }
                Cells::Label { .. } => {}
            }
        }
        // Two demands that one value fails are one fault.
        found.dedup_by_key(|(row, slot, _)| (*row, *slot));
        for (row, slot, problem) in found {
            self.note(row, Some(slot), problem);
        }
    }

    pub(super) fn pairs(&mut self) {
        let mut found = Vec::new();
        for (pair, (a, b)) in self.request.pairs.iter().zip(&self.plan.pairs) {
            let (Cells::Number(x), Cells::Number(y)) = (&self.cells[*a], &self.cells[*b]) else { continue };
            for (row, ((x, y), state)) in x.iter().zip(y).zip(&self.states).enumerate() {
                let problem = match pair {
                    _ if *state != State::Kept => continue,
                    Pair::Ends { .. } if x.is_infinite() && y.is_infinite() => Problem::Open(*b),
                    Pair::Ends { .. } if x > y => Problem::Crossed(*b),
                    Pair::AtMost { .. } if x > y => Problem::Above(*b),
                    _ => continue,
                };
                found.push((row, *a, problem));
            }
        }
        for (row, slot, problem) in found {
            self.note(row, Some(slot), problem);
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::data::{Blame, Counts, OnMissing, Request, Sort, Source, Table, Values, Wanted, read};

    fn request(wanted: &[(&str, Sort)]) -> Request {
        let wanted = wanted.iter().map(|(name, sort)| Wanted::new(*name, *sort)).collect();
        Request { wanted, ..Request::default() }
    }

    fn table(text: &str, request: &Request) -> Table {
        read(&Source::text("tiles.csv", text), request).unwrap()
    }

    fn error(text: &str, request: &Request) -> String {
        read(&Source::text("tiles.csv", text), request).unwrap_err().to_string()
    }

    const GAPPY: &str = "a,b,c\n1,,x\n2,5,\n,6,y\nNA,7,y\n";

    #[test]
    fn missing_cells_stop_or_drop_rows() {
        let stop = Request { missing: vec!["".into(), "NA".into()], ..request(&[("a", Sort::Number)]) };
        assert_eq!(
            error(GAPPY, &stop),
            "tiles.csv, line 4, column a: found \"\", which means missing\n\
             tiles.csv, line 5, column a: found \"NA\", which means missing\n    \
             fill the cells in, or leave such rows out and have them counted: on_missing = \"drop\""
        );
        let drop = Request { on_missing: OnMissing::Drop, ..stop };
        let t = table(GAPPY, &drop);
        assert_eq!(t.columns[0].values, Values::Number(vec![1.0, 2.0]));
        assert_eq!(t.counts, Counts { read: 4, used: 2, dropped_missing: 2, dropped_only: 0, weightless: 0 });
        let more = Request { wanted: vec![Wanted::new("a", Sort::Number), Wanted::new("c", Sort::Category)], ..drop };
        let t = table(GAPPY, &more);
        assert_eq!((t.rows, t.counts.dropped_missing, t.lines.clone()), (1, 3, vec![]));
        // An empty cell that is no mark is not missing.
        let strict =
            Request { missing: vec!["NA".into()], on_missing: OnMissing::Drop, ..request(&[("a", Sort::Number)]) };
        assert!(error(GAPPY, &strict).contains("line 4, column a: found \"\", expected a number, not an empty cell"));
        // Marks may look like numbers.
        let marks =
            Request { missing: vec!["2".into()], on_missing: OnMissing::Drop, ..request(&[("b", Sort::Number)]) };
        assert_eq!(table("b\n1\n2\n3\n", &marks).columns[0].values, Values::Number(vec![1.0, 3.0]));
        assert_eq!(table("b\n1\n2\n3\n", &marks).lines, [2, 4]);
    }

    #[test]
    fn only_goes_before_missing_and_before_faults() {
        let asked =
            Request { only: Some("b > 5".into()), on_missing: OnMissing::Drop, ..request(&[("a", Sort::Number)]) };
        let t = table("a,b\nbroken,1\n1,6\n,7\n3,\n4,9\n", &asked);
        assert_eq!(t.columns[0].values, Values::Number(vec![1.0, 4.0]));
        // A missing cell that only uses does not decide: it is a missing cell.
        assert_eq!(t.counts, Counts { read: 5, used: 2, dropped_missing: 2, dropped_only: 1, weightless: 0 });
        let stop = Request { on_missing: OnMissing::Stop, ..asked.clone() };
        assert!(error("a,b\n1,\n2,7\n", &stop).contains("line 2, column b: found \"\", which means missing"));
        assert!(error("a,b\n1,x\n2,7\n", &asked).contains("line 2, column b: found \"x\", expected a number"));
        let none = error("a,b\n1,2\n,9\n", &asked);
        assert!(none.contains("no row is left: 2 read, 1 left out by only, 1 with a missing cell"), "{none}");
    }

    #[test]
    fn values_are_checked_where_rows_are_used() {
        for (sort, bad, words) in [
            (Sort::Positive, "0", "a number above 0"),
            (Sort::Nonnegative, "-0.1", "a number, 0 or more"),
            (Sort::Count, "1.5", "a whole number, 0 or more"),
            (Sort::ZeroOne, "2", "0 or 1"),
            (Sort::CountUpTo(3.0), "4", "a whole number from 0 to 3"),
        ] {
            let text = format!("a,w\n1,1\n{bad},1\n{bad},0\n");
            let found = error(&text, &Request { weight: Some("w".into()), ..request(&[("a", sort)]) });
            assert!(
                found.starts_with(&format!("tiles.csv, line 3, column a: found \"{bad}\", expected {words}")),
                "{found}"
            );
            assert!(!found.contains("line 4"), "a row of weight 0 may be out of range");
        }
    }

    #[test]
    fn labels_that_are_not_listed() {
        let levels = vec!["south".into(), "north".into(), "west".into()];
        let asked = Request { categories: vec![("kiln".into(), levels.clone())], ..request(&[("kiln", Sort::Either)]) };
        let t = table("kiln,a\nnorth,\nsouth,\n", &asked);
        assert_eq!(t.columns[0].values, Values::Category { codes: vec![1, 0], levels });
        assert_eq!(
            error("kiln,a\nnorth,\nnroth,\n", &asked),
            "tiles.csv, line 3, column kiln: found \"nroth\", expected one of south, north, west (nearest: north)\n    \
             correct the label, or add it to the levels under [data.category]"
        );
    }

    #[test]
    fn weights() {
        let asked = Request { weight: Some("w".into()), ..request(&[("a", Sort::Number)]) };
        let t = table("a,w\n1,2\n2,0\n3,0.5\n", &asked);
        assert_eq!((t.weights.clone(), t.rows, t.weight_total()), (Some(vec![2.0, 0.5]), 2, 2.5));
        assert_eq!((t.counts.used, t.counts.weightless, t.lines.clone()), (3, 1, vec![2, 4]));
        assert_eq!(table("a,w\n1,1\n2,1.0\n", &asked).weights, None);
        assert!(
            error("a,w\n1,-2\n2,1\n", &asked).contains("line 2, column w: found \"-2\", expected a number, 0 or more")
        );
        assert!(error("a,w\n1,inf\n2,1\n", &asked).contains("expected a finite number"));
        assert!(error("a,w\n1,0\n2,0\n", &asked).contains("all weights are zero (column w)"));
        // A row of weight 0 may lack cells, but its labels are levels.
        let kiln = Request { weight: Some("w".into()), ..request(&[("a", Sort::Number), ("kiln", Sort::Category)]) };
        let t = table("a,kiln,w\n1,south,1\n,north,0\n", &kiln);
        assert_eq!(
            t.columns[1].values,
            Values::Category { codes: vec![1], levels: vec!["north".into(), "south".into()] }
        );
    }

    #[test]
    fn categories_and_numbers_do_not_mix() {
        let listed = Request { categories: vec![("a".into(), vec![])], ..request(&[("a", Sort::Count)]) };
        let twice = request(&[("a", Sort::Number), ("a", Sort::Category)]);
        for asked in [listed, twice] {
            let wrong = read(&Source::text("f", "a\n1\n"), &asked).unwrap_err();
            assert_eq!(wrong.blame(), Blame::Study);
            assert!(wrong.to_string().contains("category"), "{wrong}");
        }
        let unknown = Request { categories: vec![("kilm".into(), vec![])], ..request(&[("a", Sort::Count)]) };
        assert!(error("a,kiln\n1,2\n", &unknown).contains("nearest name: kiln"));
    }
}
