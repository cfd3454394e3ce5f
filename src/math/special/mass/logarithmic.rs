//! Tails of the logarithmic (series) distribution.

use super::super::{digamma, log1mexp};
use libm::{exp, log, log1p};

/// Euler's constant.
const EULER: f64 = 0.577_215_664_901_532_9;

/// The i-th derivative (0 to 2) in p of log P(Y <= y) (side 0) or log P(Y > y) (side 1) for the mass p^u / (-u log(1 - p)),
/// u = 1, 2, ..., 0 < p < 1. NaN outside the domain.
///
/// With N = -log(1 - p) and A the sum of p^u/u over u > y, the probabilities are A/N and 1 - A/N, and A' = p^y/(1 - p): only A
/// needs a series.
pub fn logarithmic_log_tail(side: f64, i: f64, y: f64, p: f64) -> f64 {
    let Some(order) = super::super::whole(i, 2) else { return f64::NAN };
    if !((side == 0.0 || side == 1.0) && y == y.floor() && p > 0.0 && p < 1.0) {
        return f64::NAN;
    }
    let above = side == 1.0;
    if y < 1.0 || y == f64::INFINITY {
        let certain = above == (y < 1.0);
        return match order {
            0 if !certain => f64::NEG_INFINITY,
            _ => 0.0,
        };
    }
    let [value, s, h, second] = if p < 0.125 { by_powers(y, p) } else { by_sums(y, p) };
    let out = if above {
        [value, s, h]
    } else {
        let value_below = log1mexp(-value);
        let odds = exp(value - value_below);
        [value_below, -odds * s, -odds * (second + odds * s * s)]
    };
    out[order]
}

/// With v = A/N: log v, its derivatives, and v''/v.
fn by_sums(y: f64, p: f64) -> [f64; 4] {
    let rest = 1.0 - p;
    let all = -log1p(-p);
    let (log_a, first) = upper_sum(y, p);
    let n = 1.0 / (rest * all);
    let (s, h) = (first - n, first * (y / p + 1.0 / rest - first) - n * (1.0 / rest - n));
    [log_a - log(all), s, h, h + s * s]
}

/// The same for small p: v = p^y g(p), g the quotient of two power series, so that v'' loses nothing where y = 1.
fn by_powers(y: f64, p: f64) -> [f64; 4] {
    let series = |from: f64| {
        let mut out = [0.0; 3];
        for j in (0..20).rev() {
            let j = f64::from(j);
            out[2] = out[2] * p + (j + 1.0) * (j + 2.0) / (from + j + 2.0);
            out[1] = out[1] * p + (j + 1.0) / (from + j + 1.0);
            out[0] = out[0] * p + 1.0 / (from + j);
        }
        out
    };
    let ([a, a1, a2], [n, n1, n2]) = (series(y + 1.0), series(1.0));
    let first = a1 / a - n1 / n;
    // g''/g
    let second = a2 / a - n2 / n - 2.0 * (n1 / n) * first;
    let square = p * p;
    [
        y * log(p) + log(a / n),
        y / p + first,
        second - first * first - y / square,
        (y * (y - 1.0) + 2.0 * y * p * first + square * second) / square,
    ]
}

/// log A and A'/A.
fn upper_sum(y: f64, p: f64) -> (f64, f64) {
    let rest = 1.0 - p;
    let a = y + 1.0;
    if (a + 1.0) * rest > 1.0 {
        // A is the incomplete beta integral B_p(y + 1, 0)
        let c = fraction(a, p);
        return (a * log(p) - log(a) + log(c), a / (p * rest * c));
    }
    // N less the sum up to y: -log(1 - p) - (psi(y + 1) + Euler) + sum over k of (-1)^(k+1) C(y, k) (1 - p)^k / k
    let (mut term, mut k, mut series) = (1.0, 1.0, 0.0);
    while k <= y {
        term *= -rest * (y - k + 1.0) / k;
        series -= term / k;
        if term.abs() < 1e-18 {
            break;
        }
        k += 1.0;
    }
    let sum = -log(rest) - (digamma(a) + EULER) + series;
    (log(sum), exp(y * log(p)) / (rest * sum))
}

/// The continued fraction of B_x(a, 0) a / x^a (Olver et al., NIST Handbook of Mathematical Functions, 8.17.22 with b = 0), by
/// Lentz's method as modified by Thompson and Barnett.
fn fraction(a: f64, x: f64) -> f64 {
    const TINY: f64 = 1e-300;
    let (mut c, mut d, mut out) = (1.0, 0.0, 1.0);
    let mut m = 1.0;
    while m < 1e5 {
        let half = if m % 2.0 == 0.0 { m / 2.0 } else { a + (m - 1.0) / 2.0 };
        let coefficient = -half * half * x / ((a + m - 1.0) * (a + m));
        let down = 1.0 + coefficient * d;
        d = 1.0 / if down == 0.0 { TINY } else { down };
        c = 1.0 + coefficient / c;
        if c == 0.0 {
            c = TINY;
        }
        let change = c * d;
        out *= change;
        if (change - 1.0).abs() < 1e-16 {
            break;
        }
        m += 1.0;
    }
    // the value just found is that of 1 + d1/(1 + d2/...)
    1.0 / out
}
