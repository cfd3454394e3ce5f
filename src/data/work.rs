//! The steps from bytes to a table: cells, derived columns, filter, weights.

use super::category;
use super::derived::Formula;
use super::error::{DataError, Faults, SHOWN};
use super::fault::{Entry, Ledger, Problem};
use super::gap::Gap;
use super::plan::{Kind, Place, Plan, Step};
use super::request::Request;
use super::scan::{Cells, Demand, Form};
use super::sheet::Sheet;
use super::table::Table;
use crate::expr::rows::ColumnView;

/// What became of a row.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum State {
    Kept,
    /// Kept with weight 0: not stored.
    Weightless,
    /// Left out by `only`.
    Filtered,
    /// Left out because a cell in use is missing.
    Incomplete,
}

/// A table in the making.
pub(super) struct Work<'a> {
    pub sheet: Sheet<'a>,
    pub plan: Plan,
    pub request: &'a Request,
    /// One a slot.
    pub cells: Vec<Cells>,
    /// Where each record begins.
    pub starts: Vec<usize>,
    pub states: Vec<State>,
    ledger: Ledger,
}

impl<'a> Work<'a> {
    pub fn open(file: &'a str, bytes: &'a [u8], request: &'a Request) -> Result<Work<'a>, DataError> {
        let sheet = Sheet::open(file, bytes, request)?;
        let plan = Plan::new(request, &sheet.header)?;
        let unfold = plan.rows_a_record();
        let asked: Vec<usize> = (0..plan.slots.len()).filter(|s| plan.origin(*s).is_some()).collect();
        let demands: Vec<Demand> = asked.iter().filter_map(|s| demand(&plan, *s)).collect();
        let scanned = sheet.scan(&demands, unfold)?;
        let mut ledger = Ledger::default();
        for (start, found) in &scanned.ragged {
            ledger.note(Entry { start: *start, row: 0, slot: None, problem: Problem::Ragged(*found) });
        }
        ledger.count = scanned.ragged_count;
        let rows = scanned.starts.len() * unfold;
        let mut cells = vec![Cells::Number(Vec::new()); plan.slots.len()];
        for (slot, found) in asked.into_iter().zip(scanned.cells) {
            cells[slot] = found;
        }
        for (slot, cell) in plan.slots.iter().zip(&mut cells) {
            if let (Place::Label, Some(u)) = (slot.place, &request.unfold) {
                // Levels may be listed in another order than the columns.
                let place = |name: &String| slot.levels.iter().position(|l| l == name);
                let codes: Option<Vec<u32>> =
                    u.columns.iter().map(|c| place(c).and_then(|p| u32::try_from(p).ok())).collect();
                let Some(codes) = codes else {
                    return Err(DataError::Request(format!(
                        "the levels of {} listed under data.category must be the columns of data.unfold: {}",
                        u.label,
                        u.columns.join(", ")
                    )));
                };
                *cell =
                    Cells::Label { codes: codes.into_iter().cycle().take(rows).collect(), labels: slot.levels.clone() };
            }
        }
        Ok(Work { sheet, plan, request, cells, starts: scanned.starts, states: vec![State::Kept; rows], ledger })
    }

    pub fn finish(mut self) -> Result<Table, DataError> {
        if self.starts.is_empty() && self.ledger.count == 0 {
            return self.unusable("the file has a header and no rows".into(), "give one line a row below the header");
        }
        let inputs: Vec<usize> =
            self.plan.derived.iter().chain(&self.plan.only).flat_map(|s| s.inputs.iter().map(|i| i.1)).collect();
        self.settle(&inputs)?;
        self.derive()?;
        self.filter()?;
        self.settle(&(0..self.plan.slots.len()).collect::<Vec<_>>())?;
        self.weigh();
        self.gaps();
        self.values();
        self.pairs();
        if self.ledger.count > 0 {
            return Err(DataError::Faults(self.faults()));
        }
        self.build()
    }

    pub fn unusable<T>(&self, what: String, advice: &str) -> Result<T, DataError> {
        Err(DataError::Unusable { file: self.sheet.file.to_owned(), what, advice: advice.to_owned() })
    }

    /// Where the record of a row begins.
    pub fn start(&self, row: usize) -> usize {
        self.starts.get(row / self.plan.rows_a_record()).copied().unwrap_or(0)
    }

    pub fn note(&mut self, row: usize, slot: Option<usize>, problem: Problem) {
        let start = self.start(row);
        self.ledger.note(Entry { start, row, slot, problem });
    }

    fn faults(&self) -> Faults {
        let mut faults = Faults { file: self.sheet.file.to_owned(), ..Faults::default() };
        for entry in &self.ledger.first {
            let (fault, advice) = self.describe(entry);
            faults.first.push(fault);
            for line in advice.iter().map(ToString::to_string) {
                if !faults.advice.contains(&line) {
                    faults.advice.push(line);
                }
            }
        }
        faults.more = self.ledger.count - self.ledger.first.len().min(SHOWN);
        faults
    }

    /// Decides which open columns hold numbers and which labels, by the rows not filtered so far; labels are read again.
    fn settle(&mut self, slots: &[usize]) -> Result<(), DataError> {
        let mut again = Vec::new();
        for slot in slots {
            if self.plan.slots[*slot].kind != Kind::Open {
                continue;
            }
            let (mut numbers, mut texts) = (0usize, 0usize);
            for (row, state) in self.states.iter().enumerate() {
                match self.cells[*slot].gap(row) {
                    _ if *state == State::Filtered => {}
                    None => numbers += 1,
                    Some(Gap::Missing) => {}
                    Some(_) => texts += 1,
                }
            }
            let labels = texts > 0 && texts >= numbers;
            self.plan.slots[*slot].kind = Kind::Fixed(if labels { Form::Label } else { Form::Number });
            if labels {
                again.push(*slot);
            }
        }
        if !again.is_empty() {
            let demands: Vec<Demand> = again.iter().filter_map(|s| demand(&self.plan, *s)).collect();
            let scanned = self.sheet.scan(&demands, self.plan.rows_a_record())?;
            for (slot, cells) in again.into_iter().zip(scanned.cells) {
                self.cells[slot] = cells;
            }
        }
        Ok(())
    }

    /// The value of an expression in each row, gaps where an input has one or the value is not finite.
    fn evaluate(&self, step: &Step) -> Result<Vec<f64>, DataError> {
        let mut values = step.formula.values(&|name| view(&self.cells, step, name), self.states.len())?;
        let gappy: Vec<&Cells> = step.inputs.iter().map(|(_, s)| &self.cells[*s]).filter(|c| c.has_gaps()).collect();
        for (row, x) in values.iter_mut().enumerate() {
            let mut gaps = gappy.iter().filter_map(|c| c.gap(row)).peekable();
            if gaps.peek().is_some() {
                let all_missing = gaps.all(|gap| gap == Gap::Missing);
                *x = if all_missing { Gap::Missing } else { Gap::Untried }.number();
            } else if !x.is_finite() {
                *x = Gap::Undefined.number();
            }
        }
        Ok(values)
    }

    fn derive(&mut self) -> Result<(), DataError> {
        for i in 0..self.plan.derived.len() {
            let step = &self.plan.derived[i];
            let values = self.evaluate(step)?;
            let place = Place::Derived(step.index);
            for (slot, cells) in self.plan.slots.iter().zip(&mut self.cells).filter(|(s, _)| s.place == place) {
                *cells = if slot.kind == Kind::Fixed(Form::Label) {
                    let mut interner = category::Interner::new(&slot.levels, &[]);
                    let codes = category::from_numbers(&values, &mut interner);
                    Cells::Label { codes, labels: interner.into_labels() }
                } else {
                    Cells::Number(values.clone())
                };
            }
        }
        Ok(())
    }

    fn filter(&mut self) -> Result<(), DataError> {
        let Some(only) = &self.plan.only else { return Ok(()) };
        let values = self.evaluate(only)?;
        let mut undefined = Vec::new();
        for (row, x) in values.iter().enumerate() {
            match Gap::of_number(*x) {
                None if *x == 0.0 => self.states[row] = State::Filtered,
                None | Some(Gap::Missing | Gap::Unreadable | Gap::Untried) => {}
                Some(Gap::Undefined) => undefined.push(row),
            }
        }
        for row in undefined {
            self.note(row, None, Problem::Undefined);
        }
        Ok(())
    }

    fn weigh(&mut self) {
        let Some(Cells::Number(weights)) = self.plan.weight.map(|w| &self.cells[w]) else { return };
        for (state, w) in self.states.iter_mut().zip(weights) {
            if *state == State::Kept && *w == 0.0 {
                *state = State::Weightless;
            }
        }
    }
}

/// What the scan must read for a slot.
fn demand(plan: &Plan, slot: usize) -> Option<Demand> {
    let form = match plan.slots[slot].kind {
        Kind::Fixed(form) => form,
        Kind::Open => Form::Number,
    };
    Some(Demand { origin: plan.origin(slot)?, form, levels: plan.slots[slot].levels.clone() })
}

/// An input of an expression, as it sees it.
pub(super) fn view<'v>(cells: &'v [Cells], step: &Step, name: &str) -> Option<ColumnView<'v>> {
    let (_, slot) = step.inputs.iter().find(|(n, _)| n == name)?;
    Some(match cells.get(*slot)? {
        Cells::Number(values) => ColumnView::Number(values),
        Cells::Label { codes, labels } => ColumnView::Category { codes, levels: labels },
    })
}

