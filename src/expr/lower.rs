//! From nodes to a program: sums over rows are split into (factor that depends on parameters alone) times (row product),
//! equal row products are summed once, pairs that several products share are multiplied once, and what depends on columns
//! alone and costs more than a load is kept as a column.

use std::collections::HashMap;

use super::allocate::allocate;
use super::graph::{Graph, Id, Node, Number};
use super::program::{Gather, Op, Output, Program, RowOutput, Source, Total};
use super::scalars::Scalars;

/// Columns and sums that all programs over the same rows share.
#[derive(Debug, Clone, Default)]
pub struct Layout {
    /// Nodes stored as columns: raw ones and kept ones, in slot order.
    pub(super) columns: Vec<Id>,
    /// Row products summed once.
    pub(super) fixed: Vec<Id>,
}

impl Layout {
    pub(super) fn column(&mut self, id: Id) -> u16 {
        let at = self.columns.iter().position(|&c| c == id).unwrap_or_else(|| {
            self.columns.push(id);
            self.columns.len() - 1
        });
        at as u16
    }

    fn fixed(&mut self, id: Id) -> usize {
        self.fixed.iter().position(|&c| c == id).unwrap_or_else(|| {
            self.fixed.push(id);
            self.fixed.len() - 1
        })
    }
}

/// A factor of a row product.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) enum Unit {
    Weight,
    Node(Id),
    Pair(u32),
}

pub(super) struct Lower<'a> {
    pub(super) graph: &'a mut Graph,
    pub(super) layout: &'a mut Layout,
    /// Whether column-only nodes may become columns (not while those columns are computed).
    pub(super) keep: bool,
    pub(super) weighted: bool,
    pub(super) scalars: Vec<Id>,
    pub(super) scalar_at: HashMap<Id, u32>,
    pub(super) ops: Vec<Op>,
    pub(super) done: HashMap<Id, Source>,
    pub(super) monomials: HashMap<Id, Vec<Unit>>,
    pub(super) pairs: Vec<(Unit, Unit)>,
    pub(super) pair_done: HashMap<u32, Source>,
    pub(super) predictors: usize,
}

/// Compiles a program for these outputs; columns and fixed sums it needs are entered in the layout.
pub fn compile(
    graph: &mut Graph,
    layout: &mut Layout,
    outputs: &[Output],
    predictors: usize,
    weighted: bool,
) -> Program {
    lower(graph, layout, outputs, predictors, weighted, true)
}

/// Compiles the program that computes the layout's kept columns (as row outputs, in slot order; raw columns are given as they
/// are) and its fixed sums, from the raw columns, which it finds in the slots of a layout of its own.
pub fn preparation(graph: &mut Graph, layout: &Layout, weighted: bool) -> (Program, Layout) {
    let mut raw = Layout::default();
    let mut outputs: Vec<Output> = layout.columns.iter().map(|&c| Output::Row(c)).collect();
    outputs.extend(layout.fixed.iter().map(|&f| Output::Sum(f)));
    let program = lower(graph, &mut raw, &outputs, 0, weighted, false);
    (program, raw)
}

impl Layout {
    /// How many columns.
    pub fn columns(&self) -> usize {
        self.columns.len()
    }

    /// The raw column in a slot, if it is one.
    pub fn raw(&self, graph: &Graph, slot: usize) -> Option<u32> {
        match graph.node(self.columns[slot]) {
            Node::Column(c) => Some(*c),
            _ => None,
        }
    }
}

fn lower(
    graph: &mut Graph,
    layout: &mut Layout,
    outputs: &[Output],
    predictors: usize,
    weighted: bool,
    keep: bool,
) -> Program {
    let mut l = Lower {
        graph,
        layout,
        keep,
        weighted,
        scalars: Vec::new(),
        scalar_at: HashMap::new(),
        ops: Vec::new(),
        done: HashMap::new(),
        monomials: HashMap::new(),
        pairs: Vec::new(),
        pair_done: HashMap::new(),
        predictors,
    };
    l.program(outputs)
}

