//! Expected information where no formula gives it: the outer products of the scores of one row, summed or integrated over
//! all responses that the row could have had. Also the total mass of a density, which should be one.

use std::collections::HashMap;

use rayon::prelude::{IntoParallelIterator, ParallelIterator};

use super::LikelihoodError;
use super::axes::Axis;
use super::compose::Template;
use super::formula::{Formula, Pass};
use super::model::{Amount, Values};
use super::part::Part;
use super::rows::{FROM, RowKind, UPTO};
use super::statement::Body;
use crate::expr::{Graph, Id, Layout, Output, Variable, compile};
use crate::family::Support;
use crate::math::Matrix;
use crate::math::quadrature::integrate;

/// Relative error that integrals keep; a row whose integrals do not has no expected information.
const TOLERANCE: f64 = 1e-9;
/// A sum stops when a stretch of it adds less than this part of the whole.
const NEGLIGIBLE: f64 = 1e-18;
/// Terms of a sum in one stretch, at first.
const STRETCH: usize = 128;
/// Most terms of a sum.
const MOST_TERMS: usize = 20_000_000;
/// Quantiles of the response that part the range of an integral.
const BREAKS: [f64; 7] = [0.001, 0.05, 0.25, 0.5, 0.75, 0.95, 0.999];

/// What the expectation over one kind of row is computed from.
#[derive(Debug, Clone)]
pub(super) struct Expectation {
    /// Row outputs: the quantities that the density is made of, then their slopes.
    nodes: Pass,
    /// Those quantities in the graph of the formula.
    main: Vec<Id>,
    /// How many quantities.
    quantities: usize,
    /// (quantity, variable) of each slope that is not zero.
    slopes: Vec<(usize, usize)>,
    /// log f and its slopes in the quantities.
    density: Formula,
    axes: Vec<Axis>,
    /// Raw columns that bound the response, by what they are.
    pub(super) bounds: HashMap<&'static str, u32>,
    /// The same where they are numbers.
    pub(super) numbers: HashMap<&'static str, f64>,
    /// Index among the quantities of a known threshold.
    pub(super) threshold: Option<usize>,
}

/// The rows of a part as expectations see them.
#[derive(Debug, Clone, Default)]
pub(super) struct Inputs {
    /// Raw columns with their values, those of the response left out.
    columns: Vec<(u32, Vec<f64>)>,
    /// Places that part the range, by axis.
    breaks: Vec<Vec<f64>>,
}

