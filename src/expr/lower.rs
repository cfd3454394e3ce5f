//! From nodes to a program: sums over rows are split into (factor that depends on parameters alone) times (row product),
//! equal row products are summed once, pairs that several products share are multiplied once, and what depends on columns
//! alone and costs more than a load is kept as a column.

use std::collections::HashMap;

use super::Function;
use super::graph::{Graph, Id, Node, Number, Sign};
use super::program::{Gather, Op, Output, Program, RowOutput, Source, Step, Total};
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
    fn column(&mut self, id: Id) -> u16 {
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
enum Unit {
    Weight,
    Node(Id),
    Pair(u32),
}

struct Lower<'a> {
    graph: &'a mut Graph,
    layout: &'a mut Layout,
    /// Whether column-only nodes may become columns (not while those columns are computed).
    keep: bool,
    weighted: bool,
    scalars: Vec<Id>,
    scalar_at: HashMap<Id, u32>,
    ops: Vec<Op>,
    done: HashMap<Id, Source>,
    monomials: HashMap<Id, Vec<Unit>>,
    pairs: Vec<(Unit, Unit)>,
    pair_done: HashMap<u32, Source>,
    predictors: usize,
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

    fn scalar(&mut self, id: Id) -> u32 {
        if let Some(&at) = self.scalar_at.get(&id) {
            return at;
        }
        let at = self.scalars.len() as u32;
        self.scalars.push(id);
        self.scalar_at.insert(id, at);
        at
    }

    /// A product split into the factor that is one for all rows and the rest.
    fn split(&mut self, id: Id) -> (Id, Id) {
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

    /// The factors of a product, powers written out; what is no product is one factor.
    fn units_of(&mut self, id: Id) -> Vec<Unit> {
        let Node::Product(f) = self.graph.node(id).clone() else { return vec![Unit::Node(id)] };
        let mut out = Vec::new();
        for &(base, e) in &f {
            let e = e.get();
            let single = |g: &mut Graph, k: f64| Unit::Node(g.product(&[(base, k)]));
            if e == e.trunc() && (1.0..=4.0).contains(&e.abs()) {
                let unit = if e > 0.0 { Unit::Node(base) } else { single(self.graph, -1.0) };
                out.extend(std::iter::repeat_n(unit, e.abs() as usize));
            } else {
                out.push(single(self.graph, e));
            }
        }
        out.sort();
        out
    }

    /// Enters the row products below a node.
    fn collect(&mut self, id: Id) {
        if self.monomials.contains_key(&id) || self.graph.is_scalar(id) || self.is_leaf(id) {
            return;
        }
        let node = self.graph.node(id).clone();
        if let Node::Product(f) = &node {
            if let [(base, _)] = f[..] {
                self.monomials.insert(id, Vec::new());
                let units = self.units_of(id);
                if units.len() > 1 {
                    self.monomials.insert(id, units);
                }
                self.collect(base);
                return;
            }
            let units = self.units_of(id);
            self.monomials.insert(id, units.clone());
            for u in units {
                if let Unit::Node(n) = u {
                    self.collect(n);
                }
            }
            return;
        }
        self.monomials.insert(id, Vec::new());
        match node {
            Node::Sum(_, t) => {
                for &(i, _) in &t {
                    let (_, r) = self.split(i);
                    self.collect(r);
                }
            }
            Node::Call(_, a) | Node::Shift(a) => a.iter().for_each(|&i| self.collect(i)),
            Node::Choice(a, b, c) => [a, b, c].iter().for_each(|&i| self.collect(i)),
            Node::Power(a, b) | Node::Compare(_, a, b) | Node::And(a, b) | Node::Or(a, b) => {
                self.collect(a);
                self.collect(b);
            }
            Node::Not(a) => self.collect(a),
            _ => {}
        }
    }

    fn sum_units(&mut self, product: Id) -> Vec<Unit> {
        let mut units = if self.graph.as_constant(product) == Some(1.0) { Vec::new() } else { self.units_of(product) };
        if self.weighted {
            units.push(Unit::Weight);
            units.sort();
        }
        units
    }

    /// Replaces the pair that most lists share by one unit, until no pair is shared.
    fn share_pairs(&mut self, lists: &mut [Vec<Unit>]) {
        let keys: Vec<Id> = {
            let mut k: Vec<Id> = self.monomials.iter().filter(|m| m.1.len() > 1).map(|m| *m.0).collect();
            k.sort();
            k
        };
        for _ in 0..400 {
            let mut count: HashMap<(Unit, Unit), usize> = HashMap::new();
            let mut tally = |list: &[Unit], whole: bool| {
                if list.len() < 2 || (whole && list.len() == 2) {
                    return;
                }
                let mut seen = Vec::new();
                for i in 0..list.len() {
                    for j in i + 1..list.len() {
                        let pair = (list[i], list[j]);
                        if !seen.contains(&pair) {
                            seen.push(pair);
                            *count.entry(pair).or_default() += 1;
                        }
                    }
                }
            };
            lists.iter().for_each(|l| tally(l, true));
            keys.iter().for_each(|k| tally(&self.monomials[k], false));
            let best = count.into_iter().filter(|c| c.1 > 1).max_by_key(|&(pair, n)| (n, std::cmp::Reverse(pair)));
            let Some((pair, _)) = best else { break };
            let unit = Unit::Pair(self.pairs.len() as u32);
            self.pairs.push(pair);
            let replace = |list: &mut Vec<Unit>| {
                let at = |list: &[Unit], u: Unit, skip: usize| {
                    list.iter().enumerate().position(|(i, &x)| x == u && i != skip)
                };
                while let Some(i) = at(list, pair.0, usize::MAX) {
                    let Some(j) = at(list, pair.1, i) else { break };
                    list.remove(i.max(j));
                    list.remove(i.min(j));
                    list.push(unit);
                    list.sort();
                }
            };
            lists.iter_mut().filter(|l| l.len() > 2).for_each(replace);
            for k in &keys {
                if let Some(list) = self.monomials.get_mut(k) {
                    replace(list);
                }
            }
        }
    }

    fn gather(&mut self, units: &[Unit]) -> Gather {
        match *units {
            [] => {
                let one = self.graph.constant(1.0);
                let one = self.scalar(one);
                Gather::Sum(self.push(Op::Fill(one)))
            }
            [Unit::Node(id)] if !self.is_leaf(id) => match self.graph.node(id).clone() {
                Node::Call(Function::Log, a) if !self.done.contains_key(&id) => Gather::SumLog(self.row(a[0])),
                _ => Gather::Sum(self.row(id)),
            },
            [only] => Gather::Sum(self.unit(only)),
            _ => {
                let last = units[units.len() - 1];
                let first = self.multiply_units(&units[..units.len() - 1]);
                let risky = self.needs_zero(&units[..units.len() - 1], &[last]);
                let second = self.unit(last);
                if risky { Gather::DotZero(first, second) } else { Gather::Dot(first, second) }
            }
        }
    }

    fn multiply_units(&mut self, units: &[Unit]) -> Source {
        let mut acc = self.unit(units[0]);
        for (at, &u) in units.iter().enumerate().skip(1) {
            let risky = self.needs_zero(&units[..at], &[u]);
            let next = self.unit(u);
            acc = self.push(if risky { Op::MultiplyZero(acc, next) } else { Op::Multiply(acc, next) });
        }
        acc
    }

    /// Whether zero times infinity may meet in the product of the two lists.
    fn needs_zero(&self, a: &[Unit], b: &[Unit]) -> bool {
        let risky = |l: &[Unit]| l.iter().any(|&u| self.may_be_infinite(u));
        let zero = |l: &[Unit]| l.iter().any(|&u| self.may_be_zero(u));
        (risky(a) && zero(b)) || (risky(b) && zero(a))
    }

    fn may_be_infinite(&self, unit: Unit) -> bool {
        match unit {
            Unit::Weight => false,
            Unit::Pair(p) => {
                let (a, b) = self.pairs[p as usize];
                self.may_be_infinite(a) || self.may_be_infinite(b)
            }
            Unit::Node(id) => match self.graph.node(id) {
                Node::Call(Function::Log, a) => self.graph.sign(a[0]) != Sign::Positive,
                Node::Call(Function::Log1p | Function::Logit, _) => true,
                Node::Product(f) => f.iter().any(|&(i, e)| {
                    (e.get() < 0.0 && self.graph.sign(i) != Sign::Positive) || self.may_be_infinite(Unit::Node(i))
                }),
                Node::Sum(_, t) => t.iter().any(|&(i, _)| self.may_be_infinite(Unit::Node(i))),
                _ => false,
            },
        }
    }

    fn may_be_zero(&self, unit: Unit) -> bool {
        match unit {
            Unit::Weight => false,
            Unit::Pair(p) => {
                let (a, b) = self.pairs[p as usize];
                self.may_be_zero(a) || self.may_be_zero(b)
            }
            Unit::Node(id) => self.graph.sign(id) != Sign::Positive,
        }
    }

    fn unit(&mut self, unit: Unit) -> Source {
        match unit {
            Unit::Weight => Source::Weight,
            Unit::Node(id) => self.row(id),
            Unit::Pair(p) => {
                if let Some(&s) = self.pair_done.get(&p) {
                    return s;
                }
                let (a, b) = self.pairs[p as usize];
                let risky = self.needs_zero(&[a], &[b]);
                let (a, b) = (self.unit(a), self.unit(b));
                let out = self.push(if risky { Op::MultiplyZero(a, b) } else { Op::Multiply(a, b) });
                self.pair_done.insert(p, out);
                out
            }
        }
    }

    fn push(&mut self, op: Op) -> Source {
        // virtual registers come after those of the predictors
        let at = self.predictors + self.ops.len();
        self.ops.push(op);
        Source::Register(at as u16)
    }

    fn is_leaf(&self, id: Id) -> bool {
        match self.graph.node(id) {
            Node::Column(_) | Node::Predictor(_) => true,
            _ => self.keep && self.graph.class(id).is_column() && self.worth_keeping(id),
        }
    }

    /// Whether a column-only node costs more to compute in each pass than to load.
    fn worth_keeping(&self, id: Id) -> bool {
        match self.graph.node(id) {
            Node::Column(_) | Node::Constant(_) => false,
            Node::Sum(_, t) => t.len() == 1 || t.len() > 3 || t.iter().any(|&(i, _)| self.worth_keeping(i)),
            Node::Product(f) => {
                f.len() > 2 || f.iter().any(|&(i, e)| !(1.0..=2.0).contains(&e.get()) || self.worth_keeping(i))
            }
            _ => true,
        }
    }

    /// The block of a node that varies by row (or a scalar spread over the rows).
    fn row(&mut self, id: Id) -> Source {
        if let Some(&s) = self.done.get(&id) {
            return s;
        }
        let out = self.lower_row(id);
        self.done.insert(id, out);
        out
    }

    fn lower_row(&mut self, id: Id) -> Source {
        if self.graph.is_scalar(id) {
            let s = self.scalar(id);
            return self.push(Op::Fill(s));
        }
        if let Node::Predictor(p) = self.graph.node(id) {
            return Source::Register(*p as u16);
        }
        if self.is_leaf(id) {
            return Source::Column(self.layout.column(id));
        }
        let all = |l: &mut Self, a: &[Id]| a.iter().map(|&i| l.row(i)).collect::<Vec<_>>();
        match self.graph.node(id).clone() {
            Node::Sum(c, t) => self.lower_sum(c.get(), &t),
            Node::Product(f) => self.lower_product(id, &f),
            Node::Power(a, b) => {
                let (a, b) = (self.row(a), self.row(b));
                self.push(Op::Power(a, b))
            }
            Node::Call(Function::Max, a) => {
                let s = all(self, &a);
                self.push(Op::Greatest(s.into()))
            }
            Node::Call(Function::Min, a) => {
                let s = all(self, &a);
                self.push(Op::Least(s.into()))
            }
            Node::Shift(a) => {
                let s = all(self, &a);
                self.push(Op::ShiftOf(s.into()))
            }
            Node::Call(f, a) => {
                let s = all(self, &a);
                self.push(match s[..] {
                    [x] => Op::Call1(f, x),
                    [x, y, ..] => Op::Call2(f, x, y),
                    [] => Op::Fill(0),
                })
            }
            Node::Choice(c, a, b) => {
                let (c, a, b) = (self.row(c), self.row(a), self.row(b));
                self.push(Op::Choose(c, a, b))
            }
            Node::Compare(r, a, b) => {
                let (a, b) = (self.row(a), self.row(b));
                self.push(Op::Compare(r, a, b))
            }
            Node::And(a, b) => {
                let (a, b) = (self.row(a), self.row(b));
                self.push(Op::And(a, b))
            }
            Node::Or(a, b) => {
                let (a, b) = (self.row(a), self.row(b));
                self.push(Op::Or(a, b))
            }
            Node::Not(a) => {
                let a = self.row(a);
                self.push(Op::Not(a))
            }
            Node::Constant(_) | Node::Column(_) | Node::Parameter(_) | Node::Predictor(_) => {
                let s = self.scalar(id);
                self.push(Op::Fill(s))
            }
        }
    }

    fn lower_sum(&mut self, constant: f64, terms: &[(Id, Number)]) -> Source {
        let mut scalar_part: Vec<(Id, f64)> = Vec::new();
        let mut column_part: Vec<(Id, f64)> = Vec::new();
        let mut row_part: Vec<(Id, f64)> = Vec::new();
        for &(i, k) in terms {
            if self.graph.is_scalar(i) {
                scalar_part.push((i, k.get()));
            } else if self.keep && self.graph.class(i).is_column() {
                column_part.push((i, k.get()));
            } else {
                row_part.push((i, k.get()));
            }
        }
        // several column-only terms together may be one column
        if column_part.len() > 1 && !row_part.is_empty() {
            let together = self.graph.sum(0.0, &column_part);
            column_part = vec![(together, 1.0)];
        }
        let shift = self.graph.sum(constant, &scalar_part);
        let zero = self.graph.as_constant(shift) == Some(0.0);
        let mut shift = (!zero).then_some(shift);
        let mut acc: Option<Source> = None;
        column_part.extend(row_part);
        // begin with a term of coefficient one, so that a difference costs one operation
        column_part.sort_by_key(|&(i, k)| {
            let (s, _) = self.split(i);
            !(k == 1.0 && self.graph.as_constant(s) == Some(1.0))
        });
        for (i, k) in column_part {
            let (s, r) = self.split(i);
            let s = self.graph.scale(k, s);
            let factor = self.graph.as_constant(s);
            let x = self.row(r);
            acc = Some(match acc {
                None => match (factor, shift.take()) {
                    (Some(1.0), None) => x,
                    (Some(1.0), Some(c)) => {
                        let c = self.scalar(c);
                        self.push(Op::Shift(x, c))
                    }
                    (_, None) => {
                        let s = self.scalar(s);
                        self.push(Op::Scale(x, s))
                    }
                    (_, Some(c)) => {
                        let (s, c) = (self.scalar(s), self.scalar(c));
                        self.push(Op::Affine(x, s, c))
                    }
                },
                Some(a) => match factor {
                    Some(1.0) => self.push(Op::Add(a, x)),
                    Some(-1.0) => self.push(Op::Subtract(a, x)),
                    _ => {
                        let s = self.scalar(s);
                        self.push(Op::AddScaled(a, s, x))
                    }
                },
            });
        }
        match acc {
            Some(a) => a,
            None => {
                let s = self.graph.sum(constant, &scalar_part);
                let s = self.scalar(s);
                self.push(Op::Fill(s))
            }
        }
    }

    fn lower_product(&mut self, id: Id, factors: &[(Id, Number)]) -> Source {
        let (s, r) = self.split(id);
        if r != id {
            let x = self.row(r);
            if self.graph.as_constant(s) == Some(1.0) {
                return x;
            }
            let s = self.scalar(s);
            return self.push(Op::Scale(x, s));
        }
        if let [(base, e)] = *factors {
            let e = e.get();
            let written_out = self.monomials.get(&id).is_some_and(|m| !m.is_empty());
            if !written_out || e == -1.0 {
                let x = self.row(base);
                return self.push(if e == -1.0 {
                    Op::Reciprocal(x)
                } else if e == 2.0 {
                    Op::Multiply(x, x)
                } else {
                    Op::PowerConstant(x, e)
                });
            }
        }
        let units = match self.monomials.get(&id) {
            Some(m) if !m.is_empty() => m.clone(),
            _ => self.units_of(id),
        };
        self.multiply_units(&units)
    }
}

/// Gives virtual registers physical ones, each free again after its last use; each gather runs as soon as its operands are
/// there, so that few registers are alive at once.
fn allocate(program: &mut Program, ops: Vec<Op>, predictors: usize) {
    let total = predictors + ops.len();
    let register = |s: Source| match s {
        Source::Register(r) => Some(r as usize),
        _ => None,
    };
    // time runs in half steps: operation `at` at 2 at, the gathers after it at 2 at + 1
    let mut last: Vec<usize> = vec![0; total];
    let mut gathers: Vec<Vec<usize>> = vec![Vec::new(); ops.len() + 1];
    for (at, op) in ops.iter().enumerate() {
        op.sources().into_iter().filter_map(register).for_each(|r| last[r] = last[r].max(2 * at));
        last[predictors + at] = last[predictors + at].max(2 * at + 1);
    }
    for (i, g) in program.gathers.iter().enumerate() {
        let sources = g.sources();
        // after operation n - 1 is place n; place 0 is before all of them
        let place = sources.iter().filter_map(|&s| register(s)).map(|r| (r + 1).saturating_sub(predictors)).max();
        let place = place.unwrap_or(0);
        gathers[place].push(i);
        for r in sources.into_iter().filter_map(register) {
            last[r] = last[r].max((2 * place).saturating_sub(1));
        }
    }
    program.rows.iter().filter_map(|r| r.source).filter_map(register).for_each(|r| last[r] = usize::MAX);
    let mut ends: HashMap<usize, Vec<usize>> = HashMap::new();
    for (r, &at) in last.iter().enumerate().skip(predictors) {
        ends.entry(at).or_default().push(r);
    }
    let mut place: Vec<u16> = (0..total as u16).collect();
    let mut free: Vec<u16> = Vec::new();
    let mut next = predictors as u16;
    let moved = |place: &[u16], s: Source| match s {
        Source::Register(r) => Source::Register(place[r as usize]),
        other => other,
    };
    let list = std::mem::take(&mut program.gathers);
    let emit = |steps: &mut Vec<Step>, place: &[u16], which: &[usize]| {
        steps.extend(which.iter().map(|&i| Step::Gather(i as u32, list[i].map(|s| moved(place, s)))));
    };
    let mut steps = Vec::with_capacity(ops.len() + list.len());
    emit(&mut steps, &place, &gathers[0]);
    for (at, mut op) in ops.into_iter().enumerate() {
        // the target is taken before this operation's sources are given back: a target is never its own source
        let target = free.pop().unwrap_or_else(|| {
            next += 1;
            next - 1
        });
        op.map(&|s| moved(&place, s));
        place[predictors + at] = target;
        steps.push(Step::Op(target, op));
        emit(&mut steps, &place, &gathers[at + 1]);
        for time in [2 * at, 2 * at + 1] {
            free.extend(ends.get(&time).into_iter().flatten().map(|&r| place[r]));
        }
    }
    for r in &mut program.rows {
        r.source = r.source.map(|s| moved(&place, s));
    }
    program.gathered = list.len();
    program.steps = steps;
    program.registers = next as usize;
}
