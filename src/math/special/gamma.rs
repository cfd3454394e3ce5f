//! The logarithm of the gamma function and its derivatives.

use libm::{exp, log, pow, tan};
use std::f64::consts::PI;

/// log |Gamma(x)|; plus infinity at 0, -1, -2, ...
pub fn lgamma(x: f64) -> f64 {
    if x == f64::NEG_INFINITY { f64::NAN } else { libm::lgamma(x) }
}

/// Bernoulli numbers B_2, B_4, ..., B_22.
pub(super) const BERNOULLI: [f64; 11] = [
    1.0 / 6.0,
    -1.0 / 30.0,
    1.0 / 42.0,
    -1.0 / 30.0,
    5.0 / 66.0,
    -691.0 / 2730.0,
    7.0 / 6.0,
    -3617.0 / 510.0,
    43867.0 / 798.0,
    -174611.0 / 330.0,
    854513.0 / 138.0,
];

/// B_2 / 2!, B_4 / 4!, ...
const OVER_FACTORIAL: [f64; 11] = {
    let mut out = BERNOULLI;
    let mut factorial = 1.0;
    let mut j = 0;
    while j < out.len() {
        let n = 2.0 * (j as f64 + 1.0);
        factorial *= (n - 1.0) * n;
        out[j] /= factorial;
        j += 1;
    }
    out
};

/// psi(x), the derivative of lgamma. NaN at 0, -1, -2, ... Error at most 1e-15 max(1, |psi|) or so.
///
/// Upward recurrence to x >= 10, then the asymptotic series (Abramowitz and Stegun 6.3.18), reflection below zero (6.3.7).
pub fn digamma(x: f64) -> f64 {
    if x <= 0.0 {
        // The distance to the nearest pole is exact, so nothing is lost beside it.
        let u = x - libm::round(x);
        if u == 0.0 || !x.is_finite() {
            return f64::NAN;
        }
        return digamma(1.0 - x) - PI / tan(PI * u);
    }
    let mut shifted = x;
    let mut sum = 0.0;
    while shifted < 10.0 {
        sum += 1.0 / shifted;
        shifted += 1.0;
    }
    let square = 1.0 / (shifted * shifted);
    let mut series = 0.0;
    for (j, b) in BERNOULLI.iter().enumerate().take(8).rev() {
        series = series * square + b / (2.0 * (j as f64 + 1.0));
    }
    log(shifted) - 0.5 / shifted - series * square - sum
}

/// psi^(m)(x), the m-th derivative of digamma (m = 1: trigamma); m = 0 is digamma itself. NaN at 0, -1, -2, ...
///
/// Error at most 1e-13 max(1, |value|) for m up to 20, and relative to the value's largest term growing like m eps beyond.
/// (-1)^(m+1) m! zeta(m+1, x) with the Hurwitz zeta function by Euler-Maclaurin; below zero the terms of the series on both
/// sides of x are summed in pairs, so that nothing cancels where odd powers nearly do.
pub fn polygamma(m: u32, x: f64) -> f64 {
    if m == 0 {
        return digamma(x);
    }
    let s = f64::from(m) + 1.0;
    let sign = if m % 2 == 1 { 1.0 } else { -1.0 };
    if x > 0.0 {
        return sign * scaled_zeta(s, x);
    }
    let u = x - libm::round(x);
    if u == 0.0 || !x.is_finite() {
        return f64::NAN;
    }
    // Poles at distance above + j to the right of the point and below + j to the left, j = 0, 1, ...
    let (above, below) = if u > 0.0 { (u, 1.0 - u) } else { (1.0 + u, -u) };
    // Those to the left end at the pole at zero: the surplus is zeta(s, 1 - x).
    if m % 2 == 1 {
        return sign * (scaled_zeta(s, above) + scaled_zeta(s, below) - scaled_zeta(s, 1.0 - x));
    }
    let gap = if u > 0.0 { 1.0 - 2.0 * u } else { -1.0 - 2.0 * u };
    let pairs = 12 + m;
    let mut sum = 0.0;
    for j in (0..pairs).rev() {
        let (p, q) = (1.0 / (above + f64::from(j)), 1.0 / (below + f64::from(j)));
        // p^s - q^s = (p - q)(p^(s-1) + p^(s-2) q + ... + q^(s-1)), and p - q = gap p q exactly.
        let mut total = 0.0;
        let mut qk = 1.0;
        for _ in 0..=m {
            total = total * p + qk;
            qk *= q;
        }
        sum += gap * p * q * total;
    }
    let far = f64::from(pairs);
    sign * (factorial(m) * sum + (scaled_zeta(s, above + far) - scaled_zeta(s, below + far)) + scaled_zeta(s, 1.0 - x))
}

/// m! as a double; infinite past 170.
fn factorial(m: u32) -> f64 {
    (2..=m).map(f64::from).product()
}

/// Gamma(s) zeta(s, x) for s = 2, 3, ... and x > 0.
fn scaled_zeta(s: f64, x: f64) -> f64 {
    if x.is_infinite() {
        return 0.0;
    }
    // Sum in units of x^-s, so that neither large orders nor large arguments leave the range of doubles on the way.
    let start = (10.0 + s).max(x);
    let steps = libm::ceil(start - x);
    let end = x + steps;
    let mut sum = 0.0;
    let mut k = steps - 1.0;
    while k >= 0.0 {
        sum += power(x / (x + k), s);
        k -= 1.0;
    }
    let square = 1.0 / (end * end);
    // s (s+1) ... (s+2j-2) B_2j / (2j)! end^-2j, j = 1, 2, ...
    let mut rising = s * square;
    let mut series = 0.0;
    for (j, b) in OVER_FACTORIAL.iter().enumerate() {
        series += b * rising;
        let n = s + 2.0 * (j as f64 + 1.0);
        rising *= (n - 1.0) * n * square;
    }
    sum += power(x / end, s) * (end / (s - 1.0) + 0.5 + end * series);
    if s <= 100.0 && s * libm::fabs(log(x)) < 600.0 {
        libm::tgamma(s) * sum * power(1.0 / x, s)
    } else {
        exp(lgamma(s) - s * log(x) + log(sum))
    }
}

/// base^s for whole s, by products where they are the faster.
fn power(base: f64, s: f64) -> f64 {
    if s == 2.0 {
        base * base
    } else if s == 3.0 {
        base * base * base
    } else if s == 4.0 {
        (base * base) * (base * base)
    } else {
        pow(base, s)
    }
}
