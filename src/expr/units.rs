//! Row products as lists of factors: powers written out, pairs that several products share multiplied once, and the sums over
//! rows that end them.

use std::collections::HashMap;

use super::Function;
use super::graph::{Graph, Id, Node, Sign};
use super::lower::{Lower, Unit};
use super::program::{Gather, Op, Source};

impl Lower<'_> {
    /// The factors of a product, powers written out; what is no product is one factor.
    pub(super) fn units_of(&mut self, id: Id) -> Vec<Unit> {
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
    pub(super) fn collect(&mut self, id: Id) {
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

    pub(super) fn sum_units(&mut self, product: Id) -> Vec<Unit> {
        let mut units = if self.graph.as_constant(product) == Some(1.0) { Vec::new() } else { self.units_of(product) };
        if self.weighted {
            units.push(Unit::Weight);
            units.sort();
        }
        units
    }

    /// Replaces the pair that most lists share by one unit, until no pair is shared.
    pub(super) fn share_pairs(&mut self, lists: &mut [Vec<Unit>]) {
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

    pub(super) fn gather(&mut self, units: &[Unit]) -> Gather {
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

    pub(super) fn multiply_units(&mut self, units: &[Unit]) -> Source {
        let mut acc = self.unit(units[0]);
        for (at, &u) in units.iter().enumerate().skip(1) {
            let risky = self.needs_zero(&units[..at], &[u]);
            let next = self.unit(u);
            acc = self.push(if risky { Op::MultiplyZero(acc, next) } else { Op::Multiply(acc, next) });
        }
        acc
    }

    /// Whether zero times infinity may meet in the product of the two lists.
    pub(super) fn needs_zero(&self, a: &[Unit], b: &[Unit]) -> bool {
        let risky = |l: &[Unit]| l.iter().any(|&u| self.may_be_infinite(u));
        let zero = |l: &[Unit]| l.iter().any(|&u| self.may_be_zero(u));
        (risky(a) && zero(b)) || (risky(b) && zero(a))
    }

    pub(super) fn may_be_infinite(&self, unit: Unit) -> bool {
        match unit {
            Unit::Weight => false,
            Unit::Pair(p) => {
                let (a, b) = self.pairs[p as usize];
                self.may_be_infinite(a) || self.may_be_infinite(b)
            }
            Unit::Node(id) => match self.graph.node(id) {
                Node::Call(Function::Log, a) => self.graph.sign(a[0]) != Sign::Positive,
                Node::Call(
                    Function::Log1p
                    | Function::Logit
                    | Function::GammaLogCdf
                    | Function::GammaLogSurvival
                    | Function::BetaLogCdf,
                    _,
                ) => true,
                Node::Call(Function::Deviance, a) => self.graph.sign(a[1]) != Sign::Positive,
                Node::Product(f) => f.iter().any(|&(i, e)| {
                    (e.get() < 0.0 && self.graph.sign(i) != Sign::Positive) || self.may_be_infinite(Unit::Node(i))
                }),
                Node::Sum(_, t) => t.iter().any(|&(i, _)| self.may_be_infinite(Unit::Node(i))),
                _ => false,
            },
        }
    }

    pub(super) fn may_be_zero(&self, unit: Unit) -> bool {
        match unit {
            Unit::Weight => false,
            Unit::Pair(p) => {
                let (a, b) = self.pairs[p as usize];
                self.may_be_zero(a) || self.may_be_zero(b)
            }
            Unit::Node(id) => self.graph.sign(id) != Sign::Positive,
        }
    }

    pub(super) fn unit(&mut self, unit: Unit) -> Source {
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
}
