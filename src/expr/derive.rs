//! Exact derivatives, by rule, into the same graph. Each (node, variable) is differentiated once.

use super::graph::{Graph, Id, Node, Variable};
use super::{Function, Relation};

impl Graph {
    /// The derivative of a node by a variable. At a tie of `abs`, `min`, `max` or a comparison it is that of one side.
    pub fn derivative(&mut self, id: Id, by: Variable) -> Id {
        if let Some(&known) = self.derivatives.get(&(id, by)) {
            return known;
        }
        let out = if by == Variable::Node(id) { self.constant(1.0) } else { self.differentiate(id, by) };
        self.derivatives.insert((id, by), out);
        out
    }

    /// One comparison for every tie at which the node has a kink: abs at zero, two arguments of min or max alike.
    pub fn ties(&mut self, id: Id) -> Vec<Id> {
        let (mut todo, mut seen, mut out) = (vec![id], vec![id], Vec::new());
        while let Some(id) = todo.pop() {
            let node = self.node(id).clone();
            match &node {
                Node::Call(Function::Abs, a) => {
                    let zero = self.constant(0.0);
                    out.push(self.compare(Relation::Equal, a[0], zero));
                }
                Node::Call(Function::Min | Function::Max, a) => {
                    for (k, &x) in a.iter().enumerate() {
                        for &y in &a[..k] {
                            // a tie counts only where it is the value taken
                            let (same, top) =
                                (self.compare(Relation::Equal, x, y), self.compare(Relation::Equal, x, id));
                            out.push(self.and(same, top));
                        }
                    }
                }
                _ => {}
            }
            for b in self.below(id) {
                if !seen.contains(&b) && !self.class(b).is_fixed() {
                    seen.push(b);
                    todo.push(b);
                }
            }
        }
        out.retain(|&t| !self.class(t).is_fixed());
        out
    }

    fn differentiate(&mut self, id: Id, by: Variable) -> Id {
        let zero = self.constant(0.0);
        if self.class(id).is_fixed() {
            return zero;
        }
        match self.node(id).clone() {
            Node::Constant(_) | Node::Column(_) | Node::Shift(_) => zero,
            Node::Compare(..) | Node::And(..) | Node::Or(..) | Node::Not(_) => zero,
            Node::Parameter(p) => self.constant(f64::from(u8::from(by == Variable::Parameter(p)))),
            Node::Predictor(p) => self.constant(f64::from(u8::from(by == Variable::Predictor(p)))),
            Node::Sum(_, terms) => {
                let parts: Vec<(Id, f64)> = terms.iter().map(|&(i, k)| (self.derivative(i, by), k.get())).collect();
                self.sum(0.0, &parts)
            }
            Node::Product(factors) => {
                let mut parts = Vec::new();
                for (at, &(base, e)) in factors.iter().enumerate() {
                    let d = self.derivative(base, by);
                    if d == zero {
                        continue;
                    }
                    let mut all: Vec<(Id, f64)> = factors.iter().map(|&(i, x)| (i, x.get())).collect();
                    all[at].1 -= 1.0;
                    all.push((d, 1.0));
                    parts.push((self.product(&all), e.get()));
                }
                self.sum(0.0, &parts)
            }
            Node::Power(base, exponent) => {
                let (db, de) = (self.derivative(base, by), self.derivative(exponent, by));
                let mut parts = Vec::new();
                if db != zero {
                    let less = self.sum(-1.0, &[(exponent, 1.0)]);
                    let p = self.power(base, less);
                    parts.push((self.product(&[(exponent, 1.0), (p, 1.0), (db, 1.0)]), 1.0));
                }
                if de != zero {
                    let log = self.call(Function::Log, &[base]);
                    parts.push((self.product(&[(id, 1.0), (log, 1.0), (de, 1.0)]), 1.0));
                }
                self.sum(0.0, &parts)
            }
            Node::Choice(c, a, b) => {
                let (da, db) = (self.derivative(a, by), self.derivative(b, by));
                self.choice(c, da, db)
            }
            Node::Call(function, arguments) => {
                let mut parts = Vec::new();
                for (at, &x) in arguments.iter().enumerate() {
                    let d = self.derivative(x, by);
                    if d == zero {
                        continue;
                    }
                    let outer = self.partial(id, function, &arguments, at);
                    parts.push((self.multiply(outer, d), 1.0));
                }
                self.sum(0.0, &parts)
            }
        }
    }