impl Template<'_> {
    /// The expectation of rows whose response is seen exactly, if the model says which values it can take.
    ///
    /// # Errors
    /// As for the density itself; a support that names no column.
    pub(super) fn expectation(
        &self,
        graph: &Graph,
        known: &[Option<f64>],
        locals: &[Id],
        rows: &[Id],
    ) -> Result<Option<Expectation>, LikelihoodError> {
        let Some(axes) = self.axes()? else { return Ok(None) };
        // The quantities: row parameters of a family, shares too of a mixture, parameters of a custom density.
        let of_rows = matches!(self.statement.body, Body::Density(_));
        let mut nodes: Vec<Id> = if of_rows { Vec::new() } else { locals.to_vec() };
        let first_row = nodes.len();
        nodes.extend(rows);
        // the same density in a graph of its own, where the quantities are its parameters
        let mut own = Graph::new();
        let is_axis = |i: usize| axes.iter().any(|a| a.column as usize == i);
        for (i, (_, values)) in self.rows.columns.iter().enumerate().filter(|(i, _)| !is_axis(*i)) {
            own.describe_column(i as u32, values);
        }
        let mut own_nodes = Vec::new();
        for (q, &node) in nodes.iter().enumerate() {
            own.set_parameter_sign(q as u32, graph.sign(node));
            own_nodes.push(own.parameter(q as u32));
        }
        let own_locals: Vec<Id> = match of_rows {
            // locals are seen through the row parameters only
            true => known.iter().map(|k| own.constant(k.unwrap_or(f64::NAN))).collect(),
            false => own_nodes[..first_row].to_vec(),
        };
        let scope = self.names(&mut own, &own_locals)?;
        let log = self.density(&mut own, RowKind::Exact, &scope, &own_locals, &own_nodes[first_row..])?;
        let mut wanted = vec![log];
        wanted.extend((0..nodes.len()).map(|q| own.derivative(log, Variable::Parameter(q as u32))));
        let density = Formula::of_rows(&mut own, &wanted, 0);
        let mut bounds = HashMap::new();
        for key in ["trials", "successes", "failures", FROM, UPTO] {
            if let Some((i, _)) = self.rows.column(key) {
                bounds.insert(key, i);
            }
        }
        let mut numbers = HashMap::new();
        for (key, amount) in
            [("trials", &self.model.trials), ("successes", &self.model.successes), ("failures", &self.model.failures)]
        {
            if let Some(Amount::Number(n)) = amount {
                numbers.insert(key, *n);
            }
        }
        let threshold = match &self.statement.body {
            Body::Density(f) => match f.support {
                Support::From(name) => f.parameters.iter().position(|p| p.name == name),
                _ => None,
            },
            _ => None,
        };
        Ok(Some(Expectation {
            quantities: nodes.len(),
            main: nodes,
            nodes: Pass::default(),
            slopes: Vec::new(),
            density,
            axes,
            bounds,
            numbers,
            threshold,
        }))
    }

    /// What the expectation needs of some rows.
    pub(super) fn inputs(&self, expectation: &Expectation, members: &[usize]) -> Inputs {
        let axis = |c: u32| expectation.axes.iter().any(|a| a.column == c);
        let all = expectation.density.raw.iter().chain(expectation.bounds.values());
        let mut wanted: Vec<u32> = all.copied().filter(|&c| !axis(c)).collect();
        wanted.sort_unstable();
        wanted.dedup();
        let columns = wanted.into_iter().map(|c| (c, self.raw(c, members))).collect();
        let breaks = expectation
            .axes
            .iter()
            .map(|a| {
                let mut y: Vec<f64> = self.raw(a.column, members).into_iter().filter(|v| v.is_finite()).collect();
                y.sort_by(f64::total_cmp);
                if y.is_empty() {
                    return Vec::new();
                }
                BREAKS.iter().map(|p| y[(p * (y.len() - 1) as f64).round() as usize]).collect()
            })
            .collect();
        Inputs { columns, breaks }
    }
}

/// What is known of one row: the quantities, then the input columns.
pub(super) type Row = Vec<f64>;

impl Expectation {
    /// Compiles values and slopes of the quantities in the graph of the formula that this belongs to.
    pub(super) fn compile(&mut self, graph: &mut Graph, layout: &mut Layout, variables: &[Variable], weighted: bool) {
        let mut outputs: Vec<Output> = self.main.iter().map(|&n| Output::Row(n)).collect();
        let zero = graph.constant(0.0);
        for (q, &node) in self.main.iter().enumerate() {
            for (v, &by) in variables.iter().enumerate() {
                let d = graph.derivative(node, by);
                if d != zero {
                    self.slopes.push((q, v));
                    outputs.push(Output::Row(d));
                }
            }
        }
        let predictors = variables.iter().filter(|v| matches!(v, Variable::Predictor(_))).count();
        self.nodes = Pass { program: compile(graph, layout, &outputs, predictors, weighted), ..Pass::default() };
    }

