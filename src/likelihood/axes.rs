//! Which values the response can take: over these, sums and integrals of an expectation run.

use super::LikelihoodError;
use super::compose::Template;
use super::expectation::{Expectation, Inputs, Row};
use super::model::Values;
use super::rows::{FROM, UPTO, Y, table_key};
use super::statement::Body;
use crate::family::Support;

/// One variable of the response: its raw column, and the values that it takes.
#[derive(Debug, Clone)]
pub(super) struct Axis {
    pub(super) column: u32,
    pub(super) values: Taken,
}

#[derive(Debug, Clone)]
pub(super) enum Taken {
    Stated(Values),
    Of(Vec<Support>),
}

impl Template<'_> {
    /// The variables of the response; `None` where nothing says what they can be.
    ///
    /// # Errors
    /// A stated support of what is no column.
    pub(super) fn axes(&self) -> Result<Option<Vec<Axis>>, LikelihoodError> {
        match &self.statement.body {
            Body::Density(_) | Body::Mixture(_) => {
                let supports = self.statement.supports();
                // a lump of mass among densities has no place in an integral
                let lump = supports.iter().any(|s| s.is_lump());
                if lump && !self.statement.counts() {
                    return Ok(None);
                }
                // a known threshold of a component bounds nothing for the others
                let mixed = supports.len() > 1 && supports.iter().any(|s| matches!(s, Support::From(_)));
                let column = self.rows.column(Y).map(|c| c.0);
                Ok(column.filter(|_| !mixed).map(|column| vec![Axis { column, values: Taken::Of(supports) }]))
            }
            Body::Custom(_) if !self.model.support.is_empty() => {
                let mut axes = Vec::new();
                for (name, values) in &self.model.support {
                    let Some((column, _)) = self.rows.column(&table_key(name)) else {
                        return Err(LikelihoodError::statement(
                            "model.support",
                            format!("{name} is no column that log_density names"),
                            "the support says which values a response in log_density can take",
                        ));
                    };
                    axes.push(Axis { column, values: Taken::Stated(values.clone()) });
                }
                Ok(Some(axes))
            }
            _ => Ok(None),
        }
    }
}

impl Expectation {
    /// The values that an axis takes in a row.
    pub(super) fn taken(&self, axis: &Axis, row: &Row, inputs: &Inputs) -> Values {
        let amount = |key: &str, otherwise: f64| match (self.bounds.get(key), self.numbers.get(key)) {
            (Some(&c), _) => self.input(row, inputs, c),
            (None, Some(&n)) => n,
            (None, None) => otherwise,
        };
        let supports = match &axis.values {
            Taken::Stated(values) => return values.clone(),
            Taken::Of(supports) => supports,
        };
        let (from, upto) = (amount(FROM, f64::NEG_INFINITY), amount(UPTO, f64::INFINITY));
        let one = |s: &Support| -> (f64, f64) {
            match s {
                Support::Real => (f64::NEG_INFINITY, f64::INFINITY),
                Support::Angle => (-std::f64::consts::PI, std::f64::consts::PI),
                Support::Nonnegative | Support::Positive => (0.0, f64::INFINITY),
                Support::Unit | Support::Lump(_) => (0.0, 1.0),
                Support::From(_) => (self.threshold.map_or(0.0, |q| row[q]), f64::INFINITY),
                Support::Count => (0.0, f64::INFINITY),
                Support::CountFromOne => (1.0, f64::INFINITY),
                Support::CountOfTrials => (0.0, amount("trials", 1.0)),
                Support::Draws => {
                    let (n, s, f) = (amount("trials", 1.0), amount("successes", 0.0), amount("failures", 0.0));
                    ((n - f).max(0.0), n.min(s))
                }
            }
        };
        let counts = supports.iter().any(|s| s.is_count());
        let ends = supports.iter().filter(|s| !s.is_lump() && (!counts || s.is_count())).map(one);
        let (low, high) = ends.reduce(|a, b| (a.0.min(b.0), a.1.max(b.1))).unwrap_or((0.0, 0.0));
        if counts {
            Values::Whole(low.max(from + 1.0), high.min(upto))
        } else {
            Values::Interval(low.max(from), high.min(upto))
        }
    }
}
