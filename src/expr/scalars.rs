//! Evaluation of nodes that have one value for all rows: restrictions, quantities, and the once-a-pass part of a program.

use std::collections::HashMap;

use super::graph::{Graph, Id, Node, power};
use super::{Function, Relation};

/// A list of steps that computes some nodes from the parameters.
#[derive(Debug, Clone, Default)]
pub struct Scalars {
    steps: Vec<Step>,
    outputs: Vec<usize>,
}

#[derive(Debug, Clone)]
enum Step {
    Constant(f64),
    Parameter(usize),
    Sum(f64, Box<[(usize, f64)]>),
    Product(Box<[(usize, f64)]>),
    Power(usize, usize),
    Call(Function, Box<[usize]>),
    Shift(Box<[usize]>),
    Choice(usize, usize, usize),
    Compare(Relation, usize, usize),
    And(usize, usize),
    Or(usize, usize),
    Not(usize),
}

impl Scalars {
    /// Compiles nodes that depend on parameters alone. A node that depends on a column or predictor gives NaN.
    pub fn compile(graph: &Graph, outputs: &[Id]) -> Self {
        let mut out = Scalars::default();
        let mut place = HashMap::new();
        out.outputs = outputs.iter().map(|&id| out.push(graph, id, &mut place)).collect();
        out
    }

    fn push(&mut self, graph: &Graph, id: Id, place: &mut HashMap<Id, usize>) -> usize {
        if let Some(&at) = place.get(&id) {
            return at;
        }
        let mut one = |s: &mut Self, i: Id| s.push(graph, i, place);
        let step = match graph.node(id).clone() {
            Node::Constant(x) => Step::Constant(x.get()),
            Node::Parameter(p) => Step::Parameter(p as usize),
            Node::Column(_) | Node::Predictor(_) => Step::Constant(f64::NAN),
            Node::Sum(c, t) => Step::Sum(c.get(), t.iter().map(|&(i, k)| (one(self, i), k.get())).collect()),
            Node::Product(t) => Step::Product(t.iter().map(|&(i, k)| (one(self, i), k.get())).collect()),
            Node::Power(a, b) => Step::Power(one(self, a), one(self, b)),
            Node::Call(f, a) => Step::Call(f, a.iter().map(|&i| one(self, i)).collect()),
            Node::Shift(a) => Step::Shift(a.iter().map(|&i| one(self, i)).collect()),
            Node::Choice(c, a, b) => Step::Choice(one(self, c), one(self, a), one(self, b)),
            Node::Compare(r, a, b) => Step::Compare(r, one(self, a), one(self, b)),
            Node::And(a, b) => Step::And(one(self, a), one(self, b)),
            Node::Or(a, b) => Step::Or(one(self, a), one(self, b)),
            Node::Not(a) => Step::Not(one(self, a)),
        };
        self.steps.push(step);
        place.insert(id, self.steps.len() - 1);
        self.steps.len() - 1
    }

    /// How many outputs there are.
    pub fn len(&self) -> usize {
        self.outputs.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.outputs.is_empty()
    }

    /// The outputs at these parameters.
    pub fn evaluate(&self, parameters: &[f64]) -> Vec<f64> {
        let mut work = Vec::new();
        let mut out = Vec::new();
        self.evaluate_into(parameters, &mut work, &mut out);
        out
    }

    /// As [`Scalars::evaluate`], into buffers that are reused.
    pub fn evaluate_into(&self, parameters: &[f64], work: &mut Vec<f64>, out: &mut Vec<f64>) {
        work.clear();
        let truth = |b: bool| f64::from(u8::from(b));
        for step in &self.steps {
            let v = |i: usize| work[i];
            let x = match step {
                Step::Constant(x) => *x,
                Step::Parameter(p) => parameters[*p],
                Step::Sum(c, t) => t.iter().fold(*c, |s, &(i, k)| s + k * v(i)),
                Step::Product(t) => zero_wins(t.iter().map(|&(i, e)| power(v(i), e))),
                Step::Power(a, b) => libm::pow(v(*a), v(*b)),
                Step::Call(f, a) => match a[..] {
                    [a] => f.value(&[v(a)]),
                    [a, b] => f.value(&[v(a), v(b)]),
                    _ => f.value(&a.iter().map(|&i| v(i)).collect::<Vec<_>>()),
                },
                Step::Shift(a) => {
                    let top = a.iter().map(|&i| v(i)).fold(f64::NEG_INFINITY, f64::max);
                    if top == f64::NEG_INFINITY { 0.0 } else { top }
                }
                Step::Choice(c, a, b) => {
                    if v(*c) != 0.0 {
                        v(*a)
                    } else {
                        v(*b)
                    }
                }
                Step::Compare(r, a, b) => truth(r.holds(v(*a), v(*b))),
                Step::And(a, b) => truth(v(*a) != 0.0 && v(*b) != 0.0),
                Step::Or(a, b) => truth(v(*a) != 0.0 || v(*b) != 0.0),
                Step::Not(a) => truth(v(*a) == 0.0),
            };
            work.push(x);
        }
        out.clear();
        out.extend(self.outputs.iter().map(|&i| work[i]));
    }
}

/// The product of numbers in which zero times infinity is zero (0 log 0 = 0) and NaN stays NaN.
fn zero_wins(factors: impl Iterator<Item = f64>) -> f64 {
    let (mut out, mut zero, mut infinite) = (1.0, false, false);
    for x in factors {
        if x.is_nan() {
            return x;
        }
        zero |= x == 0.0;
        infinite |= x.is_infinite();
        out *= x;
    }
    if zero && infinite { 0.0 } else { out }
}
