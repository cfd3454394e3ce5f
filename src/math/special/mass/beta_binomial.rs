//! Tails of the beta-binomial distribution.

use super::super::{deviance, factorial_remainder, log1p_over, stirling_inverse};
use super::{Jet, Mass, information, quotients, tail};
use libm::log1p;

/// The (i, j)-th derivative in (p, rho) of log P(Y <= y) (side 0) or log P(Y > y) (side 1), i + j <= 2, for a beta-binomial count
/// of n trials with variance n p (1 - p) (1 + (n - 1) rho); binomial at rho = 0.
///
/// NaN outside the domain. Error about 1e-13 of the probability, and of the derivatives beside their largest part.
pub fn beta_binomial_log_tail(side: f64, i: f64, j: f64, y: f64, n: f64, p: f64, rho: f64) -> f64 {
    let whole = y == y.floor() && n == n.floor() && n >= 0.0 && n.is_finite();
    let valid = (side == 0.0 || side == 1.0) && whole && (0.0..=1.0).contains(&p) && (0.0..1.0).contains(&rho);
    if !valid {
        return f64::NAN;
    }
    let above = side == 1.0;
    let rest = 1.0 - rho;
    let theta = rho / rest;
    let inside = y >= 0.0 && y < n;
    let out = if p == 0.0 && inside {
        no_chance(above, y, n, theta)
    } else if p == 1.0 && inside {
        let mut mirrored = no_chance(!above, n - y - 1.0, n, theta);
        mirrored.first[0] = -mirrored.first[0];
        mirrored.second[1] = -mirrored.second[1];
        mirrored
    } else {
        tail(&BetaBinomial { n, p, q: 1.0 - p, theta, spread: 1.0 + n * theta }, above, y)
    };
    out.through(1.0 / (rest * rest), 2.0 / (rest * rest * rest)).derivative(i, j)
}

/// Expected information of a beta-binomial count, E[s_i s_j] with s the scores in p (0) and rho (1), by exact summation; NaN
/// outside the domain and at p of 0 or 1, where it is infinite.
pub fn beta_binomial_information(i: f64, j: f64, n: f64, p: f64, rho: f64) -> f64 {
    let whole = n == n.floor() && n >= 0.0 && n.is_finite();
    if !(whole && p > 0.0 && p < 1.0 && (0.0..1.0).contains(&rho)) {
        return if p == 0.0 || p == 1.0 { f64::INFINITY } else { f64::NAN };
    }
    let rest = 1.0 - rho;
    let theta = rho / rest;
    let found = information(&BetaBinomial { n, p, q: 1.0 - p, theta, spread: 1.0 + n * theta });
    // by rho instead of theta
    let slope = 1.0 / (rest * rest);
    match (i, j) {
        (0.0, 0.0) => found[0],
        (1.0, 1.0) => found[2] * slope * slope,
        _ => found[1] * slope,
    }
}

/// All the mass is at 0, and the derivatives are one-sided: P(Y <= y) = f(0) (1 + p A), A a sum of products that go on.
fn no_chance(above: bool, y: f64, n: f64, theta: f64) -> Jet {
    if above {
        return Jet { value: f64::NEG_INFINITY, first: [f64::INFINITY, 0.0], second: [f64::NEG_INFINITY, 0.0, 0.0] };
    }
    let mass = BetaBinomial { n, p: 0.0, q: 1.0, theta, spread: 1.0 + n * theta };
    let mut total = [0.0; 3];
    // the first term is n / (1 - p + theta (n - 1)); each goes on by a ratio, with plain first derivatives in p and theta
    let d = 1.0 + theta * (n - 1.0);
    let mut term = [n / d, n / (d * d), -n * (n - 1.0) / (d * d)];
    let mut u = 1.0;
    while u <= y {
        for k in 0..3 {
            total[k] += term[k];
        }
        let v = n - u - 1.0;
        let (up, down, c) = (theta * u, 1.0 + theta * v, (n - u) / (u + 1.0));
        let ratio = [c * up / down, c * (1.0 / down + up / (down * down)), c * (u - up * v / down) / down];
        term = [term[0] * ratio[0], term[1] * ratio[0] + term[0] * ratio[1], term[2] * ratio[0] + term[0] * ratio[2]];
        if term == [0.0; 3] {
            break;
        }
        u += 1.0;
    }
    let rest =
        Jet { value: 0.0, first: [total[0], 0.0], second: [2.0 * total[1] - total[0] * total[0], total[2], 0.0] };
    mass.at(0.0).plus(&rest)
}

/// In (p, theta), theta = rho / (1 - rho).
struct BetaBinomial {
    n: f64,
    p: f64,
    q: f64,
    theta: f64,
    /// 1 + n theta
    spread: f64,
}