impl Lower<'_> {
    fn program(&mut self, outputs: &[Output]) -> Program {
        // 1. split every output into factor times row product
        let mut products: Vec<Id> = Vec::new();
        let mut sums: Vec<Vec<(u32, Id)>> = Vec::new();
        let mut rows: Vec<(u32, Id, bool)> = Vec::new();
        for output in outputs {
            match *output {
                Output::Sum(id) => {
                    let terms = self.grouped(id);
                    for &(_, p) in &terms {
                        if !products.contains(&p) {
                            products.push(p);
                        }
                    }
                    let terms = terms.into_iter().map(|(k, p)| (self.scalar(k), p)).collect();
                    sums.push(terms);
                }
                Output::Row(id) | Output::WeightedRow(id) => {
                    let terms = self.grouped(id);
                    let (k, p) = match terms[..] {
                        [(k, p)] => (k, p),
                        [] => (self.graph.constant(0.0), self.graph.constant(1.0)),
                        _ => (self.graph.constant(1.0), id),
                    };
                    let weigh = self.weighted && matches!(output, Output::WeightedRow(_));
                    rows.push((self.scalar(k), p, weigh));
                }
            }
        }
        // 2. row products as lists of factors, with shared pairs taken out
        let (fixed, moving): (Vec<Id>, Vec<Id>) = products.iter().partition(|&&p| self.keep && self.graph.is_fixed(p));
        let mut roots = moving.clone();
        roots.extend(rows.iter().map(|r| r.1));
        roots.iter().for_each(|&id| self.collect(id));
        let mut lists: Vec<Vec<Unit>> = moving.iter().map(|&p| self.sum_units(p)).collect();
        self.share_pairs(&mut lists);
        // 3. operations
        let mut gathers: Vec<Gather> = Vec::new();
        for units in &lists {
            let gather = self.gather(units);
            gathers.push(gather);
        }
        let rows: Vec<RowOutput> = rows
            .into_iter()
            .map(|(scale, p, weigh)| {
                let one = self.graph.as_constant(p) == Some(1.0);
                let source = (!one).then(|| self.row(p));
                let source = match (source, weigh) {
                    (s, false) => s,
                    (None, true) => Some(Source::Weight),
                    (Some(s), true) => Some(self.push(Op::Multiply(s, Source::Weight))),
                };
                RowOutput { scale, source, node: p, fixed: self.graph.is_fixed(p) }
            })
            .collect();
        let fixed_at: HashMap<Id, usize> = fixed.iter().map(|&p| (p, self.layout.fixed(p))).collect();
        let sums = sums
            .into_iter()
            .map(|terms| {
                terms
                    .into_iter()
                    .map(|(k, p)| {
                        let total = match moving.iter().position(|&m| m == p) {
                            Some(i) => Total::Gathered(i),
                            None => Total::Fixed(fixed_at[&p]),
                        };
                        (k, total)
                    })
                    .collect()
            })
            .collect();
        let mut program = Program {
            scalars: Scalars::compile(self.graph, &self.scalars),
            predictors: self.predictors,
            steps: Vec::new(),
            registers: 0,
            gathered: 0,
            gathers,
            sums,
            rows,
        };
        allocate(&mut program, std::mem::take(&mut self.ops), self.predictors);
        program
    }

    pub(super) fn scalar(&mut self, id: Id) -> u32 {
        if let Some(&at) = self.scalar_at.get(&id) {
            return at;
        }
        let at = self.scalars.len() as u32;
        self.scalars.push(id);
        self.scalar_at.insert(id, at);
        at
    }

    /// A product split into the factor that is one for all rows and the rest.
    pub(super) fn split(&mut self, id: Id) -> (Id, Id) {
        let one = self.graph.constant(1.0);
        if self.graph.is_scalar(id) {
            return (id, one);
        }
        match self.graph.node(id).clone() {
            Node::Product(f) => {
                let (s, r): (Vec<_>, Vec<_>) =
                    f.iter().map(|&(i, e)| (i, e.get())).partition(|&(i, _)| self.graph.is_scalar(i));
                if s.is_empty() {
                    return (one, id);
                }
                (self.graph.product(&s), self.graph.product(&r))
            }
            Node::Sum(c, t) if c.get() == 0.0 && t.len() == 1 => {
                let (s, r) = self.split(t[0].0);
                (self.graph.scale(t[0].1.get(), s), r)
            }
            _ => (one, id),
        }
    }

    /// A sum whose every row term carries a factor of its own that depends on parameters: multiplying it out saves work and
    /// costs no digits. (y - mean is none: its terms would cancel.)
    fn expandable(&mut self, id: Id) -> bool {
        let Node::Sum(_, t) = self.graph.node(id).clone() else { return false };
        if t.len() > 6 {
            return false;
        }
        t.iter().all(|&(i, _)| {
            let (s, r) = self.split(i);
            self.graph.as_constant(r).is_some() || self.graph.as_constant(s).is_none()
        })
    }

    /// Terms (factor, row product) whose sum is the node.
    fn decompose(&mut self, id: Id, out: &mut Vec<(Id, f64, Id)>, scale: f64, depth: usize) {
        let one = self.graph.constant(1.0);
        match self.graph.node(id).clone() {
            Node::Sum(c, t) => {
                if c.get() != 0.0 {
                    out.push((one, scale * c.get(), one));
                }
                for &(i, k) in &t {
                    self.decompose(i, out, scale * k.get(), depth);
                }
            }
            Node::Product(f) if depth < 3 && !self.graph.is_scalar(id) => {
                let found = f
                    .iter()
                    .position(|&(i, e)| e == Number::new(1.0) && !self.graph.is_scalar(i) && self.expandable(i));
                let Some(at) = found else {
                    let (s, r) = self.split(id);
                    out.push((s, scale, r));
                    return;
                };
                let rest: Vec<(Id, f64)> =
                    f.iter().enumerate().filter(|p| p.0 != at).map(|(_, &(i, e))| (i, e.get())).collect();
                let Node::Sum(c, t) = self.graph.node(f[at].0).clone() else { return };
                let mut pieces: Vec<(Id, f64)> = t.iter().map(|&(i, k)| (i, k.get())).collect();
                if c.get() != 0.0 {
                    pieces.push((one, c.get()));
                }
                for (i, k) in pieces {
                    let mut all = rest.clone();
                    all.push((i, 1.0));
                    let whole = self.graph.product(&all);
                    self.decompose(whole, out, scale * k, depth + 1);
                }
            }
            _ => {
                let (s, r) = self.split(id);
                out.push((s, scale, r));
            }
        }
    }

    fn grouped(&mut self, id: Id) -> Vec<(Id, Id)> {
        let mut terms = Vec::new();
        self.decompose(id, &mut terms, 1.0, 0);
        let mut order: Vec<Id> = Vec::new();
        let mut by: HashMap<Id, Vec<(Id, f64)>> = HashMap::new();
        for (s, k, r) in terms {
            // a constant in the row product belongs to the factor
            if k == 0.0 {
                continue;
            }
            by.entry(r).or_insert_with(|| {
                order.push(r);
                Vec::new()
            });
            if let Some(list) = by.get_mut(&r) {
                list.push((s, k));
            }
        }
        let mut out = Vec::new();
        for r in order {
            let s = self.graph.sum(0.0, &by[&r]);
            if self.graph.as_constant(s) != Some(0.0) {
                out.push((s, r));
            }
        }
        out
    }
}
