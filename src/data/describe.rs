//! A fault in words, with the texts fetched from the file.

use super::category::label_of;
use super::error::{Advice, Fault, clip, quote};
use super::fault::{Entry, Problem};
use super::number;
use super::plan::{Place, Step};
use super::request::Sort;
use super::scan::{Cells, Form, Origin};
use super::work::{Work, formula, written};
use crate::expr::nearest;
use crate::expr::rows::ColumnView;
use std::collections::BTreeSet;

impl Work<'_> {
    /// The fault, and what to do about it.
    pub(super) fn describe(&self, entry: &Entry) -> (Fault, Option<Advice>) {
        let (mut column, what, advice) = match (entry.problem, entry.slot) {
            (Problem::Ragged(found), _) => {
                let expected = self.sheet.header.names.len();
                let s = |n: usize| if n == 1 { "cell" } else { "cells" };
                let what = format!("found {found} {}, expected {expected} as in the header", s(found));
                (None, what, Some(Advice::Ragged))
            }
            (_, None) => {
                let what = self.plan.only.as_ref().map_or_else(String::new, |only| {
                    format!("only = \"{}\" is undefined: {}", written(&only.formula), self.undefined(only, entry.row))
                });
                (None, what, Some(Advice::Undefined))
            }
            (problem, Some(slot)) => {
                let (what, advice) = self.cell_fault(problem, slot, entry.row);
                (Some(self.column_name(slot, entry.row)), what, advice)
            }
        };
        if let Some(name) = column.as_mut().filter(|n| n.is_empty()) {
            *name = "without a name".into();
        }
        (Fault { line: self.sheet.line(entry.start), column, what }, advice)
    }

    fn cell_fault(&self, problem: Problem, slot: usize, row: usize) -> (String, Option<Advice>) {
        let cell = self.cell(slot, row);
        let found = || match (&cell, &self.cells[slot]) {
            (Some(cell), _) => format!("found {}", quote(cell)),
            (None, Cells::Number(values)) => {
                let x = values.get(row).copied().unwrap_or(f64::NAN);
                match formula(&self.plan, self.plan.slots[slot].place) {
                    Some(step) => format!("found {x}{}", self.inputs(step, row)),
                    None => format!("found {x}"),
                }
            }
            (None, Cells::Label { codes, labels }) => {
                let label = codes.get(row).and_then(|c| labels.get(*c as usize));
                format!("found \"{}\"", label.map_or_else(String::new, |l| clip(l)))
            }
        };
        let other = |slot: usize| {
            let shown = self.cell(slot, row).map_or_else(|| "a value".into(), |c| quote(&c));
            format!("{shown} in column {}", clip(&self.column_name(slot, row)))
        };
        match problem {
            Problem::Missing => (format!("{}, which means missing", found()), Some(Advice::Drop)),
            Problem::Unreadable => self.unreadable(slot, &cell.clone().unwrap_or_default(), &found()),
            Problem::Undefined => match formula(&self.plan, self.plan.slots[slot].place) {
                Some(step) => {
                    let what = format!("{} is undefined: {}", written(&step.formula), self.undefined(step, row));
                    (what, Some(Advice::Undefined))
                }
                None => (found(), None),
            },
            Problem::Unfit(sort) => (format!("{}, expected {}", found(), sort.words()), None),
            Problem::Unlisted => {
                let levels = &self.plan.slots[slot].levels;
                let label = cell.as_deref().map(label_of).unwrap_or_default();
                let near = nearest(&label, levels.iter().map(String::as_str));
                let listed = levels.iter().take(20).map(|l| clip(l)).collect::<Vec<_>>().join(", ");
                let more = if levels.len() > 20 { ", ..." } else { "" };
                let near = near.map_or_else(String::new, |n| format!(" (nearest: {})", clip(n)));
                (format!("{}, expected one of {listed}{more}{near}", found()), Some(Advice::Levels))
            }
            Problem::Open(upper) => {
                (format!("{} and {}: both ends are open", found(), other(upper)), Some(Advice::Ends))
            }
            Problem::Crossed(upper) => {
                (format!("{}, expected at most the upper end, {}", found(), other(upper)), Some(Advice::Ends))
            }
            Problem::Above(trials) => (format!("{}, expected at most the trials, {}", found(), other(trials)), None),
            Problem::Ragged(_) => (found(), None),
        }
    }

    fn unreadable(&self, slot: usize, cell: &[u8], found: &str) -> (String, Option<Advice>) {
        let known = &self.plan.slots[slot];
        let form = match known.kind {
            super::plan::Kind::Fixed(form) => form,
            super::plan::Kind::Open => Form::Number,
        };
        let trimmed = number::trim(cell);
        let (expected, advice) = match form {
            Form::Label if std::str::from_utf8(cell).is_err() => {
                ("a label (these bytes are not UTF-8)".to_owned(), Some(Advice::Encoding))
            }
            Form::Label => ("a label".to_owned(), Some(Advice::Mark)),
            Form::Lower if number::infinite(trimmed).is_some() => (Sort::LowerEnd.words(), None),
            Form::Upper if number::infinite(trimmed).is_some() => (Sort::UpperEnd.words(), None),
            _ => number::explain(trimmed, self.sheet.decimal),
        };
        let either = known.sorts.contains(&Sort::Either) || known.sorts.is_empty();
        let advice = match advice {
            None if either => Some(Advice::Labels(known.name.clone())),
            None => Some(Advice::Number),
            some => some,
        };
        (format!("{found}, expected {expected}"), advice)
    }

    /// The column of the file a cell stands in, or the name of the column made.
    fn column_name(&self, slot: usize, row: usize) -> String {
        match self.file_column(slot, row) {
            Some(i) => self.sheet.header.names.get(i).cloned().unwrap_or_default(),
            None => self.plan.slots[slot].name.clone(),
        }
    }

    fn file_column(&self, slot: usize, row: usize) -> Option<usize> {
        match self.plan.origin(slot)? {
            Origin::Column(i) => Some(i),
            Origin::Columns(all) => all.get(row % all.len().max(1)).copied(),
        }
    }

    /// The text of a cell, unless the column is made.
    fn cell(&self, slot: usize, row: usize) -> Option<Vec<u8>> {
        let column = self.file_column(slot, row)?;
        Some(number::trim(&self.sheet.cell(self.start(row), column)?).to_vec())
    }

    /// `log of -3, where area is "-3"`.
    fn undefined(&self, step: &Step, row: usize) -> String {
        let one: Vec<(&str, OneCell<'_>)> = step
            .inputs
            .iter()
            .filter_map(|(name, slot)| OneCell::of(&self.cells[*slot], row).map(|c| (name.as_str(), c)))
            .collect();
        let look = |name: &str| one.iter().find(|(n, _)| *n == name).map(|(_, c)| c.view());
        let step_in_words = step.formula.culprit(&look).unwrap_or_else(|| "it has no finite value".into());
        format!("{step_in_words}{}", self.inputs(step, row))
    }

    /// `, where area is "-3" and kiln is "north"`: the cells of the file a derived value comes from.
    fn inputs(&self, step: &Step, row: usize) -> String {
        let mut slots = BTreeSet::new();
        self.file_inputs(step, &mut slots);
        let texts: Vec<String> = slots
            .into_iter()
            .filter_map(|slot| {
                let cell = self.cell(slot, row)?;
                Some(format!("{} is {}", clip(&self.column_name(slot, row)), quote(&cell)))
            })
            .take(6)
            .collect();
        if texts.is_empty() { String::new() } else { format!(", where {}", texts.join(" and ")) }
    }

    fn file_inputs(&self, step: &Step, slots: &mut BTreeSet<usize>) {
        for (_, slot) in &step.inputs {
            match self.plan.slots[*slot].place {
                place @ Place::Derived(_) => {
                    // A derived column uses earlier ones only, so this ends.
                    if let Some(inner) = formula(&self.plan, place) {
                        self.file_inputs(inner, slots);
                    }
                }
                _ => {
                    slots.insert(*slot);
                }
            }
        }
    }
}

/// One row of a column, to evaluate parts of an expression in it.
enum OneCell<'a> {
    Number([f64; 1]),
    Label([u32; 1], &'a [String]),
}

impl<'a> OneCell<'a> {
    fn of(cells: &'a Cells, row: usize) -> Option<OneCell<'a>> {
        match cells {
            Cells::Number(values) => values.get(row).map(|x| OneCell::Number([*x])),
            Cells::Label { codes, labels } => codes.get(row).map(|c| OneCell::Label([*c], labels)),
        }
    }

    fn view(&self) -> ColumnView<'_> {
        match self {
            OneCell::Number(x) => ColumnView::Number(x),
            OneCell::Label(c, levels) => ColumnView::Category { codes: c, levels },
        }
    }
}
