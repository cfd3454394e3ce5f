//! The expression graph: hash-consed nodes in normal form.
//!
//! Sums are n-ary, flat, with a constant and one coefficient a term; products are n-ary, flat, with one constant
//! exponent a factor. Equal sub-expressions are one node, so comparing two expressions is comparing two [`Id`]s. The
//! constructors of [`Graph`] apply the rules; no other code makes nodes.

use std::collections::HashMap;

use super::{Function, Relation};

/// A node of a [`Graph`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Id(pub(super) u32);

/// A double that can be hashed; -0 is made 0.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) struct Number(u64);

impl Number {
    pub(super) fn new(x: f64) -> Self {
        Number(if x == 0.0 { 0 } else { x.to_bits() })
    }

    pub(super) fn get(self) -> f64 {
        f64::from_bits(self.0)
    }
}

/// What a node is.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub(super) enum Node {
    Constant(Number),
    Column(u32),
    Parameter(u32),
    Predictor(u32),
    /// constant + sum of coefficient * term
    Sum(Number, Box<[(Id, Number)]>),
    /// product of base ^ exponent
    Product(Box<[(Id, Number)]>),
    /// base ^ exponent where the exponent is no constant and the base is not known to be positive
    Power(Id, Id),
    Call(Function, Box<[Id]>),
    /// Largest of the arguments (0 where all are -inf), with derivative zero: the shift of a log-sum-exp, on which
    /// the value does not depend.
    Shift(Box<[Id]>),
    /// condition, value where true, value where false
    Choice(Id, Id, Id),
    Compare(Relation, Id, Id),
    And(Id, Id),
    Or(Id, Id),
    Not(Id),
}

/// What a node depends on.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(super) struct Class(u8);

impl Class {
    pub(super) const NOTHING: Class = Class(0);
    pub(super) const COLUMN: Class = Class(1);
    pub(super) const PARAMETER: Class = Class(2);
    pub(super) const PREDICTOR: Class = Class(4);

    pub(super) fn with(self, other: Class) -> Class {
        Class(self.0 | other.0)
    }

    /// Whether it has one value for all rows.
    pub(super) fn is_scalar(self) -> bool {
        self.0 & 5 == 0
    }

    /// Whether it depends on columns and on nothing that is estimated.
    pub(super) fn is_column(self) -> bool {
        self.0 == 1
    }

    /// Whether it depends on nothing that is estimated.
    pub(super) fn is_fixed(self) -> bool {
        self.0 & 6 == 0
    }
}

/// What is known of the sign of a node, from the data and the ranges of parameters.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Sign {
    /// Any.
    Unknown,
    /// At least zero.
    Nonnegative,
    /// Above zero.
    Positive,
}

impl Sign {
    /// The sign of numbers of which the smallest is `low` (`closed`: which `low` itself may be).
    pub fn of_low(low: f64, closed: bool) -> Sign {
        if low > 0.0 || (low == 0.0 && !closed) {
            Sign::Positive
        } else if low == 0.0 {
            Sign::Nonnegative
        } else {
            Sign::Unknown
        }
    }
}

/// A variable to differentiate by.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Variable {
    /// A parameter: one value for all rows.
    Parameter(u32),
    /// A linear predictor: one value a row.
    Predictor(u32),
    /// Another node, as if it were free.
    Node(Id),
}

/// A growing set of nodes.
#[derive(Debug, Clone, Default)]
pub struct Graph {
    pub(super) nodes: Vec<Node>,
    pub(super) class: Vec<Class>,
    pub(super) sign: Vec<Sign>,
    index: HashMap<Node, Id>,
    column_sign: HashMap<u32, Sign>,
    column_upper: HashMap<u32, f64>,
    parameter_sign: HashMap<u32, Sign>,
    pub(super) derivatives: HashMap<(Id, Variable), Id>,
}

fn is_whole(x: f64) -> bool {
    x == x.trunc() && x.abs() < 1e9
}

impl Graph {
    /// An empty graph.
    pub fn new() -> Self {
        Self::default()
    }

    /// Tells the sign of a column, before it is used.
    pub fn set_column_sign(&mut self, column: u32, sign: Sign) {
        self.column_sign.insert(column, sign);
    }

