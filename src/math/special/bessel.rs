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

/// log I_0(x), even in x: relative error 1e-15 or so, from 0 on to where I_0 overflows and beyond.
pub fn log_bessel_i0(x: f64) -> f64 {
    let x = x.abs();
    if x < FAR {
        return libm::log1p(series_rest(0.0, x));
    }
    if x == f64::INFINITY { x } else { x + libm::log(uniform(0.0, x).1) }
}

/// log(exp(-|x|) I_0(x)): what [`log_bessel_i0`] is beside |x|, without the digits that the difference loses far out.
pub fn log_bessel_i0_scaled(x: f64) -> f64 {
    let x = x.abs();
    if x < FAR {
        return libm::log1p(series_rest(0.0, x)) - x;
    }
    if x == f64::INFINITY { f64::NEG_INFINITY } else { libm::log(uniform(0.0, x).1) }
}

/// I_1(x) / I_0(x), odd in x, the derivative of [`log_bessel_i0`]: relative error 1e-15 or so.
///
/// By the continued fraction x/(2 + x^2/(4 + x^2/(6 + ...))), far out by its asymptotic series.
pub fn bessel_ratio(x: f64) -> f64 {
    let size = x.abs();
    let ratio = if size < RATIO_FAR { fraction(size).0 } else { 1.0 + far_ratio(size, false) };
    libm::copysign(ratio, x)
}

/// The derivative of [`bessel_ratio`], 1 - A/x - A^2 with A the ratio: 1/2 at 0, about 1/(2 x^2) far out. Relative error 1e-14
/// or so, as neither the differentiated continued fraction nor the differentiated series has the cancellation of that form.
pub fn bessel_ratio_slope(x: f64) -> f64 {
    let x = x.abs();
    if x < RATIO_FAR { fraction(x).1 } else { far_ratio(x, true) / x }
}

/// From here on the series of the ratio serves: its smallest term is about exp(-2 x).
const RATIO_FAR: f64 = 20.0;

/// The ratio and its slope for 0 <= x < 20: r_k = I_k / I_(k-1) is 1/(2 k/x + r_(k+1)), evaluated from a k so large that r_k is
/// x/(2 k) to rounding once it has passed through the others.
fn fraction(x: f64) -> (f64, f64) {
    if x.is_nan() {
        return (x, x);
    }
    // in units of x: r_k = x s_k, s_k = 1/(2 k + x^2 s_(k+1)), so that x = 0 is like any other
    let square = x * x;
    let (mut s, mut slope) = (0.0, 0.0);
    for k in (1..=60).rev() {
        // the slope of s by x is x times `slope`
        let next = 1.0 / (2.0 * f64::from(k) + square * s);
        slope = -next * next * (2.0 * s + square * slope);
        s = next;
    }
    (x * s, s + square * slope)
}

/// The ratio less one, or x times its slope, from A = 1 + sum over k of a_k x^-k; A' = 1 - A/x - A^2 gives the a_k.
fn far_ratio(x: f64, slope: bool) -> f64 {
    let inverse = 1.0 / x;
    let mut sum = 0.0;
    for (k, a) in RATIO.iter().enumerate().skip(1).rev() {
        sum = (sum + if slope { -(k as f64) * a } else { *a }) * inverse;
    }
    sum
}

const RATIO: [f64; 41] = {
    let mut a = [0.0; 41];
    a[0] = 1.0;
    let mut n = 1;
    while n < a.len() {
        let mut twice = (n as f64 - 2.0) * a[n - 1];
        let mut i = 1;
        while i < n {
            twice -= a[i] * a[n - i];
            i += 1;
        }
        a[n] = 0.5 * twice;
        n += 1;
    }
    a
};

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
    pow(0.5 * x, order) / tgamma(order + 1.0) * (1.0 + series_rest(order, x))
}

/// Its terms after the first, over the first.
fn series_rest(order: f64, x: f64) -> f64 {
    let quarter = 0.25 * x * x;
    let (mut term, mut sum, mut k) = (1.0, 0.0, 1.0);
    while term > 1e-17 * sum {
        term *= quarter / (k * (order + k));
        sum += term;
        k += 1.0;
    }
    sum
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
