//! Normal forms of the functions that log masses of counts are written in.
//!
//! `deviance(x, m)` and `factorial_remainder(x)` lose no digits at large counts, but they hide what a sum over rows needs to know:
//! that l is linear in log(m), and that the logarithm of a probability near 0 or 1 is exact where the probability is not. For
//! small counts the plain form loses nothing, so it takes their place.

use super::Function;
use super::graph::{Graph, Id, Node, Sign};

/// Largest count that counts as small: x log(x) is below 7,000 there, and its rounding below 1e-12.
const SMALL: f64 = 1_000.0;

impl Graph {
    /// An upper bound of a node, from what is known of columns; infinite where nothing is.
    fn upper(&self, id: Id) -> f64 {
        match self.node(id) {
            Node::Constant(x) => x.get(),
            Node::Column(c) => self.column_upper(*c),
            Node::Sum(c, terms) => terms.iter().fold(c.get(), |sum, &(i, k)| {
                sum + if k.get() > 0.0 {
                    k.get() * self.upper(i)
                } else if self.sign(i) == Sign::Unknown {
                    f64::INFINITY
                } else {
                    0.0
                }
            }),
            _ => f64::INFINITY,
        }
    }

    fn columns(&self, id: Id, out: &mut Vec<u32>) {
        match self.node(id) {
            Node::Column(c) => out.push(*c),
            Node::Sum(_, t) | Node::Product(t) => t.iter().for_each(|&(i, _)| self.columns(i, out)),
            Node::Call(_, a) => a.iter().for_each(|&i| self.columns(i, out)),
            Node::Power(a, b) => [*a, *b].iter().for_each(|&i| self.columns(i, out)),
            _ => {}
        }
    }

    /// Whether a node is a small count known before the fit.
    fn is_small_count(&self, x: Id) -> bool {
        self.is_fixed(x) && self.as_constant(x).is_none() && self.upper(x) <= SMALL
    }

    /// x log(x)
    fn entropy(&mut self, x: Id) -> Id {
        let log = self.call(Function::Log, &[x]);
        self.multiply(x, log)
    }

    /// `deviance(x, m)`: for small counts whose expectation does not depend on them, x log(x) - x log(m) - x + m.
    pub(super) fn deviance(&mut self, x: Id, m: Id) -> Id {
        let (mut of_x, mut of_m) = (Vec::new(), Vec::new());
        self.columns(x, &mut of_x);
        self.columns(m, &mut of_m);
        let own = of_x.iter().any(|c| !of_m.contains(c));
        let exact = self.without_complement(m);
        if self.is_small_count(x) && own && !self.is_fixed(m) {
            let (own, log) = (self.entropy(x), self.call(Function::Log, &[exact]));
            let cross = self.multiply(x, log);
            return self.sum(0.0, &[(own, 1.0), (cross, -1.0), (x, -1.0), (m, 1.0)]);
        }
        self.call_plain(Function::Deviance, &[x, exact])
    }

    /// `factorial_remainder(x)`: for small counts lgamma(x + 1) - x log(x) + x.
    pub(super) fn factorial_remainder(&mut self, x: Id) -> Id {
        if !self.is_small_count(x) {
            return self.call_plain(Function::FactorialRemainder, &[x]);
        }
        let next = self.sum(1.0, &[(x, 1.0)]);
        let (gamma, own) = (self.call(Function::Lgamma, &[next]), self.entropy(x));
        self.sum(0.0, &[(gamma, 1.0), (own, -1.0), (x, 1.0)])
    }

    /// c - c p of a probability that is itself a function as c times the function that it is, which is exact near 0; factor by
    /// factor of a product.
    fn without_complement(&mut self, m: Id) -> Id {
        match self.node(m).clone() {
            Node::Product(factors) => {
                let parts: Vec<(Id, f64)> =
                    factors.iter().map(|&(i, e)| (self.without_complement(i), e.get())).collect();
                self.product(&parts)
            }
            Node::Sum(c, t) if t.len() == 1 => {
                let (inner, k) = (t[0].0, t[0].1.get());
                match self.node(inner).clone() {
                    Node::Call(f @ (Function::Logistic | Function::NormalCdf), a) if k == -c.get() => {
                        let minus = self.scale(-1.0, a[0]);
                        let other = self.call(f, &[minus]);
                        self.scale(c.get(), other)
                    }
                    // 1 - (1 - exp(-u)), the complement of the complementary log-log
                    Node::Call(Function::Expm1, a) if k == c.get() => {
                        let e = self.call(Function::Exp, &[a[0]]);
                        self.scale(c.get(), e)
                    }
                    _ => m,
                }
            }
            _ => m,
        }
    }
}
