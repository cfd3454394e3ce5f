//! The programs of one kind of row: value, gradient, Hessian and the two sums of information, compiled from one graph.

use super::expectation::Expectation;
use super::fold::Folds;
use crate::expr::{Graph, Id, Layout, Output, Program, Variable, compile, preparation};

/// Where an entry of a gradient or a symmetric matrix comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Slot {
    /// It is zero for every row and every parameter.
    Zero,
    /// A sum output of the program.
    Sum(usize),
    /// A row output of the program, to be multiplied into design columns.
    Row(usize),
}

/// A program with what its outputs are. Variables are numbered: parameters first, then predictors.
#[derive(Debug, Clone, Default)]
pub(super) struct Pass {
    pub(super) program: Program,
    /// Whether sum output 0 is the log-likelihood.
    pub(super) value: bool,
    /// One a variable; empty if not asked for.
    pub(super) first: Vec<Slot>,
    /// (variable, variable not before it, slot); zero ones left out.
    pub(super) second: Vec<(usize, usize, Slot)>,
}

/// All passes over one kind of row.
#[derive(Debug, Clone, Default)]
pub(super) struct Formula {
    pub(super) value: Pass,
    pub(super) gradient: Pass,
    pub(super) hessian: Pass,
    pub(super) expected: Option<Pass>,
    /// What expected information is computed from where no formula gives it.
    pub(super) expectation: Option<Box<Expectation>>,
    pub(super) outer: Pass,
    /// Second derivatives with what is squared taken at its tangent, and for each variable whether a square contains it;
    /// `None` where no square bends.
    pub(super) tangent: Option<(Pass, Vec<bool>)>,
    /// Counts the rows in which something ties; `None` where nothing can.
    pub(super) ties: Option<Pass>,
    /// log f row by row.
    pub(super) rows: Pass,
    /// The places where log f has a kink, if it has any.
    pub(super) folds: Option<Box<Folds>>,
    /// Row by row: u of each fold with the slope of log f in abs(u).
    pub(super) heights: Pass,
    /// Row by row: u of each fold and its derivatives.
    pub(super) slopes: Pass,
    pub(super) layout: Layout,
    /// Computes the layout's columns and fixed sums, from raw columns.
    pub(super) preparation: Program,
    /// Raw columns that the preparation reads, by slot of its store.
    pub(super) raw: Vec<u32>,
}

/// Which of a formula's passes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Which {
    Value,
    Gradient,
    Hessian,
    Expected,
    Outer,
    Tangent,
    Ties,
}

/// What a formula is compiled from.
pub(super) struct Ingredients {
    pub(super) graph: Graph,
    /// log f of a row.
    pub(super) log_density: Id,
    /// Variables to differentiate by: parameters, then predictors.
    pub(super) variables: Vec<Variable>,
    /// Expected information of a row between variables, where the family has it: (variable, variable, node).
    pub(super) expected: Option<Vec<(usize, usize, Id)>>,
    /// What expected information is computed from otherwise.
    pub(super) expectation: Option<Box<Expectation>>,
    pub(super) weighted: bool,
    /// Row outputs of the folds.
    pub(super) heights: Vec<Id>,
    pub(super) slopes: Vec<Id>,
}

struct Compiler<'a> {
    graph: &'a mut Graph,
    layout: Layout,
    variables: &'a [Variable],
    weighted: bool,
}

impl Compiler<'_> {
    fn pass(&mut self, value: Option<Id>, first: &[Id], second: &[(usize, usize, Id)]) -> Pass {
        let mut outputs: Vec<Output> = value.into_iter().map(Output::Sum).collect();
        let (mut sums, mut rows) = (outputs.len(), 0);
        let by_row = |v: usize, variables: &[Variable]| matches!(variables[v], Variable::Predictor(_));
        let mut slot = |graph: &Graph, id: Id, by_row: bool| {
            if graph.as_constant(id) == Some(0.0) {
                return Slot::Zero;
            }
            if by_row {
                outputs.push(Output::WeightedRow(id));
                rows += 1;
                Slot::Row(rows - 1)
            } else {
                outputs.push(Output::Sum(id));
                sums += 1;
                Slot::Sum(sums - 1)
            }
        };
        let first: Vec<Slot> =
            first.iter().enumerate().map(|(v, &id)| slot(self.graph, id, by_row(v, self.variables))).collect();
        let second: Vec<(usize, usize, Slot)> = second
            .iter()
            .map(|&(u, v, id)| (u, v, slot(self.graph, id, by_row(u, self.variables) || by_row(v, self.variables))))
            .filter(|s| s.2 != Slot::Zero)
            .collect();
        let predictors = self.variables.iter().filter(|v| matches!(v, Variable::Predictor(_))).count();
        let program = compile(self.graph, &mut self.layout, &outputs, predictors, self.weighted);
        Pass { program, value: value.is_some(), first, second }
    }
}

