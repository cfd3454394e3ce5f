//! What a part gives row by row: outputs of a program, weights, design factors; and programs over points that are no rows.

use super::formula::{Formula, Pass};
use super::gram;
use super::part::{Part, Predictor};
use crate::expr::{BLOCK, Registers};

impl Part {
    /// The weight of a row.
    pub(super) fn weight(&self, row: usize) -> f64 {
        self.store.weights.as_ref().map_or(1.0, |w| w[row / BLOCK].0[row % BLOCK])
    }

    /// The free parameters that a variable of the formula stands for in a row, with their factors there.
    pub(super) fn reach(&self, variable: usize, row: usize) -> Vec<(usize, f64)> {
        match variable.checked_sub(self.map.len()) {
            None => vec![(self.map[variable], 1.0)],
            Some(k) => {
                let p = &self.predictors[k];
                p.at.iter().zip(&p.columns).map(|(&i, c)| (i, c[row / BLOCK].0[row % BLOCK])).collect()
            }
        }
    }

    /// What a formula gives row by row over points that are no rows of the data; `raw(column)` gives the values of a raw column.
    pub(super) fn evaluate(
        formula: &Formula,
        points: usize,
        raw: &dyn Fn(u32) -> Vec<f64>,
        map: Vec<usize>,
        predictors: Vec<Predictor>,
        theta: &[f64],
    ) -> Vec<Vec<f64>> {
        Part::bind(formula, 0, points, raw, None, map, predictors).all_rows(&formula.rows, theta)
    }

    /// log f of each row, in the order of the part.
    pub(super) fn rows(&self, pass: &Pass, theta: &[f64]) -> Vec<f64> {
        self.all_rows(pass, theta).swap_remove(0)
    }

    /// Every row output of a pass, each in the order of the part.
    pub(super) fn all_rows(&self, pass: &Pass, theta: &[f64]) -> Vec<Vec<f64>> {
        let program = &pass.program;
        let local: Vec<f64> = self.map.iter().map(|&i| theta[i]).collect();
        let scalars = program.scalars(&local);
        let mut registers = Registers::new(program);
        let mut none = vec![0.0; program.gathers()];
        let mut out = vec![Vec::with_capacity(self.store.rows); program.row_outputs()];
        for block in 0..self.store.blocks() {
            let n = self.store.rows_in(block);
            for (k, predictor) in self.predictors.iter().enumerate() {
                let coefficients: Vec<f64> = predictor.at.iter().map(|&i| theta[i]).collect();
                let eta = &mut registers.predictor(k)[..n];
                gram::predict(eta, &predictor.columns, predictor.offset.as_deref(), block, &coefficients);
            }
            program.block(&mut registers, &self.store, block, &scalars, &mut none);
            for (k, out) in out.iter_mut().enumerate() {
                let scale = program.row_scale(k, &scalars);
                out.extend(program.row(k, &registers, &self.store, block).iter().map(|x| scale * x));
            }
        }
        out
    }
}
