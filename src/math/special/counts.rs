//! The pieces of count log-densities that neither overflow nor cancel (Loader 2000, "Fast and accurate computation of binomial
//! probabilities"): the deviance of a count from its mean, and what Stirling's formula leaves of a factorial.

use super::gamma::{BERNOULLI, digamma, lgamma};
use super::normal::LOG_SQRT_2PI;
use libm::log;

/// x log(x/m) - x + m for x, m >= 0: m at x = 0, infinite at m = 0 < x, NaN for negatives.
///
/// Relative error a few eps everywhere. With v = (x-m)/(x+m) it is (x-m) v + 2 x v (v^2/3 + v^4/5 + ...), which serves within a
/// factor two of m; beyond, the three terms keep a fifth of their size.
pub fn deviance(x: f64, m: f64) -> f64 {
    if x.is_nan() || m.is_nan() || x < 0.0 || m < 0.0 {
        return f64::NAN;
    }
    if x == 0.0 || m == 0.0 {
        return if x == 0.0 { m } else { f64::INFINITY };
    }
    if x == f64::INFINITY || m == f64::INFINITY {
        return if x == m { f64::NAN } else { f64::INFINITY };
    }
    let d = x - m;
    // a half of each, so that the sum stays in range
    let v = (0.5 * d) / (0.5 * x + 0.5 * m);
    if v.abs() <= 1.0 / 3.0 {
        let square = v * v;
        let (mut power, mut sum, mut n) = (1.0, 0.0, 3.0);
        while power > 1e-18 {
            sum += power / n;
            power *= square;
            n += 2.0;
        }
        return d * v + 2.0 * x * (v * square * sum);
    }
    let ratio = x / m;
    let ratio = if ratio > 1e-300 && ratio < 1e300 { log(ratio) } else { log(x) - log(m) };
    x * ratio - d
}

/// B_2j / (2j (2j - 1)): coefficients of Stirling's series (Abramowitz and Stegun 6.1.41).
pub(super) const STIRLING: [f64; 11] = {
    let mut out = BERNOULLI;
    let mut j = 0;
    while j < out.len() {
        let n = 2.0 * (j as f64 + 1.0);
        out[j] /= n * (n - 1.0);
        j += 1;
    }
    out
};

/// lgamma(x+1) - x log x + x for x >= 0: 0 at 0, about log(2 pi x)/2 at large x. NaN below zero.
///
/// Absolute error 2e-15 of max(1, value). From x = 9 on by Stirling's series, whose tenth term is below 1e-17 there.
pub fn factorial_remainder(x: f64) -> f64 {
    if x.is_nan() || x < 0.0 {
        return f64::NAN;
    }
    if x == 0.0 || x == f64::INFINITY {
        return x;
    }
    if x < 9.0 {
        let up = x + 1.0;
        // the rounding of x + 1 is put back
        let rest = x - (up - 1.0);
        return lgamma(up) + rest * digamma(up) - x * (log(x) - 1.0);
    }
    let inverse = 1.0 / x;
    let square = inverse * inverse;
    let series = STIRLING.iter().take(10).rev().fold(0.0, |s, b| s * square + b);
    LOG_SQRT_2PI + 0.5 * log(x) + series * inverse
}