/// The expression that fills a derived place.
pub(super) fn formula(plan: &Plan, place: Place) -> Option<&Step> {
    plan.derived.iter().find(|s| place == Place::Derived(s.index))
}

/// The name of the text that a formula was, for messages.
pub(super) fn written(formula: &Formula) -> String {
    super::error::clip(&formula.text)
}

#[cfg(test)]
mod tests {
    use crate::data::{Blame, OnMissing, Request, Sort, Source, Table, Unfold, Values, Wanted, read};

    fn request(wanted: &[(&str, Sort)], derive: &[(&str, &str)]) -> Request {
        Request {
            wanted: wanted.iter().map(|(name, sort)| Wanted::new(*name, *sort)).collect(),
            derive: derive.iter().map(|(name, text)| ((*name).to_owned(), (*text).to_owned())).collect(),
            ..Request::default()
        }
    }

    fn table(text: &str, request: &Request) -> Table {
        read(&Source::text("tiles.csv", text), request).unwrap()
    }

    fn error(text: &str, request: &Request) -> String {
        read(&Source::text("tiles.csv", text), request).unwrap_err().to_string()
    }

    #[test]
    fn derived_columns_build_on_columns_and_on_one_another() {
        let asked = request(
            &[("c", Sort::Number), ("a", Sort::Number)],
            &[("b", "log(a)"), ("c", "2 * b + \"d e\""), ("unused", "nothing_wrong / a")],
        );
        assert!(error("a,d e\n1,5\n", &asked).contains("no column is called nothing_wrong"));
        let asked = request(
            &[("c", Sort::Number), ("a", Sort::Number)],
            &[("b", "log(a)"), ("c", "2 * b + \"d e\""), ("unused", "1 / gap")],
        );
        let t = table("a,d e,gap\n1,5,\n1,6,\n", &asked);
        assert_eq!(t.columns[0].values, Values::Number(vec![5.0, 6.0]));
        assert_eq!(t.columns[1].name, "a");
    }

