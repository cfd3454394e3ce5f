//! Tails of the negative binomial distribution.

use super::super::{deviance, factorial_remainder, stirling_inverse};
use super::{Jet, Mass, information, quotients, tail};
use libm::log1p;

/// The (i, j)-th derivative in (mean, k) of log P(Y <= y) (side 0) or log P(Y > y) (side 1), i + j <= 2, for a negative binomial
/// count of variance mean + k mean^2; Poisson at k = 0.
///
/// NaN outside the domain. Error about 1e-13 of the probability, and of the derivatives beside their largest part.
pub fn negative_binomial_log_tail(side: f64, i: f64, j: f64, y: f64, mean: f64, k: f64) -> f64 {
    let valid = (side == 0.0 || side == 1.0) && y == y.floor() && mean >= 0.0 && k >= 0.0;
    if !valid || !mean.is_finite() || !k.is_finite() {
        return f64::NAN;
    }
    let above = side == 1.0;
    let mass = NegativeBinomial { mean, k, spread: 1.0 + k * mean };
    let out = if mean == 0.0 && y >= 0.0 { no_mean(above, y, k) } else { tail(&mass, above, y) };
    out.derivative(i, j)
}

/// Expected information of a negative binomial count about k, E[s^2] with s the score in k, by exact summation; NaN outside the
/// domain. (That about the mean is 1 / (mean + k mean^2), and nothing is shared.)
pub fn negative_binomial_information(mean: f64, k: f64) -> f64 {
    if !(mean >= 0.0 && k >= 0.0 && mean.is_finite() && k.is_finite()) {
        return f64::NAN;
    }
    if mean == 0.0 {
        return 0.0;
    }
    information(&NegativeBinomial { mean, k, spread: 1.0 + k * mean })[2]
}

/// All the mass is at 0, and the derivatives are one-sided: f(1) begins with the mean, f(2) with (1 + k)/2 of its square.
fn no_mean(above: bool, y: f64, k: f64) -> Jet {
    if above {
        return Jet { value: f64::NEG_INFINITY, first: [f64::INFINITY, 0.0], second: [f64::NEG_INFINITY, 0.0, 0.0] };
    }
    let mut out = Jet::constant(0.0);
    if y == 0.0 {
        (out.first[0], out.second[0]) = (-1.0, k);
    } else if y == 1.0 {
        out.second[0] = -(1.0 + k);
    }
    out
}

struct NegativeBinomial {
    mean: f64,
    k: f64,
    /// 1 + k mean
    spread: f64,
}

impl Mass for NegativeBinomial {
    fn last(&self) -> f64 {
        f64::INFINITY
    }

    fn mean(&self) -> f64 {
        self.mean
    }

    /// With z = (u - m)/(1 + k m), S of [`stirling_inverse`] and E of [`quotients`] the score in m is z/m, that in k is
    /// z^2 E(k z) - u/(2 (1 + k u)) + S'(k/(1 + k u))/(1 + k u)^2 - S'(k).
    fn at(&self, u: f64) -> Jet {
        let (m, k, q) = (self.mean, self.k, self.spread);
        let z = (u - m) / q;
        let up = 1.0 + k * u;
        let c = k / up;
        let [_, e, e1] = quotients(k * z, up / q, log1p(k * u) - log1p(k * m));
        let s = |order: f64| (stirling_inverse(order, c), stirling_inverse(order, k));
        let ((s0, t0), (s1, t1), (s2, t2)) = (s(0.0), s(1.0), s(2.0));
        let value = s0 - t0 - factorial_remainder(u) - deviance(u, m * up / q) - k * z * z * e - 0.5 * log1p(k * u);
        let half = 0.5 * u / up;
        let square = up * up;
        Jet {
            value,
            first: [z / m, z * z * e - half + s1 / square - t1],
            second: [
                (k * m * (m - 2.0 * u) - u) / (m * q * m * q),
                -z / q,
                z * z / q * (z * e1 - 2.0 * m * e) + 2.0 * half * half + s2 / (square * square)
                    - 2.0 * u * s1 / (square * up)
                    - t2,
            ],
        }
    }

    fn rise(&self, u: f64) -> Jet {
        let (m, k, q) = (self.mean, self.k, self.spread);
        let up = 1.0 + k * u;
        let (a, b) = (u / up, m / q);
        let gap = (u - m) / (up * q);
        Jet {
            value: b * up / (u + 1.0),
            first: [1.0 / (m * q), gap],
            second: [-(1.0 + 2.0 * k * m) / (m * q * m * q), -1.0 / (q * q), -gap * (a + b)],
        }
    }

    fn limit(&self, upward: bool) -> f64 {
        // ratios fall with the count where k <= 1; else they rise towards k m / (1 + k m)
        if self.k <= 1.0 {
            0.0
        } else if upward {
            self.k * self.mean / self.spread
        } else {
            f64::INFINITY
        }
    }
}
