//! Derivatives of the distribution functions whose shapes have nodes of their own: in the argument, in closed form.

use super::graph::{Graph, Id};
use super::{Function, Relation};

impl Graph {
    /// The derivative by x of the order-th derivative in a of log P(a, x) or log Q(a, x).
    ///
    /// h = d/dx log P is exp(log density - log P); with l the derivative of the log density in a, that in a is h (l - d/da log P),
    /// and once more. Of Q it is the same with the other sign.
    pub(super) fn gamma_tail_by_x(&mut self, id: Id, function: Function, arguments: &[Id]) -> Id {
        let &[order, a, x] = arguments else { return self.constant(f64::NAN) };
        let tail: Vec<Id> = (0..3)
            .map(|m| {
                let m = self.constant(f64::from(m));
                self.call(function, &[m, a, x])
            })
            .collect();
        // log density = log a - log x - deviance(a, x) - factorial_remainder(a)
        let deviance = self.call(Function::Deviance, &[a, x]);
        let remainder = self.call(Function::FactorialRemainder, &[a]);
        let inside = self.sum(0.0, &[(deviance, -1.0), (remainder, -1.0), (tail[0], -1.0)]);
        let e = self.call_plain(Function::Exp, &[inside]);
        let sign = if function == Function::GammaLogCdf { 1.0 } else { -1.0 };
        let hazard = self.product(&[(a, 1.0), (x, -1.0), (e, 1.0)]);
        let hazard = self.scale(sign, hazard);
        let (log, psi) = (self.call(Function::Log, &[x]), self.call(Function::Digamma, &[a]));
        let slope = self.sum(0.0, &[(log, 1.0), (psi, -1.0), (tail[1], -1.0)]);
        let factor = match self.as_constant(order) {
            Some(0.0) => return hazard,
            Some(1.0) => slope,
            Some(2.0) => {
                let one = self.constant(1.0);
                let (square, psi) = (self.product(&[(slope, 2.0)]), self.call(Function::Polygamma, &[one, a]));
                self.sum(0.0, &[(square, 1.0), (psi, -1.0), (id, -1.0)])
            }
            _ => return self.constant(f64::NAN),
        };
        self.multiply(hazard, factor)
    }

    /// The derivative of log I_x(a, b), i times differentiated in a and j times in b, by the argument `at`: by a and b one order
    /// more, by x in closed form as for the gamma function. The last argument, 1 - x, carries no derivative of its own.
    pub(super) fn beta_tail_by(&mut self, id: Id, arguments: &[Id], at: usize) -> Id {
        let &[i, j, a, b, x, y] = arguments else { return self.constant(f64::NAN) };
        match at {
            0 | 1 => return self.constant(f64::NAN),
            2 | 3 => {
                let mut next = arguments.to_vec();
                next[at - 2] = self.sum(1.0, &[(arguments[at - 2], 1.0)]);
                return self.call(Function::BetaLogCdf, &next);
            }
            5 => return self.constant(0.0),
            _ => {}
        }
        let tail = |g: &mut Graph, i: f64, j: f64| {
            let (i, j) = (g.constant(i), g.constant(j));
            g.call(Function::BetaLogCdf, &[i, j, a, b, x, y])
        };
        // the density is a b/(n x y) exp(-deviance(a, n x) - deviance(b, n y)) and Stirling's remainders, n = a + b
        let n = self.add(a, b);
        let mut terms = vec![(tail(self, 0.0, 0.0), -1.0)];
        for (shape, share) in [(a, x), (b, y)] {
            let mean = self.multiply(n, share);
            terms.push((self.call(Function::Deviance, &[shape, mean]), -1.0));
            terms.push((self.call(Function::FactorialRemainder, &[shape]), -1.0));
        }
        terms.push((self.call(Function::FactorialRemainder, &[n]), 1.0));
        let inside = self.sum(0.0, &terms);
        let e = self.call_plain(Function::Exp, &[inside]);
        let hazard = self.product(&[(a, 1.0), (b, 1.0), (n, -1.0), (x, -1.0), (y, -1.0), (e, 1.0)]);
        // slopes of log density less log I in a and b
        let both = self.call(Function::Digamma, &[n]);
        let slope = |g: &mut Graph, shape: Id, share: Id, i: f64, j: f64| {
            let (log, psi) = (g.call(Function::Log, &[share]), g.call(Function::Digamma, &[shape]));
            let tail = tail(g, i, j);
            g.sum(0.0, &[(log, 1.0), (psi, -1.0), (both, 1.0), (tail, -1.0)])
        };
        let (by_a, by_b) = (slope(self, a, x, 1.0, 0.0), slope(self, b, y, 0.0, 1.0));
        let one = self.constant(1.0);
        let second = self.call(Function::Polygamma, &[one, n]);
        let (square, minus) = match (self.as_constant(i), self.as_constant(j)) {
            (Some(0.0), Some(0.0)) => return hazard,
            (Some(1.0), Some(0.0)) => return self.multiply(hazard, by_a),
            (Some(0.0), Some(1.0)) => return self.multiply(hazard, by_b),
            (Some(1.0), Some(1.0)) => (self.multiply(by_a, by_b), None),
            (Some(2.0), Some(0.0)) => (self.multiply(by_a, by_a), Some(a)),
            (Some(0.0), Some(2.0)) => (self.multiply(by_b, by_b), Some(b)),
            _ => return self.constant(f64::NAN),
        };
        let mut terms = vec![(square, 1.0), (second, 1.0), (id, -1.0)];
        if let Some(shape) = minus {
            terms.push((self.call(Function::Polygamma, &[one, shape]), -1.0));
        }
        let factor = self.sum(0.0, &terms);
        self.multiply(hazard, factor)
    }

    /// The second derivative of the Bessel ratio A, from A' = 1 - A/x - A^2; zero at zero, where A is odd.
    pub(super) fn bessel_ratio_curvature(&mut self, slope: Id, x: Id) -> Id {
        let ratio = self.call(Function::BesselRatio, &[x]);
        let terms = [
            (self.product(&[(slope, 1.0), (x, -1.0)]), -1.0),
            (self.product(&[(ratio, 1.0), (x, -2.0)]), 1.0),
            (self.product(&[(ratio, 1.0), (slope, 1.0)]), -2.0),
        ];
        let (away, zero) = (self.sum(0.0, &terms), self.constant(0.0));
        let at_zero = self.compare(Relation::Equal, x, zero);
        self.choice(at_zero, zero, away)
    }
}
