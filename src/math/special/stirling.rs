//! What Stirling's formula leaves of lgamma, as a function of the inverse argument: smooth at zero, where count families meet
//! their limits.

use super::counts::STIRLING;
use libm::log1p;

/// A value and its first three derivatives.
type Derivatives = [f64; 4];

/// The order-th derivative (0 to 3) in c of S(c) = lgamma(1/c) - (1/c - 1/2) log(1/c) + 1/c - log(2 pi)/2, c >= 0; S(0) = 0.
/// NaN for other orders and negative c.
///
/// Relative error 1e-13 or so. Up to c = 1/16 by Stirling's series c/12 - c^3/360 + ... (Abramowitz and Stegun 6.1.41); above,
/// S(c) = S(c/(1 + J c)) + sum over j < J of g(v_j) with v_j = c/(2 + (2j+1) c) and g(v) = atanh(v)/v - 1, all terms positive.
pub fn stirling_inverse(order: f64, c: f64) -> f64 {
    let Some(order) = super::whole(order, 3) else { return f64::NAN };
    if c.is_nan() || c < 0.0 {
        return f64::NAN;
    }
    if c == f64::INFINITY {
        return if order == 0 { c } else { 0.0 };
    }
    let steps = if c > 0.0625 { libm::ceil(16.0 - 1.0 / c) } else { 0.0 };
    let k = 1.0 + steps * c;
    let inner = [c / k, 1.0 / (k * k), -2.0 * steps / (k * k * k), 6.0 * steps * steps / (k * k * k * k)];
    let mut out = chain(order, &series(inner[0]), &inner);
    let mut j = steps - 1.0;
    while j >= 0.0 {
        let n = 2.0 * j + 1.0;
        let k = 2.0 + n * c;
        let v = [c / k, 2.0 / (k * k), -4.0 * n / (k * k * k), 12.0 * n * n / (k * k * k * k)];
        out += if v[0] > 0.5 { step(order, c) } else { chain(order, &excess(v[0]), &v) };
        j -= 1.0;
    }
    out
}

/// The order-th derivative of f(u(c)) from the derivatives of f at u and those of u at c.
fn chain(order: usize, f: &Derivatives, u: &Derivatives) -> f64 {
    match order {
        0 => f[0],
        1 => f[1] * u[1],
        2 => f[2] * u[1] * u[1] + f[1] * u[2],
        _ => f[3] * u[1] * u[1] * u[1] + 3.0 * f[2] * u[1] * u[2] + f[1] * u[3],
    }
}

/// Stirling's series for c <= 1/16: its eleven terms leave under 1e-16 of the third derivative.
fn series(c: f64) -> Derivatives {
    let square = c * c;
    let mut out = [0.0; 4];
    for (k, b) in STIRLING.iter().enumerate().rev() {
        let n = 2.0 * k as f64 + 1.0;
        out[0] = out[0] * square + b;
        out[1] = out[1] * square + b * n;
        // powers c^(n-2) and c^(n-3), which begin with the second term
        if k > 0 {
            out[2] = out[2] * square + b * n * (n - 1.0);
            out[3] = out[3] * square + b * n * (n - 1.0) * (n - 2.0);
        }
    }
    [out[0] * c, out[1], out[2] * c, out[3]]
}

/// atanh(v)/v - 1 = v^2/3 + v^4/5 + ... for 0 <= v <= 1/2, and its derivatives.
fn excess(v: f64) -> Derivatives {
    let square = v * v;
    let mut out = [0.0; 4];
    let (mut power, mut n) = (1.0, 2.0);
    // power = v^(n-2); the third derivative has the factor n^2 over the value
    while n * n * power > 1e-18 {
        let term = power / (n + 1.0);
        out[0] += term;
        out[1] += term * n;
        out[2] += term * (n * (n - 1.0));
        out[3] += term * (n * (n - 1.0) * (n - 2.0));
        power *= square;
        n += 2.0;
    }
    // the third derivative begins with v, so its sum holds v^-3 of every term but the first, which is zero
    let third = if v > 0.0 { out[3] / v } else { 0.0 };
    [out[0] * square, out[1] * v, out[2], third]
}

/// The same for v = c/(2 + c) > 1/2, in c: (1/c + 1/2) log(1 + c) - 1 by the product rule.
fn step(order: usize, c: f64) -> f64 {
    let i = 1.0 / c;
    let p = [i + 0.5, -i * i, 2.0 * i * i * i, -6.0 * i * i * i * i];
    let k = 1.0 / (1.0 + c);
    let l = [log1p(c), k, -k * k, 2.0 * k * k * k];
    match order {
        0 => p[0] * l[0] - 1.0,
        1 => p[0] * l[1] + p[1] * l[0],
        2 => p[0] * l[2] + 2.0 * p[1] * l[1] + p[2] * l[0],
        _ => p[0] * l[3] + 3.0 * (p[1] * l[2] + p[2] * l[1]) + p[3] * l[0],
    }
}
