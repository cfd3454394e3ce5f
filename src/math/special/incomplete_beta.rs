//! The regularised incomplete beta function on the logarithmic scale, with derivatives in both shapes.

use super::counts::{deviance, factorial_remainder};
use super::gamma::{digamma, polygamma};
use super::jet::{Jet, unit_nodes};
use super::moments::{Falling, integral};
use super::smooth::log1p_excess;
use libm::{log, log1p};
use std::f64::consts::LN_2;

/// From this size of both shapes on quadrature takes the place of the continued fraction, whose length grows with their root.
const LARGE: f64 = 100.0;
/// More terms than any argument within reach needs; a guard.
const MOST: usize = 100_000;

/// The derivative of order i in a and j in b (i + j <= 2) of log I_x(a, b), with y = 1 - x handed in, so that either end keeps
/// its digits; a, b > 0. The upper tail is the lower one of (b, a, y, x). NaN outside and for other orders.
///
/// Absolute error 1e-11 or better of max(1, |value|), for shapes from 1e-8 to 1e4 and beyond, however far in the tails.
pub fn beta_log_cdf(i: f64, j: f64, a: f64, b: f64, x: f64, y: f64) -> f64 {
    let (Some(i), Some(j)) = (super::whole(i, 2), super::whole(j, 2)) else { return f64::NAN };
    let fits = |s: f64| s > 0.0 && s < f64::INFINITY;
    let inside = |s: f64| (0.0..=1.0).contains(&s);
    if i + j > 2 || !fits(a) || !fits(b) || !inside(x) || !inside(y) {
        return f64::NAN;
    }
    if y == 0.0 {
        return 0.0;
    }
    if x == 0.0 {
        return if i + j == 0 { f64::NEG_INFINITY } else { 0.0 };
    }
    // the lower tail is the one of which little is left
    let lower = x * (b + 1.0) <= y * (a + 1.0);
    let out = if lower { tail(a, b, x, y, false) } else { tail(b, a, y, x, true).swapped() };
    out.order(i, j)
}

/// The logarithm of the tail below x, for x up to about the mean, or of its complement.
///
/// What is computed is a small number, with the shape that it is proportional to where that is small taken out; its logarithm
/// then is a sum, and its complement is had without the logarithm, whose derivatives are large.
fn tail(a: f64, b: f64, x: f64, y: f64, complement: bool) -> Jet {
    let log_of_b = Jet::log_of_a(b).swapped();
    if a >= LARGE && b >= LARGE {
        let f = Shapes { a, b, ratio: x / y, tilt: ((a - 1.0) * y - (b - 1.0) * x) / y };
        let integral = integral(&f, f.tilt, (a - 1.0) + (b - 1.0) * f.ratio * f.ratio);
        let log = Jet::log_of_a(a) + log_of_b + prefix(a, b, x, y) + integral - Jet::constant(log(y));
        return if complement { log.exp().log_complement() } else { log };
    }
    let over_b = prefix(a, b, x, y) + fraction(a, b, x);
    if !complement {
        let log = log_of_b + over_b;
        // rounding may carry a probability of nearly one above it
        Jet { v: log.v.min(0.0), ..log }
    } else if a >= 1.0 || log_of_b.v + over_b.v < -LN_2 {
        (Jet::in_b(b, 1.0, 0.0) * over_b.exp()).log_complement()
    } else {
        Jet::log_of_a(a) + small_shape(a, b, x)
    }
}

/// log(x^a y^b / (a b B(a, b))), the value by deviances, so that nothing cancels at large shapes.
fn prefix(a: f64, b: f64, x: f64, y: f64) -> Jet {
    let n = a + b;
    let value = (factorial_remainder(n) - factorial_remainder(a) - factorial_remainder(b))
        - (deviance(a, n * x) + deviance(b, n * y))
        - log(n);
    let (both, second) = (digamma(n), polygamma(1, n));
    Jet {
        v: value,
        a: log(x) - (digamma(a + 1.0) - both),
        b: log(y) - (digamma(b + 1.0) - both),
        aa: second - polygamma(1, a + 1.0),
        ab: second,
        bb: second - polygamma(1, b + 1.0),
    }
}

/// The exponent (a-1) log(1-s) + (b-1) log(1 + s x/y) of I y over a b times the prefix, t = x (1-s).
struct Shapes {
    a: f64,
    b: f64,
    ratio: f64,
    /// (a-1) - (b-1) x/y
    tilt: f64,
}