    /// The derivative of a call by its argument number `at`.
    fn partial(&mut self, id: Id, function: Function, arguments: &[Id], at: usize) -> Id {
        let x = arguments[at];
        let one = |g: &mut Graph| g.constant(1.0);
        match function {
            Function::Exp => id,
            Function::Log => self.product(&[(x, -1.0)]),
            Function::Log1p => {
                let s = self.sum(1.0, &[(x, 1.0)]);
                self.product(&[(s, -1.0)])
            }
            Function::Expm1 => self.call(Function::Exp, &[x]),
            Function::Sqrt => self.product(&[(x, -0.5)]),
            Function::Sin => self.call(Function::Cos, &[x]),
            Function::Cos => {
                let s = self.call(Function::Sin, &[x]);
                self.scale(-1.0, s)
            }
            Function::Tan => {
                let square = self.product(&[(id, 2.0)]);
                self.sum(1.0, &[(square, 1.0)])
            }
            Function::Asin | Function::Acos => {
                let square = self.product(&[(x, 2.0)]);
                let s = self.sum(1.0, &[(square, -1.0)]);
                let root = self.product(&[(s, -0.5)]);
                if function == Function::Asin { root } else { self.scale(-1.0, root) }
            }
            Function::Atan => {
                let square = self.product(&[(x, 2.0)]);
                let s = self.sum(1.0, &[(square, 1.0)]);
                self.product(&[(s, -1.0)])
            }
            Function::Sinh => self.call(Function::Cosh, &[x]),
            Function::Cosh => self.call(Function::Sinh, &[x]),
            Function::Tanh => {
                // 1 / cosh^2, which keeps its digits in the tails
                let c = self.call(Function::Cosh, &[x]);
                self.product(&[(c, -2.0)])
            }
            Function::Logistic => {
                let minus = self.scale(-1.0, x);
                let other = self.call(Function::Logistic, &[minus]);
                self.multiply(id, other)
            }
            Function::Logit => {
                let other = self.sum(1.0, &[(x, -1.0)]);
                self.product(&[(x, -1.0), (other, -1.0)])
            }
            Function::LogLogistic => {
                let p = self.call(Function::Logistic, &[x]);
                self.sum(1.0, &[(p, -1.0)])
            }
            Function::Log1mexp => {
                let e = self.call(Function::Expm1, &[x]);
                self.product(&[(e, -1.0)])
            }
            Function::Lgamma => self.call(Function::Digamma, &[x]),
            Function::Digamma => {
                let first = one(self);
                self.call(Function::Polygamma, &[first, x])
            }
            Function::Polygamma | Function::StirlingInverse | Function::Log1pOver | Function::Log1pExcess => {
                self.next_order(function, arguments, 0, at)
            }
            Function::GammaLogCdf | Function::GammaLogSurvival if at < 2 => self.next_order(function, arguments, 0, at),
            Function::GammaLogCdf | Function::GammaLogSurvival => self.gamma_tail_by_x(id, function, arguments),
            Function::BetaLogCdf => self.beta_tail_by(id, arguments, at),
            Function::LogBesselI0 => self.call(Function::BesselRatio, &[x]),
            // for x >= 0, as the function is used
            Function::LogBesselI0Scaled => {
                let ratio = self.call(Function::BesselRatio, &[x]);
                self.sum(-1.0, &[(ratio, 1.0)])
            }
            Function::BesselRatio => self.call(Function::BesselRatioSlope, &[x]),
            Function::BesselRatioSlope => self.bessel_ratio_curvature(id, x),
            Function::HypergeometricLogSum if at == 1 => self.next_order(function, arguments, 0, at),
            Function::HypergeometricLogMass if at == 2 => self.next_order(function, arguments, 0, at),
            Function::HypergeometricLogTail | Function::LogarithmicLogTail if at == 3 => {
                self.next_order(function, arguments, 1, at)
            }
            Function::NegativeBinomialLogTail if at >= 4 => self.next_order(function, arguments, at - 3, at),
            Function::BetaBinomialLogTail if at >= 5 => self.next_order(function, arguments, at - 4, at),
            // counts, sides and orders are given, never estimated
            Function::HypergeometricLogSum
            | Function::HypergeometricLogMass
            | Function::HypergeometricLogTail
            | Function::NegativeBinomialLogTail
            | Function::BetaBinomialLogTail
            | Function::LogarithmicLogTail
            | Function::NegativeBinomialInformation
            | Function::BetaBinomialInformation => self.constant(f64::NAN),
            Function::Deviance if at == 0 => {
                let (above, below) = (self.call(Function::Log, &[x]), self.call(Function::Log, &[arguments[1]]));
                self.subtract(above, below)
            }
            // as a product, so that zero observed of zero expected counts for nothing
            Function::Deviance => {
                let ratio = self.divide(arguments[0], x);
                self.sum(1.0, &[(ratio, -1.0)])
            }
            Function::FactorialRemainder => {
                let up = self.sum(1.0, &[(x, 1.0)]);
                let (psi, log) = (self.call(Function::Digamma, &[up]), self.call(Function::Log, &[x]));
                self.subtract(psi, log)
            }
            Function::BesselI => {
                // I'_v = I_{v+1} + (v / x) I_v
                let order = arguments[0];
                let next = self.sum(1.0, &[(order, 1.0)]);
                let up = self.call(Function::BesselI, &[next, x]);
                let same = self.product(&[(order, 1.0), (x, -1.0), (id, 1.0)]);
                self.add(up, same)
            }
            Function::Erf | Function::Erfc => {
                let square = self.product(&[(x, 2.0)]);
                let minus = self.scale(-1.0, square);
                let e = self.call(Function::Exp, &[minus]);
                let k = std::f64::consts::FRAC_2_SQRT_PI;
                self.scale(if function == Function::Erf { k } else { -k }, e)
            }
            Function::NormalCdf => {
                let e = self.half_square(x, None);
                self.scale(NORMAL_PEAK, e)
            }
            Function::NormalLogCdf => self.call(Function::InverseMills, &[x]),
            Function::InverseMills => self.call(Function::InverseMillsSlope, &[x]),
            Function::InverseMillsSlope => {
                // m' = -m (x + m), once more
                let m = self.call(Function::InverseMills, &[x]);
                let left = self.add(x, m);
                let first = self.multiply(id, left);
                let second = self.multiply(m, id);
                self.sum(0.0, &[(first, -1.0), (m, -1.0), (second, -1.0)])
            }
            Function::NormalLogInterval => {
                let e = self.half_square(x, Some(id));
                self.scale(if at == 1 { NORMAL_PEAK } else { -NORMAL_PEAK }, e)
            }
            Function::Abs => {
                let zero = self.constant(0.0);
                let below = self.compare(Relation::Less, x, zero);
                let (up, down) = (one(self), self.constant(-1.0));
                self.choice(below, down, up)
            }
            Function::Min | Function::Max => {
                // 1 where this argument is the first to equal the result
                let (yes, no) = (one(self), self.constant(0.0));
                let mut out = yes;
                let mine = self.compare(Relation::Equal, x, id);
                out = self.choice(mine, out, no);
                for &earlier in &arguments[..at] {
                    let same = self.compare(Relation::Equal, earlier, id);
                    out = self.choice(same, no, out);
                }
                out
            }
            // these take their normal form when built and never stand in a graph
            Function::LogSumExp | Function::LogMix => self.constant(f64::NAN),
        }
    }

    /// The same call with the order that stands at `order` one higher. By an order itself nothing is differentiated.
    fn next_order(&mut self, function: Function, arguments: &[Id], order: usize, at: usize) -> Id {
        if at == order {
            return self.constant(f64::NAN);
        }
        let mut next = arguments.to_vec();
        next[order] = self.sum(1.0, &[(arguments[order], 1.0)]);
        self.call(function, &next)
    }

    /// exp(-x^2 / 2 - minus)
    fn half_square(&mut self, x: Id, minus: Option<Id>) -> Id {
        let square = self.product(&[(x, 2.0)]);
        let mut terms = vec![(square, -0.5)];
        terms.extend(minus.map(|m| (m, -1.0)));
        let inside = self.sum(0.0, &terms);
        self.call_plain(Function::Exp, &[inside])
    }
}

/// 1 / sqrt(2 pi)
const NORMAL_PEAK: f64 = 0.398_942_280_401_432_7;
