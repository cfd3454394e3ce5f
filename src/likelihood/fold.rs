//! What a formula with kinks brings for the search of a maximum that sits on one: each `abs(u)` by itself, and the formula with
//! `abs(u)` rounded off or replaced by one of its two sides.

use std::collections::HashMap;

use super::formula::{Formula, Ingredients};
use crate::expr::{Graph, Id, Sign, Variable};

/// The folds of a formula.
#[derive(Debug, Clone)]
pub(super) struct Folds {
    /// The formula with `round * sqrt(u^2 + width^2) + side * u` for each `abs(u)`: three raw columns for each fold.
    pub(super) formula: Formula,
    /// First of those raw columns.
    pub(super) first: u32,
    /// How many folds.
    pub(super) count: usize,
    /// (fold, variable) of each first derivative of a u that is not zero.
    pub(super) firsts: Vec<(usize, usize)>,
    /// (fold, variable, variable not before it) of each second one.
    pub(super) seconds: Vec<(usize, usize, usize)>,
}

/// Which of the three columns of a fold.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Column {
    Round,
    Side,
    Width,
}

/// What one formula has, and the row outputs that its parts compute of it.
pub(super) struct Found {
    pub(super) folds: Option<Box<Folds>>,
    /// u of each fold with the slope of log f in abs(u).
    pub(super) heights: Vec<Id>,
    /// u of each fold, then the first and second derivatives listed.
    pub(super) slopes: Vec<Id>,
}

impl Folds {
    /// The folds of log f; `columns` raw columns are in use.
    pub(super) fn of(
        graph: &mut Graph,
        log_density: Id,
        variables: &[Variable],
        columns: u32,
        weighted: bool,
    ) -> Found {
        let mut found = Found { folds: None, heights: Vec::new(), slopes: Vec::new() };
        let zero = graph.constant(0.0);
        let mut all = Vec::new();
        for (node, u) in graph.folds(log_density) {
            let slope = graph.derivative(log_density, Variable::Node(node));
            // in a condition it makes no kink
            if slope != zero {
                all.push((node, u));
                found.heights.extend([u, slope]);
                found.slopes.push(u);
            }
        }
        if all.is_empty() {
            return found;
        }
        let (mut firsts, mut seconds, mut last) = (Vec::new(), Vec::new(), Vec::new());
        for (k, &(_, u)) in all.iter().enumerate() {
            for (v, &by) in variables.iter().enumerate() {
                let first = graph.derivative(u, by);
                if first == zero {
                    continue;
                }
                firsts.push((k, v));
                found.slopes.push(first);
                for (w, &by) in variables.iter().enumerate().take(v + 1) {
                    let second = graph.derivative(first, by);
                    if second != zero {
                        seconds.push((k, w, v));
                        last.push(second);
                    }
                }
            }
        }
        found.slopes.extend(last);
        let mut own = graph.clone();
        let mut by: HashMap<Id, Id> = HashMap::new();
        for (k, &(node, u)) in all.iter().enumerate() {
            let at = columns + 3 * k as u32;
            own.set_column_sign(at + Column::Width as u32, Sign::Positive);
            let u = own.replaced(u, &mut by);
            let [round, side, width] = [Column::Round, Column::Side, Column::Width].map(|c| own.column(at + c as u32));
            let squares = [own.product(&[(u, 2.0)]), own.product(&[(width, 2.0)])];
            let square = own.add(squares[0], squares[1]);
            let rounded = own.product(&[(round, 1.0), (square, 0.5)]);
            let straight = own.multiply(side, u);
            let new = own.add(rounded, straight);
            by.insert(node, new);
        }
        let log_density = own.replaced(log_density, &mut by);
        let formula = Formula::compile(Ingredients {
            graph: own,
            log_density,
            variables: variables.to_vec(),
            expected: None,
            expectation: None,
            weighted,
            heights: Vec::new(),
            slopes: Vec::new(),
        });
        found.folds = Some(Box::new(Folds { formula, first: columns, count: all.len(), firsts, seconds }));
        found
    }

    /// Which fold and which of its columns a raw column is, if it is none of the data's.
    pub(super) fn column(&self, raw: u32) -> Option<(usize, Column)> {
        let at = raw.checked_sub(self.first)? as usize;
        Some((at / 3, [Column::Round, Column::Side, Column::Width][at % 3]))
    }
}
