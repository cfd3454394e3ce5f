//! One function of the parameters, left minus right, with exact first and second derivatives.

use super::Sides;
use crate::expr::{Graph, Id, Scalars, Variable};
use crate::math::Matrix;

/// left - right, compiled.
#[derive(Debug)]
pub(super) struct Body {
    sides: Scalars,
    /// The parameters whose derivative is not identically zero, ascending.
    parameters: Vec<usize>,
    gradient: Gradient,
    /// The pairs (j, k), j <= k, whose second derivative is not identically zero.
    pairs: Vec<(usize, usize)>,
    seconds: Scalars,
}

#[derive(Debug)]
enum Gradient {
    /// The same everywhere: the function is linear.
    Constant(Vec<f64>),
    Varying(Scalars),
}

impl Body {
    /// Compiles left - right; `parameters` lists the ones that may occur in it.
    pub fn compile(graph: &mut Graph, left: Id, right: Id, parameters: &[usize]) -> Body {
        let gap = graph.subtract(left, right);
        let slope = |graph: &mut Graph, id: Id, j: usize| {
            // A model with 2^32 parameters would not fit in memory.
            let id = graph.derivative(id, Variable::Parameter(j as u32));
            (graph.as_constant(id) != Some(0.0)).then_some(id)
        };
        let slopes: Vec<(usize, Id)> =
            parameters.iter().filter_map(|&j| slope(graph, gap, j).map(|id| (j, id))).collect();
        let mut pairs = Vec::new();
        let mut seconds = Vec::new();
        for (at, &(j, by_j)) in slopes.iter().enumerate() {
            for &(k, _) in &slopes[at..] {
                if let Some(id) = slope(graph, by_j, k) {
                    pairs.push((j, k));
                    seconds.push(id);
                }
            }
        }
        let constants: Option<Vec<f64>> = slopes.iter().map(|&(_, id)| graph.as_constant(id)).collect();
        let gradient = match constants {
            Some(values) => Gradient::Constant(values),
            None => Gradient::Varying(Scalars::compile(graph, &slopes.iter().map(|s| s.1).collect::<Vec<_>>())),
        };
        Body {
            sides: Scalars::compile(graph, &[left, right]),
            parameters: slopes.iter().map(|s| s.0).collect(),
            gradient,
            pairs,
            seconds: Scalars::compile(graph, &seconds),
        }
    }

    /// Whether the gradient is the same everywhere.
    pub fn is_linear(&self) -> bool {
        matches!(self.gradient, Gradient::Constant(_))
    }

    /// The parameters it depends on by its slope, ascending.
    pub fn parameters(&self) -> &[usize] {
        &self.parameters
    }

    /// Both sides at theta.
    pub fn sides(&self, theta: &[f64]) -> Sides {
        let values = self.sides.evaluate(theta);
        Sides { left: values[0], right: values[1] }
    }

    /// Writes the gradient of left - right into a row of zeros.
    pub fn gradient(&self, theta: &[f64], out: &mut Matrix, row: usize) {
        let values;
        let slopes = match &self.gradient {
            Gradient::Constant(constants) => constants,
            Gradient::Varying(program) => {
                values = program.evaluate(theta);
                &values
            }
        };
        for (&j, &slope) in self.parameters.iter().zip(slopes) {
            out[(row, j)] = slope;
        }
    }

    /// Adds `multiplier` times the Hessian of left - right.
    pub fn curvature(&self, theta: &[f64], multiplier: f64, out: &mut Matrix) {
        // A multiplier of 0 adds nothing, also where the Hessian is not finite.
        if self.pairs.is_empty() || multiplier == 0.0 {
            return;
        }
        for (&(j, k), second) in self.pairs.iter().zip(self.seconds.evaluate(theta)) {
            out[(j, k)] += multiplier * second;
            if j != k {
                out[(k, j)] += multiplier * second;
            }
        }
    }
}