    #[test]
    fn derived_values_that_are_undefined() {
        let asked = request(&[("c", Sort::Number)], &[("b", "log(a)"), ("c", "1 + b")]);
        assert_eq!(
            error("a,x\n1,\n-3.0,\n,\n", &Request { on_missing: OnMissing::Drop, ..asked.clone() }),
            "tiles.csv, line 3, column b: log(a) is undefined: log of -3, where a is \"-3.0\"\n    \
             correct the cells, or leave such rows out: only = \"...\""
        );
        assert!(
            error("a,x\n1,\n,\n", &asked).starts_with("tiles.csv, line 3, column a: found \"\", which means missing")
        );
        let kept = Request { only: Some("a > 0".into()), ..asked.clone() };
        assert_eq!(table("a,x\n1,\n-3.0,\n", &kept).rows, 1);
        let positive = request(&[("b", Sort::Positive)], &[("b", "a - 2")]);
        assert!(
            error("a,x\n3,\n1,\n", &positive)
                .contains("line 3, column b: found -1, where a is \"1\", expected a number above 0")
        );
    }

    #[test]
    fn a_filter_that_is_undefined_is_a_fault() {
        let asked = Request { only: Some("log(a) > 0".into()), ..request(&[("a", Sort::Number)], &[]) };
        let wrong = error("a,x\n3,\n-1,\n", &asked);
        assert!(wrong.contains("line 3: only = \"log(a) > 0\" is undefined: log of -1, where a is \"-1\""), "{wrong}");
        let guarded = Request { only: Some("a > 0 and log(a) > 0".into()), ..asked };
        assert_eq!(table("a,x\n3,\n-1,\n", &guarded).rows, 1);
    }

    #[test]
    fn filters_on_labels_and_on_numbers_of_categories() {
        let text = "kiln,year,a\nnorth,1990,1\nsouth,1991,2\nnorth,1992,3\n";
        let asked = |only: &str, year: Sort| Request {
            only: Some(only.into()),
            ..request(&[("a", Sort::Number), ("year", year)], &[])
        };
        assert_eq!(
            table(text, &asked("kiln = 'north'", Sort::Number)).columns[0].values,
            Values::Number(vec![1.0, 3.0])
        );
        assert_eq!(table(text, &asked("'north' != kiln", Sort::Number)).columns[0].values, Values::Number(vec![2.0]));
        // A label that looks like a number, beside the number itself.
        assert_eq!(table(text, &asked("year = '1991'", Sort::Number)).columns[0].values, Values::Number(vec![2.0]));
        let t = table(text, &asked("year > 1990", Sort::Category));
        assert_eq!(
            t.columns[1].values,
            Values::Category { codes: vec![0, 1], levels: vec!["1991".into(), "1992".into()] }
        );
        let listed = Request { categories: vec![("year".into(), vec![])], ..asked("year > 1990", Sort::Either) };
        let wrong = read(&Source::text("f", text), &listed).unwrap_err();
        assert_eq!(wrong.blame(), Blame::Study);
        assert!(wrong.to_string().contains("year is a category and has no value as a number"), "{wrong}");
        assert!(error(text, &asked("kiln = 'nroth'", Sort::Number)).contains("no level is called nroth"));
        assert!(error(text, &asked("kilm = 'north'", Sort::Number)).contains("nearest name: kiln"));
    }