    /// Tells sign and largest value of a column from its values, before it is used.
    pub fn describe_column(&mut self, column: u32, values: &[f64]) {
        if let Some(&first) = values.first() {
            let (low, high) = values.iter().fold((first, first), |(l, h), &x| (l.min(x), h.max(x)));
            self.set_column_sign(column, Sign::of_low(low, true));
            self.column_upper.insert(column, high);
        }
    }

    pub(super) fn column_upper(&self, column: u32) -> f64 {
        self.column_upper.get(&column).copied().unwrap_or(f64::INFINITY)
    }

    /// Tells the sign of a parameter, before it is used.
    pub fn set_parameter_sign(&mut self, parameter: u32, sign: Sign) {
        self.parameter_sign.insert(parameter, sign);
    }

    pub(super) fn node(&self, id: Id) -> &Node {
        &self.nodes[id.0 as usize]
    }

    pub(super) fn class(&self, id: Id) -> Class {
        self.class[id.0 as usize]
    }

    /// What is known of the sign of a node.
    pub fn sign(&self, id: Id) -> Sign {
        self.sign[id.0 as usize]
    }

    /// The value of a node that is a constant.
    pub fn as_constant(&self, id: Id) -> Option<f64> {
        match self.node(id) {
            Node::Constant(x) => Some(x.get()),
            _ => None,
        }
    }

    /// Whether the node is the same for all rows.
    pub fn is_scalar(&self, id: Id) -> bool {
        self.class(id).is_scalar()
    }

    /// Whether the node depends on no parameter and no predictor.
    pub fn is_fixed(&self, id: Id) -> bool {
        self.class(id).is_fixed()
    }

    fn intern(&mut self, node: Node) -> Id {
        if let Some(&id) = self.index.get(&node) {
            return id;
        }
        let class = self.classify(&node);
        let sign = self.sign_of(&node);
        let id = Id(self.nodes.len() as u32);
        self.nodes.push(node.clone());
        self.class.push(class);
        self.sign.push(sign);
        self.index.insert(node, id);
        id
    }

    fn classify(&self, node: &Node) -> Class {
        let all = |ids: &[Id]| ids.iter().fold(Class::NOTHING, |c, &i| c.with(self.class(i)));
        let pairs = |t: &[(Id, Number)]| t.iter().fold(Class::NOTHING, |c, &(i, _)| c.with(self.class(i)));
        match node {
            Node::Constant(_) => Class::NOTHING,
            Node::Column(_) => Class::COLUMN,
            Node::Parameter(_) => Class::PARAMETER,
            Node::Predictor(_) => Class::PREDICTOR,
            Node::Sum(_, t) | Node::Product(t) => pairs(t),
            Node::Call(_, a) | Node::Shift(a) => all(a),
            Node::Choice(c, a, b) => all(&[*c, *a, *b]),
            Node::Power(a, b) | Node::Compare(_, a, b) | Node::And(a, b) | Node::Or(a, b) => all(&[*a, *b]),
            Node::Not(a) => self.class(*a),
        }
    }

    fn sign_of(&self, node: &Node) -> Sign {
        use Sign::{Nonnegative, Positive, Unknown};
        match node {
            Node::Constant(x) => Sign::of_low(x.get(), true),
            Node::Column(c) => self.column_sign.get(c).copied().unwrap_or(Unknown),
            Node::Parameter(p) => self.parameter_sign.get(p).copied().unwrap_or(Unknown),
            Node::Predictor(_) => Unknown,
            Node::Sum(c, t) => {
                if c.get() < 0.0 || t.iter().any(|&(i, k)| k.get() < 0.0 || self.sign(i) == Unknown) {
                    Unknown
                } else if c.get() > 0.0 || t.iter().any(|&(i, _)| self.sign(i) == Positive) {
                    Positive
                } else {
                    Nonnegative
                }
            }
            Node::Product(t) => t.iter().fold(Positive, |s, &(i, e)| {
                let even = is_whole(e.get() / 2.0);
                let root = !is_whole(e.get());
                s.min(match self.sign(i) {
                    Unknown if even || root => Nonnegative,
                    other => other,
                })
            }),
            Node::Power(b, _) => {
                if self.sign(*b) == Unknown {
                    Unknown
                } else {
                    Nonnegative
                }
            }
            Node::Call(f, a) => match f {
                Function::Exp
                | Function::Cosh
                | Function::Logistic
                | Function::NormalCdf
                | Function::Erfc
                | Function::InverseMills
                | Function::BesselRatioSlope => Positive,
                Function::Abs | Function::Deviance | Function::FactorialRemainder | Function::LogBesselI0 => {
                    Nonnegative
                }
                // completely monotone: signs of the derivatives alternate
                Function::Log1pOver | Function::Log1pExcess => match self.as_constant(a[0]) {
                    Some(order) if is_whole(order / 2.0) => Positive,
                    _ => Unknown,
                },
                Function::StirlingInverse if self.as_constant(a[0]) == Some(0.0) => Nonnegative,
                Function::Min | Function::Max => {
                    let signs = a.iter().map(|&i| self.sign(i));
                    if *f == Function::Min { signs.min() } else { signs.max() }.unwrap_or(Unknown)
                }
                Function::Expm1
                | Function::Log1p
                | Function::Sinh
                | Function::Tanh
                | Function::Erf
                | Function::BesselRatio
                | Function::Atan => self.sign(a[0]),
                _ => Unknown,
            },
            Node::Choice(_, a, b) => self.sign(*a).min(self.sign(*b)),
            Node::Compare(..) | Node::And(..) | Node::Or(..) | Node::Not(_) => Nonnegative,
            Node::Shift(_) => Unknown,
        }
    }

