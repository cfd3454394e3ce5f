//! The table a likelihood is prepared from: columns of equal length, each number or category.

use super::error::{DataError, clip};
use std::collections::{BTreeSet, HashMap};

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

impl Column {
    /// A column of numbers.
    pub fn numbers(name: impl Into<String>, values: Vec<f64>) -> Column {
        Column { name: name.into(), values: Values::Number(values) }
    }

    /// A column of labels; its levels are those found, by value if all are numbers, else bytewise.
    pub fn labels<L: AsRef<str>>(name: impl Into<String>, labels: &[L]) -> Column {
        let mut levels: Vec<String> =
            labels.iter().map(|l| l.as_ref().to_owned()).collect::<BTreeSet<_>>().into_iter().collect();
        super::category::sort(&mut levels, b'.');
        let place: HashMap<&str, u32> = levels.iter().map(String::as_str).zip(0..).collect();
        let codes = labels.iter().map(|l| place.get(l.as_ref()).copied().unwrap_or(0)).collect();
        Column { name: name.into(), values: Values::Category { codes, levels } }
    }

    /// How many rows it has.
    fn len(&self) -> usize {
        match &self.values {
            Values::Number(x) => x.len(),
            Values::Category { codes, .. } => codes.len(),
        }
    }
}

/// What became of the rows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Counts {
    /// Rows in the file, after unfolding.
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
    /// A table from columns at hand. Rows of weight 0 are counted and left out; [`Table::line`] gives the number of the
    /// row among those given, from 1.
    ///
    /// # Errors
    /// [`DataError::Request`] if there is no row, lengths differ, two columns have one name, a number is NaN, a code has
    /// no level, or the weights are not finite numbers >= 0, some above 0.
    pub fn from_columns(columns: Vec<Column>, weights: Option<Vec<f64>>) -> Result<Table, DataError> {
        let refuse = |message: String| Err(DataError::Request(message));
        let rows = columns.first().map(|c| c.len()).or(weights.as_ref().map(Vec::len)).unwrap_or(0);
        if rows == 0 || u32::try_from(rows).is_err() {
            return refuse(format!("a table has between 1 and 4294967295 rows, not {rows}"));
        }
        for (i, column) in columns.iter().enumerate() {
            let name = clip(&column.name);
            if column.len() != rows {
                return refuse(format!("column {name} has {} rows, the first {rows}", column.len()));
            }
            if columns[..i].iter().any(|c| c.name == column.name) {
                return refuse(format!("two columns are called {name}"));
            }
            let bad = match &column.values {
                Values::Number(x) => x.iter().position(|x| x.is_nan()),
                Values::Category { codes, levels } => codes.iter().position(|c| *c as usize >= levels.len()),
            };
            if let Some(row) = bad {
                return refuse(format!(
                    "column {name} has no value in row {}: a NaN, or a code without a level",
                    row + 1
                ));
            }
        }
        let mut table = Table { columns, rows, weights: None, lines: (1..=rows as u32).collect(), ..Table::default() };
        table.counts = Counts { read: rows, used: rows, ..Counts::default() };
        let Some(mut weights) = weights else { return Ok(table) };
        if weights.len() != rows {
            return refuse(format!("there are {} weights for {rows} rows", weights.len()));
        }
        if let Some(row) = weights.iter().position(|w| !w.is_finite() || *w < 0.0) {
            return refuse(format!(
                "the weight of row {} is {}, expected a finite number, 0 or more",
                row + 1,
                weights[row]
            ));
        }
        let kept: Vec<bool> = weights.iter().map(|w| *w > 0.0).collect();
        table.rows = kept.iter().filter(|k| **k).count();
        table.counts.weightless = rows - table.rows;
        if table.rows == 0 {
            return refuse("all weights are zero".into());
        }
        if table.rows < rows {
            for column in &mut table.columns {
                match &mut column.values {
                    Values::Number(x) => keep(x, &kept),
                    Values::Category { codes, .. } => keep(codes, &kept),
                }
            }
            keep(&mut weights, &kept);
            keep(&mut table.lines, &kept);
        }
        table.weights = weights.iter().any(|w| *w != 1.0).then_some(weights);
        Ok(table)
    }

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

fn keep<T: Copy>(values: &mut Vec<T>, kept: &[bool]) {
    let mut flags = kept.iter();
    values.retain(|_| flags.next().copied().unwrap_or(false));
}

#[cfg(test)]
mod tests {
    use super::{Column, Counts, Table, Values};

    #[test]
    fn columns_at_hand_make_a_table() {
        let columns = vec![Column::numbers("a", vec![1.0, 2.0, 3.0]), Column::labels("kiln", &["b", "a", "b"])];
        let t = Table::from_columns(columns.clone(), Some(vec![1.0, 0.0, 2.5])).unwrap();
        assert_eq!(t.columns[0].values, Values::Number(vec![1.0, 3.0]));
        assert_eq!(t.columns[1].values, Values::Category { codes: vec![1, 1], levels: vec!["a".into(), "b".into()] });
        assert_eq!((t.rows, t.weights.clone(), t.line(1), t.weight_total()), (2, Some(vec![1.0, 2.5]), 3, 3.5));
        assert_eq!(t.counts, Counts { read: 3, used: 3, weightless: 1, ..Counts::default() });
        assert_eq!(Table::from_columns(columns, Some(vec![1.0; 3])).unwrap().weights, None);
    }

    #[test]
    fn what_makes_no_table() {
        let a = || Column::numbers("a", vec![1.0, 2.0]);
        let bad = |name: &str, values: Vec<f64>| Column::numbers(name, values);
        let code =
            Column { name: "k".into(), values: Values::Category { codes: vec![0, 1], levels: vec!["x".into()] } };
        for (columns, weights, part) in [
            (vec![], None, "not 0"),
            (vec![a(), bad("b", vec![1.0])], None, "column b has 1 rows"),
            (vec![a(), a()], None, "two columns are called a"),
            (vec![bad("b", vec![1.0, f64::NAN])], None, "row 2"),
            (vec![code], None, "row 2"),
            (vec![a()], Some(vec![1.0]), "1 weights for 2 rows"),
            (vec![a()], Some(vec![1.0, -1.0]), "the weight of row 2 is -1"),
            (vec![a()], Some(vec![1.0, f64::INFINITY]), "the weight of row 2 is inf"),
            (vec![a()], Some(vec![0.0, 0.0]), "all weights are zero"),
        ] {
            let error = Table::from_columns(columns, weights).unwrap_err().to_string();
            assert!(error.contains(part), "{part}: {error}");
        }
    }
}