/// Second derivatives by pairs of variables, and which variables a square contains.
type Tangent = (Vec<(usize, usize, Id)>, Vec<bool>);

/// The second derivatives less what the insides of squares bend, if any of them does.
fn tangent(
    graph: &mut Graph,
    log_density: Id,
    variables: &[Variable],
    second: &[(usize, usize, Id)],
) -> Option<Tangent> {
    let squares = graph.squares(log_density);
    let mut bent = false;
    let straight: Vec<(usize, usize, Id)> = second
        .iter()
        .map(|&(u, v, id)| {
            let bend = graph.bend(&squares, variables[u], variables[v]);
            bent |= graph.as_constant(bend) != Some(0.0);
            (u, v, graph.subtract(id, bend))
        })
        .collect();
    let zero = graph.constant(0.0);
    let inside = variables.iter().map(|&v| squares.iter().any(|s| graph.derivative(s.inside, v) != zero)).collect();
    bent.then_some((straight, inside))
}

impl Formula {
    /// A formula that gives nodes row by row, and no sums.
    pub(super) fn of_rows(graph: &mut Graph, nodes: &[Id], predictors: usize) -> Formula {
        let outputs: Vec<Output> = nodes.iter().map(|&n| Output::Row(n)).collect();
        let mut layout = Layout::default();
        let program = compile(graph, &mut layout, &outputs, predictors, false);
        let (preparation, raw) = preparation(graph, &layout, false);
        let raw = (0..raw.columns()).filter_map(|slot| raw.raw(graph, slot)).collect();
        Formula { rows: Pass { program, ..Pass::default() }, layout, preparation, raw, ..Formula::default() }
    }

    pub(super) fn which(&self, which: Which) -> Option<&Pass> {
        match which {
            Which::Value => Some(&self.value),
            Which::Gradient => Some(&self.gradient),
            Which::Hessian => Some(&self.hessian),
            Which::Expected => self.expected.as_ref(),
            Which::Outer => Some(&self.outer),
            // without a bent square the second derivatives are what they are
            Which::Tangent => Some(self.tangent.as_ref().map_or(&self.hessian, |t| &t.0)),
            Which::Ties => self.ties.as_ref(),
        }
    }

    /// Differentiates and compiles.
    pub(super) fn compile(ingredients: Ingredients) -> Formula {
        let Ingredients { mut graph, log_density, variables, expected, mut expectation, weighted, heights, slopes } =
            ingredients;
        let n = variables.len();
        let first: Vec<Id> = variables.iter().map(|&v| graph.derivative(log_density, v)).collect();
        let mut second = Vec::with_capacity(n * (n + 1) / 2);
        let mut outer = Vec::with_capacity(n * (n + 1) / 2);
        for u in 0..n {
            for v in u..n {
                second.push((u, v, graph.derivative(first[u], variables[v])));
                outer.push((u, v, graph.multiply(first[u], first[v])));
            }
        }
        let tangent = tangent(&mut graph, log_density, &variables, &second);
        let predictors = variables.iter().filter(|v| matches!(v, Variable::Predictor(_))).count();
        let mut c = Compiler { graph: &mut graph, layout: Layout::default(), variables: &variables, weighted };
        let value = c.pass(Some(log_density), &[], &[]);
        let gradient = c.pass(Some(log_density), &first, &[]);
        let hessian = c.pass(Some(log_density), &first, &second);
        let expected = expected.map(|e| c.pass(None, &[], &e));
        let outer = c.pass(None, &[], &outer);
        let tangent = tangent.map(|(second, inside)| (c.pass(None, &[], &second), inside));
        let ties = c.graph.ties(log_density);
        let any = c.graph.sum(0.0, &ties.iter().map(|&t| (t, 1.0)).collect::<Vec<_>>());
        let ties = (!ties.is_empty()).then(|| c.pass(Some(any), &[], &[]));
        let rows = Pass {
            program: compile(c.graph, &mut c.layout, &[Output::Row(log_density)], predictors, weighted),
            ..Pass::default()
        };
        let [heights, slopes] = [heights, slopes].map(|list| {
            let outputs: Vec<Output> = list.into_iter().map(Output::Row).collect();
            let program = compile(c.graph, &mut c.layout, &outputs, predictors, weighted);
            Pass { program, ..Pass::default() }
        });
        let mut layout = c.layout;
        if let Some(e) = &mut expectation {
            e.compile(&mut graph, &mut layout, &variables, weighted);
        }
        let (preparation, raw) = preparation(&mut graph, &layout, weighted);
        let raw = (0..raw.columns()).filter_map(|slot| raw.raw(&graph, slot)).collect();
        Formula {
            value,
            gradient,
            hessian,
            expected,
            expectation,
            outer,
            tangent,
            ties,
            rows,
            folds: None,
            heights,
            slopes,
            layout,
            preparation,
            raw,
        }
    }
}
