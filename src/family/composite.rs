//! Families whose row parameters are made from the data: one a label, an item, a column, or a pair of columns.
//!
//! A room gives, for the labels or columns found, the names of the row parameters and the formulas as texts; the texts are what
//! is computed. Columns of the formulas: `seen.LABEL` (1 in rows with that label, else 0), `sign.ITEM` (1 for the one that won,
//! -1 for the one that lost), `y.COLUMN`.

use super::{Link, Moments};
use crate::expr::Name;
use crate::math::{Random, Range};

/// What the response consists of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Reads {
    /// One column of labels, or several: every combination of levels is a cell.
    Labels,
    /// One column of labels, in the order of its levels.
    OrderedLabels,
    /// Two columns of labels over the same items: which won, which lost.
    Contest,
    /// Several columns of numbers.
    Numbers,
    /// Several columns of numbers above 0 that sum to one in each row.
    Shares,
}

/// Row parameters of one kind.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Group {
    /// First piece of their names.
    pub name: &'static str,
    /// What follows it, for the listing: `LABEL`, `COLUMN.COLUMN`, or nothing.
    pub pattern: &'static str,
    /// Natural range.
    pub range: Range,
    /// Links with terms, the default first; empty: no terms.
    pub links: &'static [Link],
    /// Whether terms have an intercept (where another parameter takes its place they have none).
    pub intercept: bool,
    /// Value without terms, where the parameter is there only for its terms.
    pub known: Option<f64>,
    /// In words.
    pub meaning: &'static str,
}

/// What was found in the data.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Layout {
    /// Labels (or cells, several pieces each), items, or columns.
    pub pieces: Vec<Name>,
    /// Whether the first group has terms.
    pub terms: bool,
}

/// One row parameter.
#[derive(Debug, Clone, PartialEq)]
pub struct Piece {
    /// Index of its group.
    pub group: usize,
    /// What follows the group's name; may be empty.
    pub key: Name,
    /// In words.
    pub meaning: String,
}

/// The formulas for one layout.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Made {
    /// Row parameters, in order.
    pub parameters: Vec<Piece>,
    /// Named expressions, in order; a later one may use an earlier one.
    pub lets: Vec<(String, String)>,
    /// log f of a row.
    pub log_density: String,
    /// Expected information of a row between row parameters or named expressions: symmetric, zero where not listed.
    pub information: Vec<(String, String, String)>,
    /// Restrictions that the family maintains, over parameter names.
    pub equations: Vec<String>,
}

/// Summaries of the response, for starting values.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Summary {
    /// Weight of each label or cell; for contests the weight of wins less losses of each item.
    pub counts: Vec<f64>,
    /// Moments of each column.
    pub columns: Vec<Moments>,
    /// Correlation of each pair of columns, first with second, first with third, ...
    pub correlations: Vec<f64>,
}

/// One row of a sampled response.
#[derive(Debug, Clone, PartialEq)]
pub enum Drawn {
    /// Index of the label or cell.
    Label(usize),
    /// One value a column.
    Values(Vec<f64>),
    /// Whether the first of the two items won.
    Won(bool),
}

/// A family of this kind.
#[derive(Debug, Clone, Copy)]
pub struct Composite {
    /// Name in a study.
    pub name: &'static str,
    /// The response in words.
    pub response: &'static str,
    /// How it is read.
    pub reads: Reads,
    /// Kinds of row parameters.
    pub groups: &'static [Group],
    /// Restrictions that it maintains, in words for the listing.
    pub maintained: &'static str,
    /// The formula for the listing, over the patterns of the groups.
    pub formula: &'static str,
    /// Expected information in words.
    pub information: &'static str,
    /// Where it is published.
    pub source: &'static str,
    /// The formulas for a layout.
    pub make: fn(&Layout) -> Made,
    /// Starting values, one a row parameter (on the scale of the predictor for one with terms).
    pub start: fn(&Layout, &Summary) -> Vec<f64>,
    /// Draws a row from the values of its row parameters (those of the predictor for ones with terms).
    pub sample: fn(&Layout, &[f64], &mut Random) -> Drawn,
    /// Whether l is concave in the row parameters.
    pub concave: bool,
}

/// The table of families of this kind.
pub const COMPOSITES: &[&Composite] = &[
    &super::categorical::CATEGORICAL,
    &super::dirichlet::DIRICHLET,
    &super::multivariate_normal::MULTIVARIATE_NORMAL,
    &super::ordered::LOGIT,
    &super::ordered::PROBIT,
    &super::paired_comparison::PAIRED_COMPARISON,
];

impl Composite {
    /// The family of this name.
    pub fn named(name: &str) -> Option<&'static Composite> {
        COMPOSITES.iter().copied().find(|f| f.name == name)
    }

    /// The full name of a row parameter.
    pub fn name_of(&self, piece: &Piece) -> Name {
        Name::single(self.groups[piece.group].name).then(&piece.key)
    }
}

/// `group.key` as formulas write it.
pub(super) fn written(group: &str, key: &Name) -> String {
    Name::single(group).then(key).to_string()
}

/// Terms joined by plus signs; `0` where there are none.
pub(super) fn plus(terms: impl IntoIterator<Item = String>) -> String {
    let all: Vec<String> = terms.into_iter().collect();
    if all.is_empty() { "0".into() } else { all.join(" + ") }
}

/// The index at which the running sum of chances passes a uniform number.
pub fn pick(chances: &[f64], random: &mut Random) -> usize {
    let mut u = random.uniform() * chances.iter().sum::<f64>();
    for (i, &p) in chances.iter().enumerate() {
        u -= p;
        if u <= 0.0 && p > 0.0 {
            return i;
        }
    }
    chances.iter().rposition(|&p| p > 0.0).unwrap_or(0)
}
