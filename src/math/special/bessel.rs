//! The modified Bessel function of the first kind.

use libm::{asinh, exp, pow, sqrt, tgamma};
use std::f64::consts::PI;

/// From this value of sqrt(order^2 + x^2) on the uniform expansion serves; its last term is under 1e-15 there.
const FAR: f64 = 40.0;
/// Terms of the uniform expansion after the first.
const TERMS: usize = 12;

/// I_order(x) for x >= 0 and real order >= 0; whole orders of either sign also take negative x. NaN elsewhere; infinite where
/// the value is beyond the range of doubles.
///
/// Relative error 1e-12 for orders up to 1000 (beyond, the rounding of the order itself costs more: about order times 1e-15).
pub fn bessel_i(order: f64, x: f64) -> f64 {
    let Some((order, x, sign)) = reflected(order, x) else {
        return f64::NAN;
    };
    if order == 0.0 && x == 0.0 {
        return 1.0;
    }
    if x == f64::INFINITY {
        return sign * x;
    }
    if sqrt(order * order + x * x) < FAR {
        return sign * series(order, x);
    }
    let (exponent, factor) = uniform(order, x);
    // One exponential of x alone keeps the digits which the sum of exponents would round away.
    if x < 700.0 && exponent > -700.0 {
        sign * factor * exp(exponent) * exp(x)
    } else {
        let half = exp(0.5 * (exponent + x));
        sign * factor * half * half
    }
}

/// exp(-|x|) I_order(x), for large x where I itself overflows. Domain and error as [`bessel_i`].
pub fn bessel_i_scaled(order: f64, x: f64) -> f64 {
    let Some((order, x, sign)) = reflected(order, x) else {
        return f64::NAN;
    };
    if x == f64::INFINITY {
        return 0.0;
    }
    if order == 0.0 && x == 0.0 {
        return 1.0;
    }
    if sqrt(order * order + x * x) < FAR {
        return sign * series(order, x) * exp(-x);
    }
    let (exponent, factor) = uniform(order, x);
    sign * factor * exp(exponent)
}

/// The same value at a non-negative order and argument: I_-n = I_n and I_n(-x) = (-1)^n I_n(x) for whole n.
fn reflected(order: f64, x: f64) -> Option<(f64, f64, f64)> {
    if order.is_nan() || x.is_nan() || !order.is_finite() {
        return None;
    }
    let whole = libm::floor(order) == order;
    if (order < 0.0 || x < 0.0) && !whole {
        return None;
    }
    let odd = whole && libm::fmod(order, 2.0) != 0.0;
    Some((order.abs(), x.abs(), if x < 0.0 && odd { -1.0 } else { 1.0 }))
}

/// The ascending series (Abramowitz and Stegun 9.6.10): all terms positive, so it is stable at any argument.
fn series(order: f64, x: f64) -> f64 {
    let quarter = 0.25 * x * x;
    let mut term = 1.0;
    let mut sum = 1.0;
    let mut k = 1.0;
    while term > 1e-17 * sum {
        term *= quarter / (k * (order + k));
        sum += term;
        k += 1.0;
    }
    pow(0.5 * x, order) / tgamma(order + 1.0) * sum
}

/// Logarithm of the leading exponential of exp(-x) I, and its factor, from the uniform expansion for large orders (Abramowitz
/// and Stegun 9.7.7). Written in powers of 1 / sqrt(order^2 + x^2) it is the expansion for large arguments as well: at
/// order 0 the two agree term by term.
fn uniform(order: f64, x: f64) -> (f64, f64) {
    let radius = libm::hypot(order, x);
    let exponent = if order == 0.0 { 0.0 } else { order * (order / (radius + x)) - order * asinh(order / x) };
    let p = 1.0 / radius;
    let square = (order * p) * (order * p);
    let mut sum = 0.0;
    for coefficients in EXPANSION.iter().rev() {
        let polynomial = coefficients.iter().rev().fold(0.0, |value, c| value * square + c);
        sum = sum * p + polynomial;
    }
    (exponent, sum * sqrt(p / (2.0 * PI)))
}

/// Row k holds V_k with u_k(t) = t^k V_k(t^2), in ascending powers of t^2, where u_0 = 1 and
/// u_(k+1) = t^2 (1 - t^2) u_k' / 2 + (1/8) integral_0^t (1 - 5 s^2) u_k ds (Abramowitz and Stegun 9.3.10).
const EXPANSION: [[f64; TERMS + 1]; TERMS + 1] = expansion();

const fn expansion() -> [[f64; TERMS + 1]; TERMS + 1] {
    let mut v = [[0.0; TERMS + 1]; TERMS + 1];
    v[0][0] = 1.0;
    let mut k = 0;
    while k < TERMS {
        let mut j = 0;
        while j <= k {
            // The term c t^n of u_k, n = k + 2 j, gives t^(n+1) (n/2 + 1/(8(n+1))) - t^(n+3) (n/2 + 5/(8(n+3))).
            let n = (k + 2 * j) as f64;
            let c = v[k][j];
            v[k + 1][j] += c * (0.5 * n + 0.125 / (n + 1.0));
            v[k + 1][j + 1] -= c * (0.5 * n + 0.625 / (n + 3.0));
            j += 1;
        }
        k += 1;
    }
    v
}
