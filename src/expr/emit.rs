//! Operations for the block of each node: what is a column already, what is worth keeping as one, and the rest.

use super::Function;
use super::graph::{Id, Node, Number};
use super::lower::Lower;
use super::program::{Argument, Op, Source};

impl Lower<'_> {
    pub(super) fn push(&mut self, op: Op) -> Source {
        // virtual registers come after those of the predictors
        let at = self.predictors + self.ops.len();
        self.ops.push(op);
        Source::Register(at as u16)
    }

    pub(super) fn is_leaf(&self, id: Id) -> bool {
        match self.graph.node(id) {
            Node::Column(_) | Node::Predictor(_) => true,
            _ => self.keep && self.graph.class(id).is_column() && self.worth_keeping(id),
        }
    }

    /// Whether a column-only node costs more to compute in each pass than to load.
    pub(super) fn worth_keeping(&self, id: Id) -> bool {
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
    pub(super) fn row(&mut self, id: Id) -> Source {
        if let Some(&s) = self.done.get(&id) {
            return s;
        }
        let out = self.lower_row(id);
        self.done.insert(id, out);
        out
    }

    pub(super) fn lower_row(&mut self, id: Id) -> Source {
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
            Node::Call(Function::Deviance, a) => {
                let s = all(self, &a);
                self.push(Op::Deviance(s[0], s[1]))
            }
            Node::Call(f, a) if a.len() == 1 => {
                let x = self.row(a[0]);
                self.push(Op::Call1(f, x))
            }
            Node::Call(f, a) => {
                let arguments = a.iter().map(|&i| {
                    if self.graph.is_scalar(i) { Argument::Scalar(self.scalar(i)) } else { Argument::Row(self.row(i)) }
                });
                let arguments = arguments.collect();
                self.push(Op::Call(f, arguments))
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

    pub(super) fn lower_sum(&mut self, constant: f64, terms: &[(Id, Number)]) -> Source {
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

    pub(super) fn lower_product(&mut self, id: Id, factors: &[(Id, Number)]) -> Source {
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
