//! What is asked of the reader.

/// What the columns must hold, which rows are kept, and how cells are written.
#[derive(Debug, Clone, PartialEq)]
pub struct Request {
    /// The sign between cells: one ASCII character.
    pub delimiter: char,
    /// The decimal sign: `.` or `,`.
    pub decimal: char,
    /// Cells that hold one of these (spaces round them trimmed) are missing.
    pub missing: Vec<String>,
    /// What happens to a row with a missing cell in a column in use.
    pub on_missing: OnMissing,
    /// Keep the rows where this condition holds.
    pub only: Option<String>,
    /// Columns made from columns: name and expression, in order; a later one may use an earlier one.
    pub derive: Vec<(String, String)>,
    /// Columns read as categories: name and levels in order (the first is the reference); no levels: those found, sorted.
    pub categories: Vec<(String, Vec<String>)>,
    /// Several count columns become rows with a label and a weight.
    pub unfold: Option<Unfold>,
    /// Column of frequency weights. Where absent, an unfolded value that the model does not use is the weight.
    pub weight: Option<String>,
    /// Columns the model uses. One may stand here several times: every demand must be met.
    pub wanted: Vec<Wanted>,
    /// What must hold between columns, row by row.
    pub pairs: Vec<Pair>,
}

impl Default for Request {
    fn default() -> Self {
        Request {
            delimiter: ',',
            decimal: '.',
            missing: vec![String::new()],
            on_missing: OnMissing::Stop,
            only: None,
            derive: Vec::new(),
            categories: Vec::new(),
            unfold: None,
            weight: None,
            wanted: Vec::new(),
            pairs: Vec::new(),
        }
    }
}

/// What happens to a row with a missing cell in a column in use.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum OnMissing {
    /// It is a fault.
    #[default]
    Stop,
    /// The row is left out and counted.
    Drop,
}

/// One count column a source becomes rows: a file row gives a row for each column, with the column's name as label.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Unfold {
    /// The count columns; their names are the levels of the label, in this order.
    pub columns: Vec<String>,
    /// Name of the label column that is made.
    pub label: String,
    /// Name of the column of counts that is made.
    pub value: String,
}

/// A column the model uses.
#[derive(Debug, Clone, PartialEq)]
pub struct Wanted {
    /// Header name, or a derived or unfolded column's.
    pub name: String,
    /// What it must hold.
    pub sort: Sort,
}

impl Wanted {
    /// This column, holding that.
    pub fn new(name: impl Into<String>, sort: Sort) -> Wanted {
        Wanted { name: name.into(), sort }
    }
}

/// What a column must hold. For the ends of intervals ([`Sort::LowerEnd`], [`Sort::UpperEnd`]) a second demand on the same
/// column speaks of the finite values only (except [`Sort::Number`], which leaves no end open).
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Sort {
    /// Finite numbers.
    Number,
    /// Numbers > 0.
    Positive,
    /// Numbers >= 0.
    Nonnegative,
    /// Whole numbers >= 0.
    Count,
    /// 0 or 1.
    ZeroOne,
    /// Whole numbers from 0 to this one.
    CountUpTo(f64),
    /// Labels, whatever they look like.
    Category,
    /// Numbers if every cell in use is one, labels if most are not; mostly numbers with some texts is a fault.
    Either,
    /// Lower ends: numbers, or an empty cell, a missing mark or `-inf` for an open end (minus infinity in the table).
    LowerEnd,
    /// Upper ends: the same with `inf` (infinity in the table).
    UpperEnd,
}

impl Sort {
    /// Whether a value meets this demand.
    pub(super) fn allows(&self, x: f64) -> bool {
        match self {
            Sort::Number => x.is_finite(),
            Sort::Positive => x > 0.0,
            Sort::Nonnegative => x >= 0.0,
            Sort::Count => x >= 0.0 && x.fract() == 0.0,
            Sort::ZeroOne => x == 0.0 || x == 1.0,
            Sort::CountUpTo(most) => (0.0..=*most).contains(&x) && x.fract() == 0.0,
            Sort::Category | Sort::Either | Sort::LowerEnd | Sort::UpperEnd => true,
        }
    }

    /// What it asks for, in words.
    pub(super) fn words(&self) -> String {
        match self {
            Sort::Number => "a finite number".into(),
            Sort::Positive => "a number above 0".into(),
            Sort::Nonnegative => "a number, 0 or more".into(),
            Sort::Count => "a whole number, 0 or more".into(),
            Sort::ZeroOne => "0 or 1".into(),
            Sort::CountUpTo(most) => format!("a whole number from 0 to {most}"),
            Sort::Category | Sort::Either => "a label".into(),
            Sort::LowerEnd => "a number, or an open end (empty or -inf)".into(),
            Sort::UpperEnd => "a number, or an open end (empty or inf)".into(),
        }
    }
}

/// What must hold between two columns in every row used.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Pair {
    /// Ends of an interval: not both open, lower <= upper.
    Ends {
        /// Column of lower ends.
        lower: String,
        /// Column of upper ends.
        upper: String,
    },
    /// A count out of a number of trials: count <= trials.
    AtMost {
        /// Column of counts.
        count: String,
        /// Column of trials.
        trials: String,
    },
}