    /// Mass of each distinct row, at most `most` of them: how far from one the farthest is.
    pub(super) fn mass(&self, part: &Part, inputs: &Inputs, theta: &[f64], most: usize) -> f64 {
        let (rows, _, _) = self.distinct(part, inputs, theta);
        let picked: Vec<&Row> = rows.iter().step_by(rows.len().div_ceil(most).max(1)).collect();
        picked
            .into_par_iter()
            .map(|r| {
                let found = self.moments(r, inputs, false);
                found.map_or(f64::NAN, |m| (m[0] - 1.0).abs())
            })
            .collect::<Vec<f64>>()
            .into_iter()
            .fold(0.0, |m, x| if x > m || x.is_nan() { x } else { m })
    }

    /// Adds sum of w E[s s'] over the rows of a part; `false` where an integral cannot be trusted.
    pub(super) fn add(&self, part: &Part, inputs: &Inputs, theta: &[f64], matrix: &mut Matrix) -> bool {
        let (rows, which, outputs) = self.distinct(part, inputs, theta);
        let found: Vec<Option<Vec<f64>>> =
            (0..rows.len()).into_par_iter().map(|i| self.moments(&rows[i], inputs, true)).collect();
        let q = self.quantities;
        let variables = part.map.len() + part.predictors.len();
        for (i, &at) in which.iter().enumerate() {
            let Some(moments) = &found[at] else { return false };
            // slopes of the quantities in this row, by variable
            let mut slope = vec![vec![0.0; q]; variables];
            for (k, &(a, v)) in self.slopes.iter().enumerate() {
                slope[v][a] = outputs[q + k][i];
            }
            let entry = |u: usize, v: usize| {
                let mut s = 0.0;
                for a in (0..q).filter(|&a| slope[u][a] != 0.0) {
                    for b in (0..q).filter(|&b| slope[v][b] != 0.0) {
                        s += slope[u][a] * slope[v][b] * moments[1 + a * q + b];
                    }
                }
                s
            };
            let w = part.weight(i);
            let design: Vec<Vec<(usize, f64)>> = (0..variables).map(|v| part.reach(v, i)).collect();
            for u in 0..variables {
                for v in 0..variables {
                    let h = w * entry(u, v);
                    if h == 0.0 {
                        continue;
                    }
                    for &(j, x) in &design[u] {
                        for &(k, z) in &design[v] {
                            matrix[(j, k)] += h * x * z;
                        }
                    }
                }
            }
        }
        true
    }

    /// The different rows of a part, which of them each row is, and all row outputs.
    #[allow(clippy::type_complexity, reason = "three lists for the one caller beside")]
    fn distinct(&self, part: &Part, inputs: &Inputs, theta: &[f64]) -> (Vec<Row>, Vec<usize>, Vec<Vec<f64>>) {
        let outputs = part.all_rows(&self.nodes, theta);
        let mut at: HashMap<Vec<u64>, usize> = HashMap::new();
        let (mut rows, mut which) = (Vec::new(), Vec::with_capacity(part.rows_count()));
        for i in 0..part.rows_count() {
            let mut row: Row = outputs[..self.quantities].iter().map(|o| o[i]).collect();
            row.extend(inputs.columns.iter().map(|c| c.1[i]));
            let bits = row.iter().map(|x| x.to_bits()).collect();
            which.push(*at.entry(bits).or_insert_with(|| {
                rows.push(row);
                rows.len() - 1
            }));
        }
        (rows, which, outputs)
    }

    pub(super) fn input(&self, row: &Row, inputs: &Inputs, column: u32) -> f64 {
        inputs.columns.iter().position(|c| c.0 == column).map_or(f64::NAN, |k| row[self.quantities + k])
    }

    /// Mass, then E[s s'] if asked for, of a row; `None` where an integral does not reach its error.
    fn moments(&self, row: &Row, inputs: &Inputs, scores: bool) -> Option<Vec<f64>> {
        let values: Vec<Values> = self.axes.iter().map(|a| self.taken(a, row, inputs)).collect();
        let count = if scores { 1 + self.quantities * self.quantities } else { 1 };
        let mut at = vec![0.0; self.axes.len()];
        self.over(row, inputs, &values, 0, &mut at, count)
    }