impl Falling for Shapes {
    fn exponent(&self, s: f64) -> f64 {
        let v = self.ratio * s;
        let bent = (self.a - 1.0) * s * s * log1p_excess(0.0, -s) + (self.b - 1.0) * v * v * log1p_excess(0.0, v);
        -self.tilt * s - bent
    }

    fn slope(&self, s: f64) -> f64 {
        (self.b - 1.0) * self.ratio / (1.0 + self.ratio * s) - (self.a - 1.0) / (1.0 - s)
    }

    fn shares(&self, s: f64) -> [f64; 2] {
        [log1p(-s), log1p(self.ratio * s)]
    }
}

/// log of I over b times the prefix: the continued fraction (Abramowitz and Stegun 26.5.8), differentiated as it is evaluated (modified
/// Lentz).
fn fraction(a: f64, b: f64, x: f64) -> Jet {
    let one = Jet::constant(1.0);
    let step = |numerator: Jet, c: &mut Jet, d: &mut Jet| {
        *d = (one + numerator * *d).reciprocal();
        *c = one + numerator * c.reciprocal();
        *c * *d
    };
    // (a + b) / (a + 1)
    let r = 1.0 / (a + 1.0);
    let n = a + b;
    let first = Jet { v: n * r, a: (1.0 - n * r) * r, b: r, aa: -2.0 * (1.0 - n * r) * r * r, ab: -r * r, bb: 0.0 };
    let mut d = (one - first.scale(x)).reciprocal();
    let mut c = one;
    let mut out = d;
    for m in 1..MOST {
        let m = m as f64;
        let low = Jet::in_a(a + (2.0 * m - 1.0), 1.0, 0.0).reciprocal();
        let middle = Jet::in_a(a + 2.0 * m, 1.0, 0.0).reciprocal();
        let high = Jet::in_a(a + (2.0 * m + 1.0), 1.0, 0.0).reciprocal();
        let even = Jet::in_b(m * (b - m) * x, m * x, 0.0) * (low * middle);
        let mut factor = step(even, &mut c, &mut d);
        let whole = Jet { v: a + b + m, a: 1.0, b: 1.0, aa: 0.0, ab: 0.0, bb: 0.0 };
        let odd = (Jet::in_a(a + m, 1.0, 0.0).scale(-x) * middle) * (whole * high);
        factor = factor * step(odd, &mut c, &mut d);
        out = out * factor;
        if factor.is_one() {
            break;
        }
    }
    out.log()
}

/// log((1 - I)/a) for a < 1 where I is near one, and so a < b: with F = log x + (lgamma(a+b) - lgamma(b) - lgamma(1+a))/a,
/// (1 - I)/a = -F (exp(a F) - 1)/(a F) - exp(a F) sum over n >= 1 of (1-b)_n x^n / (n! (a+n)) (Abramowitz and Stegun 26.5.4, 15.3.3).
fn small_shape(a: f64, b: f64, x: f64) -> Jet {
    let mut f = Jet::constant(log(x));
    // quotients of differences of lgamma by a are means of digamma
    for (u, w) in unit_nodes() {
        let (s, t) = (1.0 + a * u, b + a * u);
        let [first, second, third] = [0, 1, 2].map(|m| w * polygamma(m, t));
        let rise = Jet { v: first, a: u * second, b: second, aa: u * u * third, ab: u * third, bb: third };
        f = f + rise - Jet::in_a(w * digamma(s), w * u * polygamma(1, s), w * u * u * polygamma(2, s));
    }
    let mut sum = Jet::constant(0.0);
    let mut coefficient = Jet::constant(1.0);
    for n in 1..MOST {
        let n = n as f64;
        coefficient = coefficient * Jet::in_b((n - b) * x / n, -x / n, 0.0);
        sum = sum + coefficient * Jet::in_a(a + n, 1.0, 0.0).reciprocal();
        let size = libm::fabs(coefficient.v) + libm::fabs(coefficient.b) + libm::fabs(coefficient.bb);
        if n > b && size < 1e-18 {
            break;
        }
    }
    let e = Jet::in_a(a, 1.0, 0.0) * f;
    (-(f * e.exp_quotient() + e.exp() * sum)).log()
}