    #[test]
    fn names_that_clash() {
        for (derive, part) in [
            (&[("a", "b")][..], "two columns are called a: one made by data.derive, and column 1 of tiles.csv"),
            (&[("c", "b"), ("c", "a")], "two columns are called c: one made by data.derive, one by data.derive"),
            (&[("c", "d"), ("d", "a")], "d is derived further down"),
            (&[("c", "c + 1")], "c is made of itself"),
            (&[("c", "log(")], "data.derive.c"),
        ] {
            let wrong = error("a,b\n1,2\n", &request(&[("a", Sort::Number)], derive));
            assert!(wrong.contains(part), "{wrong}");
        }
    }

    fn unfold() -> Request {
        let columns = vec!["north_n".to_owned(), "south_n".to_owned()];
        let unfold = Some(Unfold { columns, label: "kiln".into(), value: "tiles".into() });
        Request { unfold, ..request(&[("grade", Sort::Number), ("kiln", Sort::Category)], &[]) }
    }

    #[test]
    fn unfolding_gives_rows_with_a_label_and_a_weight() {
        let t = table("grade,north_n,south_n\n1,10,20\n2,0,5\n", &unfold());
        assert_eq!(t.columns[0].values, Values::Number(vec![1.0, 1.0, 2.0]));
        let levels = vec!["north_n".to_owned(), "south_n".to_owned()];
        assert_eq!(t.columns[1].values, Values::Category { codes: vec![0, 1, 1], levels });
        assert_eq!((t.weights.clone(), t.lines.clone()), (Some(vec![10.0, 20.0, 5.0]), vec![2, 2, 3]));
        assert_eq!((t.counts.read, t.counts.used, t.counts.weightless), (4, 4, 1));
        let reordered =
            Request { categories: vec![("kiln".into(), vec!["south_n".into(), "north_n".into()])], ..unfold() };
        let t = table("grade,north_n,south_n\n1,10,20\n", &reordered);
        let levels = vec!["south_n".to_owned(), "north_n".to_owned()];
        assert_eq!(t.columns[1].values, Values::Category { codes: vec![1, 0], levels });
    }

    #[test]
    fn faults_in_unfolded_columns_name_the_column_of_the_file() {
        let wrong = error("grade,north_n,south_n\n1,10,x\n2,-1,5\n", &unfold());
        assert!(wrong.contains("line 2, column south_n: found \"x\", expected a number"), "{wrong}");
        assert!(wrong.contains("line 3, column north_n: found \"-1\", expected a number, 0 or more"), "{wrong}");
        let clash = Request { unfold: unfold().unfold.map(|u| Unfold { label: "grade".into(), ..u }), ..unfold() };
        assert!(error("grade,north_n,south_n\n1,1,1\n", &clash).contains("two columns are called grade"));
        let gone = error("grade,north_n\n1,1\n", &unfold());
        assert!(gone.contains("no column is called south_n"), "{gone}");
    }

    #[test]
    fn an_unfolded_value_that_the_model_uses_is_no_weight() {
        let mut asked = unfold();
        asked.wanted.push(Wanted::new("tiles", Sort::Count));
        let t = table("grade,north_n,south_n\n1,10,20\n2,0,5\n", &asked);
        assert_eq!((t.rows, t.weights.clone()), (4, None));
        assert_eq!(t.columns[2].values, Values::Number(vec![10.0, 20.0, 0.0, 5.0]));
        let labelled = Request { only: Some("kiln = 'north_n' and tiles > 0".into()), ..asked };
        assert_eq!(table("grade,north_n,south_n\n1,10,20\n2,0,5\n", &labelled).rows, 1);
    }

    #[test]
    fn derived_columns_as_categories() {
        let asked = Request {
            categories: vec![("big".into(), vec!["1".into(), "0".into()])],
            ..request(&[("big", Sort::Either)], &[("big", "if(a > 2, 1, 0)")])
        };
        let t = table("a\n1\n3\n", &asked);
        assert_eq!(t.columns[0].values, Values::Category { codes: vec![1, 0], levels: vec!["1".into(), "0".into()] });
    }
}