    /// A number.
    pub fn constant(&mut self, x: f64) -> Id {
        self.intern(Node::Constant(Number::new(x)))
    }

    /// A column of the data.
    pub fn column(&mut self, index: u32) -> Id {
        self.intern(Node::Column(index))
    }

    /// A parameter.
    pub fn parameter(&mut self, index: u32) -> Id {
        self.intern(Node::Parameter(index))
    }

    /// A linear predictor.
    pub fn predictor(&mut self, index: u32) -> Id {
        self.intern(Node::Predictor(index))
    }

    /// constant + sum of coefficient * term.
    pub fn sum(&mut self, constant: f64, terms: &[(Id, f64)]) -> Id {
        let mut total = constant;
        let mut flat: Vec<(Id, f64)> = Vec::with_capacity(terms.len());
        for &(id, k) in terms {
            match self.node(id) {
                Node::Constant(x) => total += k * x.get(),
                Node::Sum(c, inner) => {
                    total += k * c.get();
                    flat.extend(inner.iter().map(|&(i, m)| (i, k * m.get())));
                }
                _ => flat.push((id, k)),
            }
        }
        flat.sort_by_key(|t| t.0);
        let mut merged: Vec<(Id, f64)> = Vec::with_capacity(flat.len());
        for (id, k) in flat {
            match merged.last_mut() {
                Some(last) if last.0 == id => last.1 += k,
                _ => merged.push((id, k)),
            }
        }
        merged.retain(|t| t.1 != 0.0);
        if merged.is_empty() {
            return self.constant(total);
        }
        if let [(only, k)] = merged[..] {
            if total == 0.0 && k == 1.0 {
                return only;
            }
            // 1 + (exp(x) - 1)
            if total == 1.0
                && k == 1.0
                && let Node::Call(Function::Expm1, a) = self.node(only)
            {
                let x = a[0];
                return self.call(Function::Exp, &[x]);
            }
        }
        let terms = merged.into_iter().map(|(i, k)| (i, Number::new(k))).collect();
        self.intern(Node::Sum(Number::new(total), terms))
    }

    /// a + b.
    pub fn add(&mut self, a: Id, b: Id) -> Id {
        self.sum(0.0, &[(a, 1.0), (b, 1.0)])
    }

    /// a - b.
    pub fn subtract(&mut self, a: Id, b: Id) -> Id {
        self.sum(0.0, &[(a, 1.0), (b, -1.0)])
    }

    /// k a.
    pub fn scale(&mut self, k: f64, a: Id) -> Id {
        self.sum(0.0, &[(a, k)])
    }

    /// a b.
    pub fn multiply(&mut self, a: Id, b: Id) -> Id {
        self.product(&[(a, 1.0), (b, 1.0)])
    }

    /// a / b.
    pub fn divide(&mut self, a: Id, b: Id) -> Id {
        self.product(&[(a, 1.0), (b, -1.0)])
    }

