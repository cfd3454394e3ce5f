//! The rules by which calls take their normal form. Each is exact on the domain of the call; where a rule needs to know a
//! sign, it asks [`Graph::sign`].

use super::Function;
use super::graph::{Graph, Id, Node, Sign};

impl Graph {
    /// A call, in normal form.
    pub fn call(&mut self, function: Function, arguments: &[Id]) -> Id {
        let x = arguments[0];
        match function {
            Function::Sqrt => self.product(&[(x, 0.5)]),
            Function::Log => self.log(x),
            Function::Exp => self.exp(x),
            Function::Log1p => self.log1p(x),
            Function::Logit => match self.node(x) {
                Node::Call(Function::Logistic, a) => a[0],
                _ => self.call_plain(function, arguments),
            },
            Function::Logistic => match self.node(x) {
                Node::Call(Function::Logit, a) => a[0],
                _ => self.call_plain(function, arguments),
            },
            Function::LogLogistic => self.log_logistic(x),
            Function::Deviance => self.deviance(x, arguments[1]),
            Function::FactorialRemainder => self.factorial_remainder(x),
            Function::LogSumExp => {
                let one = self.constant(1.0);
                let parts: Vec<(Id, Id)> = arguments.iter().map(|&a| (one, a)).collect();
                if let [(_, only)] = parts[..] { only } else { self.log_mix(&parts) }
            }
            Function::LogMix => {
                let parts: Vec<(Id, Id)> = arguments.chunks_exact(2).map(|p| (p[0], p[1])).collect();
                self.log_mix(&parts)
            }
            Function::Min | Function::Max if arguments.len() == 1 => x,
            Function::Abs if self.sign(x) != Sign::Unknown => x,
            _ => self.call_plain(function, arguments),
        }
    }

    fn log(&mut self, x: Id) -> Id {
        match self.node(x).clone() {
            Node::Call(Function::Exp, a) => return a[0],
            Node::Call(Function::Logistic, a) => return self.call(Function::LogLogistic, &a),
            Node::Call(Function::NormalCdf, a) => return self.call(Function::NormalLogCdf, &a),
            Node::Sum(c, t) if t.len() == 1 => {
                let (inner, k) = (t[0].0, t[0].1.get());
                match (self.node(inner).clone(), c.get(), k) {
                    // log(1 - p) of a probability that is itself a function
                    (Node::Call(Function::Logistic | Function::NormalCdf, _), 1.0, -1.0) => {
                        let minus = self.scale(-1.0, inner);
                        return self.log1p(minus);
                    }
                    // log(-(exp(-u) - 1))
                    (Node::Call(Function::Expm1, a), 0.0, -1.0) => {
                        let u = self.scale(-1.0, a[0]);
                        return self.call(Function::Log1mexp, &[u]);
                    }
                    (_, 0.0, k) if k > 0.0 => {
                        let rest = self.log(inner);
                        return self.sum(libm::log(k), &[(rest, 1.0)]);
                    }
                    _ => {}
                }
            }
            Node::Product(f) => {
                // positive factors come out; what is left keeps the domain
                let (out, left): (Vec<_>, Vec<_>) = f.iter().partition(|&&(i, e)| {
                    self.sign(i) == Sign::Positive || (self.sign(i) == Sign::Nonnegative && e.get() > 0.0)
                });
                if !out.is_empty() && (left.is_empty() || out.iter().all(|&&(i, _)| self.sign(i) == Sign::Positive)) {
                    let mut terms: Vec<(Id, f64)> = out.iter().map(|&&(i, e)| (self.log(i), e.get())).collect();
                    if !left.is_empty() {
                        let rest: Vec<(Id, f64)> = left.iter().map(|&&(i, e)| (i, e.get())).collect();
                        let rest = self.product(&rest);
                        terms.push((self.log(rest), 1.0));
                    }
                    return self.sum(0.0, &terms);
                }
            }
            _ => {}
        }
        self.call_plain(Function::Log, &[x])
    }

    fn exp(&mut self, x: Id) -> Id {
        // exp(k log b + rest) = b^k exp(rest)
        let terms: Vec<(Id, f64)> = match self.node(x) {
            Node::Sum(_, t) => t.iter().map(|&(i, k)| (i, k.get())).collect(),
            _ => vec![(x, 1.0)],
        };
        let logs: Vec<(Id, f64, Id)> = terms
            .iter()
            .filter_map(|&(i, k)| match self.node(i) {
                Node::Call(Function::Log, a) if self.sign(a[0]) != Sign::Unknown => Some((i, k, a[0])),
                _ => None,
            })
            .collect();
        if logs.is_empty() {
            return self.call_plain(Function::Exp, &[x]);
        }
        let mut rest = vec![(x, 1.0)];
        rest.extend(logs.iter().map(|&(i, k, _)| (i, -k)));
        let rest = self.sum(0.0, &rest);
        let rest = self.call_plain(Function::Exp, &[rest]);
        let mut factors: Vec<(Id, f64)> = logs.iter().map(|&(_, k, b)| (b, k)).collect();
        factors.push((rest, 1.0));
        self.product(&factors)
    }

    fn log1p(&mut self, x: Id) -> Id {
        match self.node(x).clone() {
            Node::Call(Function::Expm1, a) => return a[0],
            Node::Sum(c, t) if t.len() == 1 && c.get() == 0.0 && t[0].1.get() == -1.0 => {
                match self.node(t[0].0).clone() {
                    Node::Call(Function::Logistic, a) => {
                        let minus = self.scale(-1.0, a[0]);
                        return self.call(Function::LogLogistic, &[minus]);
                    }
                    Node::Call(Function::NormalCdf, a) => {
                        let minus = self.scale(-1.0, a[0]);
                        return self.call(Function::NormalLogCdf, &[minus]);
                    }
                    _ => {}
                }
            }
            _ => {}
        }
        self.call_plain(Function::Log1p, &[x])
    }

    fn log_logistic(&mut self, x: Id) -> Id {
        // one of the two signs is canonical: log_logistic(-x) = log_logistic(x) - x
        let negative = match self.node(x) {
            Node::Sum(_, t) => t[0].1.get() < 0.0,
            _ => false,
        };
        if negative {
            let minus = self.scale(-1.0, x);
            let inner = self.call_plain(Function::LogLogistic, &[minus]);
            return self.add(inner, x);
        }
        self.call_plain(Function::LogLogistic, &[x])
    }
}