impl BetaBinomial {
    /// What a cell with count y and probability p gives to log f, but for the factorials; derivatives in its own p.
    ///
    /// With z = (y - n p)/(1 + n theta), d = theta z/p, L and E of [`quotients`] the scores are (z/p) L(d) and
    /// (z^2/p) E(d), besides those of -log1p(theta y/p)/2 + S(theta/(p + theta y)) - S(theta/p).
    fn cell(&self, y: f64, p: f64) -> Jet {
        let (n, t, q) = (self.n, self.theta, self.spread);
        if y == 0.0 {
            // z/p is -n/(1 + n theta) also at p = 0
            let ratio = -n / q;
            let d = t * ratio;
            let l = log1p_over(0.0, n * t);
            let [_, e, e1] = quotients(d, 1.0 / q, -log1p(n * t));
            return Jet {
                value: -p * n * l,
                first: [-n * l, p * ratio * ratio * e],
                second: [0.0, ratio * ratio * e, p * ratio * ratio / q * (ratio * e1 - 2.0 * n * e)],
            };
        }
        let z = (y - n * p) / q;
        let ratio = z / p;
        let d = t * ratio;
        let g = p + t * y;
        let [l, e, e1] = quotients(d, g / (p * q), log1p(t * y / p) - log1p(n * t));
        let s = |order: f64| (stirling_inverse(order, t / g), stirling_inverse(order, t / p));
        let ((s0, t0), (s1, t1), (s2, t2)) = (s(0.0), s(1.0), s(2.0));
        let (g2, p2) = (g * g, p * p);
        Jet {
            value: -deviance(y, n * g / q) - t * z * ratio * e - 0.5 * log1p(t * y / p) + s0 - t0,
            first: [
                ratio * l + 0.5 * t * y / (p * g) - t * s1 / g2 + t * t1 / p2,
                z * ratio * e - 0.5 * y / g + p * s1 / g2 - t1 / p,
            ],
            second: [
                -y / (p * g) - 0.5 * (t * y / (p * g)) * (1.0 / p + 1.0 / g) + t * (t * s2 / g2 + 2.0 * s1 / g) / g2
                    - t * (t * t2 / p2 + 2.0 * t1 / p) / p2,
                ratio * ratio * e - ratio * y / g + 0.5 * y / g2 - s1 / g2 - t * p * s2 / (g2 * g2)
                    + 2.0 * t * y * s1 / (g2 * g)
                    + t1 / p2
                    + t * t2 / (p2 * p),
                z * ratio / q * (ratio * e1 - 2.0 * n * e) + 0.5 * y * y / g2 + p2 * s2 / (g2 * g2)
                    - 2.0 * p * y * s1 / (g2 * g)
                    - t2 / p2,
            ],
        }
    }
}

impl Mass for BetaBinomial {
    fn last(&self) -> f64 {
        self.n
    }

    fn mean(&self) -> f64 {
        self.n * self.p
    }

    fn at(&self, u: f64) -> Jet {
        let (n, t, q) = (self.n, self.theta, self.spread);
        let (a, b) = (self.cell(u, self.p), self.cell(n - u, self.q));
        let c = t / q;
        let s = |order: f64| (stirling_inverse(order, c), stirling_inverse(order, t));
        let ((s0, t0), (s1, t1), (s2, t2)) = (s(0.0), s(1.0), s(2.0));
        let half = 0.5 * n / q;
        let whole = factorial_remainder(n) - factorial_remainder(u) - factorial_remainder(n - u);
        Jet {
            value: a.value + b.value + whole + 0.5 * log1p(n * t) - s0 + t0,
            first: [a.first[0] - b.first[0], a.first[1] + b.first[1] + half - s1 / (q * q) + t1],
            second: [
                a.second[0] + b.second[0],
                a.second[1] - b.second[1],
                a.second[2] + b.second[2] - 2.0 * half * half - s2 / (q * q * q * q) + 2.0 * n * s1 / (q * q * q) + t2,
            ],
        }
    }

    fn rise(&self, u: f64) -> Jet {
        let v = self.n - u - 1.0;
        let (up, down) = (self.p + self.theta * u, self.q + self.theta * v);
        let (a, b) = (1.0 / up, 1.0 / down);
        Jet {
            value: (self.n - u) / (u + 1.0) * (up / down),
            first: [a + b, u * a - v * b],
            second: [b * b - a * a, -u * a * a - v * b * b, v * v * b * b - u * u * a * a],
        }
    }

    fn limit(&self, _: bool) -> f64 {
        // ratios fall away from the mean where both beta shapes are at least one; else the mass may rise again
        if self.theta <= self.p && self.theta <= self.q { 0.0 } else { f64::INFINITY }
    }
}