    /// Product of base ^ exponent.
    pub fn product(&mut self, factors: &[(Id, f64)]) -> Id {
        let (mut scale, mut zero) = (1.0, false);
        let mut flat: Vec<(Id, f64)> = Vec::with_capacity(factors.len());
        let mut todo: Vec<(Id, f64)> = factors.iter().rev().copied().collect();
        while let Some((id, e)) = todo.pop() {
            if e == 0.0 {
                continue;
            }
            match self.node(id) {
                Node::Constant(x) => {
                    let x = power(x.get(), e);
                    zero |= x == 0.0;
                    scale *= x;
                }
                Node::Sum(c, t) if c.get() == 0.0 && t.len() == 1 && (is_whole(e) || t[0].1.get() > 0.0) => {
                    scale *= power(t[0].1.get(), e);
                    todo.push((t[0].0, e));
                }
                Node::Product(inner) => {
                    let split = is_whole(e) || inner.iter().all(|&(i, _)| self.sign(i) != Sign::Unknown);
                    if split {
                        todo.extend(inner.iter().map(|&(i, m)| (i, m.get() * e)));
                    } else {
                        flat.push((id, e));
                    }
                }
                _ => flat.push((id, e)),
            }
        }
        if scale == 0.0 || zero {
            return self.constant(0.0);
        }
        flat.sort_by_key(|t| t.0);
        let mut merged: Vec<(Id, f64)> = Vec::with_capacity(flat.len());
        for (id, e) in flat {
            match merged.last_mut() {
                Some(last) if last.0 == id => last.1 += e,
                _ => merged.push((id, e)),
            }
        }
        merged.retain(|t| t.1 != 0.0);
        if merged.is_empty() {
            return self.constant(scale);
        }
        if let Some(done) = self.expand_log_odds(scale, &merged) {
            return done;
        }
        let body = match merged[..] {
            [(only, 1.0)] => only,
            _ => {
                let boxed = merged.into_iter().map(|(i, e)| (i, Number::new(e))).collect();
                self.intern(Node::Product(boxed))
            }
        };
        if scale == 1.0 { body } else { self.scale(scale, body) }
    }

    /// (columns) * log_logistic(x) is multiplied out, so that y log p + (n - y) log(1 - p) becomes y x + n log(1 - p).
    fn expand_log_odds(&mut self, scale: f64, factors: &[(Id, f64)]) -> Option<Id> {
        let [(a, 1.0), (b, 1.0)] = *factors else { return None };
        let is_odds = |g: &Graph, id: Id| match g.node(id) {
            Node::Call(Function::LogLogistic, _) => true,
            Node::Sum(_, t) => t.iter().any(|&(i, _)| matches!(g.node(i), Node::Call(Function::LogLogistic, _))),
            _ => false,
        };
        let is_columns =
            |g: &Graph, id: Id| g.class(id).is_column() && matches!(g.node(id), Node::Sum(..) | Node::Column(_));
        let (odds, columns) = if is_odds(self, a) && is_columns(self, b) {
            (a, b)
        } else if is_odds(self, b) && is_columns(self, a) {
            (b, a)
        } else {
            return None;
        };
        let parts = |g: &Graph, id: Id| match g.node(id) {
            Node::Sum(c, t) => (c.get(), t.iter().map(|&(i, k)| (i, k.get())).collect()),
            _ => (0.0, vec![(id, 1.0)]),
        };
        let (c0, left) = parts(self, columns);
        let (d0, right) = parts(self, odds);
        if left.len() == 1 && right.len() == 1 && c0 == 0.0 && d0 == 0.0 {
            return None;
        }
        let mut terms = Vec::new();
        for &(i, k) in &right {
            terms.push((i, scale * c0 * k));
            for &(j, m) in &left {
                let both = [(i.min(j), Number::new(1.0)), (i.max(j), Number::new(1.0))];
                let pair = self.intern(Node::Product(Box::new(both)));
                terms.push((pair, scale * k * m));
            }
        }
        terms.extend(left.iter().map(|&(j, m)| (j, scale * d0 * m)));
        Some(self.sum(scale * c0 * d0, &terms))
    }

    /// base ^ exponent.
    pub fn power(&mut self, base: Id, exponent: Id) -> Id {
        if let Some(e) = self.as_constant(exponent) {
            return self.product(&[(base, e)]);
        }
        if self.sign(base) == Sign::Positive {
            let log = self.call(Function::Log, &[base]);
            let body = self.multiply(exponent, log);
            return self.call(Function::Exp, &[body]);
        }
        self.intern(Node::Power(base, exponent))
    }

