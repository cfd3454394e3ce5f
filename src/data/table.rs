//! The table a likelihood is prepared from: columns of equal length, each number or category.

/// The values of one column.
#[derive(Debug, Clone, PartialEq)]
pub enum Values {
    /// Doubles; an open end of a binned response is infinite.
    Number(Vec<f64>),
    /// Labels as codes into `levels`.
    Category {
        /// One code a row.
        codes: Vec<u32>,
        /// The labels, in the order that counts (the first is the reference).
        levels: Vec<String>,
    },
}

/// A named column.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// Header name as in the file, or the name given under `[data.derive]`.
    pub name: String,
    /// Its values, one a row used.
    pub values: Values,
}

/// What became of the rows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Counts {
    /// Rows in the file.
    pub read: usize,
    /// Rows kept (rows of weight 0 count as kept but are not stored).
    pub used: usize,
    /// Dropped because a cell in use was missing.
    pub dropped_missing: usize,
    /// Dropped by `only`.
    pub dropped_only: usize,
    /// Kept with weight zero.
    pub weightless: usize,
}

/// Rows kept, column by column.
#[derive(Debug, Clone, Default)]
pub struct Table {
    /// The file's name as the user wrote it (`-` for standard input, empty for no data).
    pub file: String,
    /// SHA-256 of the bytes read, in hexadecimal.
    pub sha256: String,
    /// Columns in use.
    pub columns: Vec<Column>,
    /// How many rows are stored.
    pub rows: usize,
    /// Frequency weights, one a stored row, all > 0; `None` when every weight is 1.
    pub weights: Option<Vec<f64>>,
    /// What became of the rows.
    pub counts: Counts,
    /// Line of the file each stored row starts on; empty when row i stands on line i + 2.
    pub lines: Vec<u32>,
}

impl Table {
    /// The column of this name.
    pub fn column(&self, name: &str) -> Option<&Column> {
        self.columns.iter().find(|c| c.name == name)
    }

    /// The line of the file on which stored row `row` starts.
    pub fn line(&self, row: usize) -> usize {
        self.lines.get(row).map_or(row + 2, |&l| l as usize)
    }

    /// Sum of the weights.
    pub fn weight_total(&self) -> f64 {
        self.weights.as_ref().map_or(self.rows as f64, |w| w.iter().sum())
    }
}