    /// The sum or integral over axis `k` and those after it, the ones before it being at their places.
    fn over(
        &self,
        row: &Row,
        inputs: &Inputs,
        values: &[Values],
        k: usize,
        at: &mut Vec<f64>,
        count: usize,
    ) -> Option<Vec<f64>> {
        let last = k + 1 == values.len();
        let mut fine = true;
        let mut evaluate = |points: &[f64], at: &mut Vec<f64>| -> Vec<Vec<f64>> {
            if last {
                return self.products(row, inputs, at, points, count);
            }
            points
                .iter()
                .map(|&x| {
                    at[k] = x;
                    self.over(row, inputs, values, k + 1, at, count).unwrap_or_else(|| {
                        fine = false;
                        vec![0.0; count]
                    })
                })
                .collect()
        };
        let add = |total: &mut [f64], found: &[Vec<f64>]| {
            let mut added = 0.0_f64;
            for y in found {
                for (t, v) in total.iter_mut().zip(y).filter(|(_, v)| v.is_finite()) {
                    *t += v;
                }
            }
            for (i, t) in total.iter().enumerate().filter(|(_, t)| **t != 0.0) {
                let part: f64 = found.iter().map(|y| if y[i].is_finite() { y[i].abs() } else { 0.0 }).sum();
                added = added.max(part / t.abs());
            }
            added
        };
        let out = match &values[k] {
            Values::List(list) => {
                let mut total = vec![0.0; count];
                add(&mut total, &evaluate(list, at));
                total
            }
            Values::Whole(low, high) => {
                let (mut total, mut length, mut done) = (vec![0.0; count], STRETCH, 0);
                // outward from the end that is finite
                let (start, step) = if low.is_finite() { (*low, 1.0) } else { (*high, -1.0) };
                loop {
                    let points: Vec<f64> = (done..done + length)
                        .map(|i| start + step * i as f64)
                        .take_while(|x| x >= low && x <= high)
                        .collect();
                    if points.is_empty() {
                        break;
                    }
                    let added = add(&mut total, &evaluate(&points, at));
                    done += points.len();
                    if points.len() < length || (added < NEGLIGIBLE && total[0] > 0.0) {
                        break;
                    }
                    if done > MOST_TERMS {
                        return None;
                    }
                    length *= 2;
                }
                total
            }
            Values::Interval(low, high) => {
                let breaks = inputs.breaks.get(k).map_or(&[][..], Vec::as_slice);
                let r = integrate(*low, *high, breaks, count, TOLERANCE * 0.1, &mut |x| evaluate(x, at));
                if r.error > TOLERANCE {
                    return None;
                }
                r.values
            }
        };
        fine.then_some(out)
    }

    /// f, then f s s', at points of the last axis.
    fn products(&self, row: &Row, inputs: &Inputs, at: &[f64], points: &[f64], count: usize) -> Vec<Vec<f64>> {
        let last = self.axes.len() - 1;
        let raw = |c: u32| -> Vec<f64> {
            match self.axes.iter().position(|a| a.column == c) {
                Some(k) if k == last => points.to_vec(),
                Some(k) => vec![at[k]; points.len()],
                None => vec![self.input(row, inputs, c); points.len()],
            }
        };
        let q = self.quantities;
        let found = Part::evaluate(&self.density, points.len(), &raw, (0..q).collect(), Vec::new(), &row[..q]);
        (0..points.len())
            .map(|i| {
                let mut out = vec![0.0; count];
                let f = libm::exp(found[0][i]);
                if !(f > 0.0 && f.is_finite()) {
                    return out;
                }
                out[0] = f;
                if count > 1 {
                    for a in 0..q {
                        for b in 0..q {
                            out[1 + a * q + b] = f * found[1 + a][i] * found[1 + b][i];
                        }
                    }
                }
                out
            })
            .collect()
    }
}