    /// The shift of a log-sum-exp over these.
    pub(super) fn shift(&mut self, of: &[Id]) -> Id {
        if of.iter().all(|&i| self.class(i) == Class::NOTHING) {
            let top = of.iter().filter_map(|&i| self.as_constant(i)).fold(f64::NEG_INFINITY, f64::max);
            return self.constant(if top == f64::NEG_INFINITY { 0.0 } else { top });
        }
        self.intern(Node::Shift(of.into()))
    }

    /// log(sum of weight * exp(log)), safe for any size of the logs.
    pub fn log_mix(&mut self, parts: &[(Id, Id)]) -> Id {
        let logs: Vec<Id> = parts.iter().map(|p| p.1).collect();
        let shift = self.shift(&logs);
        let terms: Vec<(Id, f64)> = parts
            .iter()
            .map(|&(w, a)| {
                let below = self.subtract(a, shift);
                let e = self.call(Function::Exp, &[below]);
                (self.multiply(w, e), 1.0)
            })
            .collect();
        let total = self.sum(0.0, &terms);
        let log = self.call(Function::Log, &[total]);
        self.add(shift, log)
    }

    /// where(condition, a, b).
    pub fn choice(&mut self, condition: Id, a: Id, b: Id) -> Id {
        if let Some(c) = self.as_constant(condition) {
            return if c != 0.0 { a } else { b };
        }
        if a == b {
            return a;
        }
        self.intern(Node::Choice(condition, a, b))
    }

    /// A comparison: 1 or 0.
    pub fn compare(&mut self, relation: Relation, a: Id, b: Id) -> Id {
        if let (Some(x), Some(y)) = (self.as_constant(a), self.as_constant(b)) {
            return self.constant(f64::from(u8::from(relation.holds(x, y))));
        }
        self.intern(Node::Compare(relation, a, b))
    }

    /// Both hold.
    pub fn and(&mut self, a: Id, b: Id) -> Id {
        match (self.as_constant(a), self.as_constant(b)) {
            (Some(x), _) => {
                if x != 0.0 {
                    b
                } else {
                    a
                }
            }
            (_, Some(y)) => {
                if y != 0.0 {
                    a
                } else {
                    b
                }
            }
            _ => self.intern(Node::And(a, b)),
        }
    }

    /// One holds at least.
    pub fn or(&mut self, a: Id, b: Id) -> Id {
        match (self.as_constant(a), self.as_constant(b)) {
            (Some(x), _) => {
                if x != 0.0 {
                    a
                } else {
                    b
                }
            }
            (_, Some(y)) => {
                if y != 0.0 {
                    b
                } else {
                    a
                }
            }
            _ => self.intern(Node::Or(a, b)),
        }
    }

    /// It does not hold.
    pub fn not(&mut self, a: Id) -> Id {
        match self.as_constant(a) {
            Some(x) => self.constant(f64::from(u8::from(x == 0.0))),
            None => self.intern(Node::Not(a)),
        }
    }

    pub(super) fn call_plain(&mut self, function: Function, arguments: &[Id]) -> Id {
        if arguments.iter().all(|&i| matches!(self.node(i), Node::Constant(_))) {
            let values: Vec<f64> = arguments.iter().filter_map(|&i| self.as_constant(i)).collect();
            return self.constant(function.value(&values));
        }
        self.intern(Node::Call(function, arguments.into()))
    }
}

pub(super) fn power(x: f64, e: f64) -> f64 {
    if e == 1.0 {
        x
    } else if e == -1.0 {
        1.0 / x
    } else if e == 2.0 {
        x * x
    } else if e == 0.5 {
        x.sqrt()
    } else if e == -0.5 {
        1.0 / x.sqrt()
    } else if is_whole(e) && e.abs() <= 64.0 {
        // by squaring, the same on every machine
        let (mut base, mut n, mut out) = (x, e.abs() as u32, 1.0);
        while n > 0 {
            if n & 1 == 1 {
                out *= base;
            }
            base *= base;
            n >>= 1;
        }
        if e < 0.0 { 1.0 / out } else { out }
    } else {
        libm::pow(x, e)
    }
}

impl Relation {
    /// Whether `x relation y`.
    pub fn holds(self, x: f64, y: f64) -> bool {
        match self {
            Relation::Less => x < y,
            Relation::AtMost => x <= y,
            Relation::More => x > y,
            Relation::AtLeast => x >= y,
            Relation::Equal => x == y,
            Relation::Unequal => x != y,
        }
    }
}
