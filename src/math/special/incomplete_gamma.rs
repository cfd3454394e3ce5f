//! The regularised incomplete gamma functions on the logarithmic scale, with derivatives in the shape.
//!
//! One of P and Q is computed, whichever is small or can be had without cancellation; the other is its complement.

use super::counts::{deviance, factorial_remainder};
use super::gamma::{digamma, polygamma};
use super::jet::{Jet, unit_nodes};
use super::moments::{Falling, integral};
use super::smooth::log1p_excess;
use libm::{log, log1p};
use std::f64::consts::LN_2;

/// From this shape on quadrature takes the place of series and continued fraction, whose length grows with its square root.
const LARGE: f64 = 100.0;
/// More terms than any argument needs; a guard.
const MOST: usize = 10_000;

/// The order-th derivative (0, 1, 2) in the shape a of log P(a, x), for a > 0, x >= 0. NaN outside and for other orders.
///
/// Absolute error 1e-12 or better of max(1, |value|) for shapes from 1e-8 to 1e6 and beyond, however far in the tails.
pub fn gamma_log_cdf(order: f64, a: f64, x: f64) -> f64 {
    let Some(order) = super::whole(order, 2) else { return f64::NAN };
    if !in_domain(a, x) {
        return f64::NAN;
    }
    if x == 0.0 || x == f64::INFINITY {
        return if x > 0.0 { 0.0 } else { f64::NEG_INFINITY };
    }
    tail(a, x, false).order(order, 0)
}

/// The order-th derivative (0, 1, 2) in the shape a of log Q(a, x) = log(1 - P(a, x)). Domain and error as [`gamma_log_cdf`].
pub fn gamma_log_survival(order: f64, a: f64, x: f64) -> f64 {
    let Some(order) = super::whole(order, 2) else { return f64::NAN };
    if !in_domain(a, x) {
        return f64::NAN;
    }
    if x == 0.0 || x == f64::INFINITY {
        return if x == 0.0 {
            0.0
        } else if order == 0 {
            f64::NEG_INFINITY
        } else {
            f64::INFINITY
        };
    }
    tail(a, x, true).order(order, 0)
}

fn in_domain(a: f64, x: f64) -> bool {
    a > 0.0 && a < f64::INFINITY && x >= 0.0
}

/// log P, or log Q (`upper`). Q over the shape is what is computed where it is small, so that a small shape costs no digits: its
/// logarithm then is a sum, and P is had from Q itself, not from its logarithm, whose derivatives are large.
fn tail(a: f64, x: f64, upper: bool) -> Jet {
    let prefix = prefix(a, x);
    if a >= LARGE {
        let above = x > a;
        let f = Shape { a, x, sign: if above { 1.0 } else { -1.0 } };
        let log = Jet::log_of_a(a) + prefix + integral(&f, (a - 1.0 - x) * -f.sign, a - 1.0);
        return if above == upper { log } else { log.exp().log_complement() };
    }
    if x > (a + 1.0).max(1.5) {
        let over_a = prefix + fraction(a, x);
        let times_a = Jet::in_a(a, 1.0, 0.0) * over_a.exp();
        return if upper { Jet::log_of_a(a) + over_a } else { times_a.log_complement() };
    }
    let log = prefix + series(a, x);
    if !upper {
        // rounding may carry a probability of nearly one above it
        Jet { v: log.v.min(0.0), ..log }
    } else if a >= 1.0 || log.v < -LN_2 {
        log.exp().log_complement()
    } else {
        Jet::log_of_a(a) + small_shape(a, x)
    }
}

/// log(x^a e^-x / Gamma(a+1)), with the value by the deviance, so that nothing cancels at large shapes.
fn prefix(a: f64, x: f64) -> Jet {
    let up = a + 1.0;
    Jet::in_a(-deviance(a, x) - factorial_remainder(a), log(x) - digamma(up), -polygamma(1, up))
}

/// The exponent (a-1) log(1 + sign u) - sign x u of P (sign -1, t = x (1-u)) and Q (sign 1, t = x (1+u)) over the prefix.
struct Shape {
    a: f64,
    x: f64,
    sign: f64,
}

impl Falling for Shape {
    fn exponent(&self, u: f64) -> f64 {
        let w = self.sign * u;
        // log(1+w) = w - w^2 excess: the large linear parts meet first
        (self.a - 1.0 - self.x) * w - (self.a - 1.0) * w * w * log1p_excess(0.0, w)
    }

    fn slope(&self, u: f64) -> f64 {
        self.sign * ((self.a - 1.0) / (1.0 + self.sign * u) - self.x)
    }

    fn shares(&self, u: f64) -> [f64; 2] {
        [log1p(self.sign * u), 0.0]
    }
}

/// log of P over the prefix: 1 + x/(a+1) + x^2/((a+1)(a+2)) + ... (Abramowitz and Stegun 6.5.29), all terms positive.
fn series(a: f64, x: f64) -> Jet {
    let mut term = 1.0;
    // sums of 1/(a+k) and its square: a term's logarithm has the derivatives -first and second
    let (mut first, mut second) = (0.0, 0.0);
    let mut sum = [term, 0.0, 0.0];
    for n in 1..MOST {
        let r = 1.0 / (a + n as f64);
        term *= x * r;
        first += r;
        second += r * r;
        sum[0] += term;
        sum[1] -= term * first;
        sum[2] += term * (first * first + second);
        if term < 1e-17 * sum[0] && x * r < 0.9 {
            break;
        }
    }
    Jet::in_a(sum[0], sum[1], sum[2]).log()
}

/// log of Q over a times the prefix: Legendre's continued fraction (Abramowitz and Stegun 6.5.31), differentiated as it is evaluated
/// (modified Lentz).
fn fraction(a: f64, x: f64) -> Jet {
    let mut b = Jet::in_a(x + 1.0 - a, -1.0, 0.0);
    let mut d = b.reciprocal();
    let mut c = Jet::constant(f64::INFINITY);
    let mut out = d;
    for i in 1..MOST {
        let i = i as f64;
        let numerator = Jet::in_a(-i * (i - a), i, 0.0);
        b.v += 2.0;
        d = (numerator * d + b).reciprocal();
        c = if c.v == f64::INFINITY { b } else { b + numerator * c.reciprocal() };
        let factor = c * d;
        out = out * factor;
        if factor.is_one() {
            break;
        }
    }
    out.log()
}

/// log(Q/a) for a < 1 and x <= 2, where P is near one: with F = log x - lgamma(1+a)/a,
/// Q/a = -F (exp(a F) - 1)/(a F) - exp(a F) sum over n >= 1 of (-x)^n / (n! (a+n)) (Abramowitz and Stegun 6.5.29).
fn small_shape(a: f64, x: f64) -> Jet {
    let mut f = Jet::constant(log(x));
    for (u, w) in unit_nodes() {
        let t = 1.0 + a * u;
        f = f - Jet::in_a(w * digamma(t), w * u * polygamma(1, t), w * u * u * polygamma(2, t));
    }
    let mut sum = Jet::constant(0.0);
    let mut power = 1.0;
    for n in 1..MOST {
        let n = n as f64;
        power *= -x / n;
        let r = 1.0 / (a + n);
        sum = sum + Jet::in_a(power * r, -power * r * r, 2.0 * power * r * r * r);
        if libm::fabs(power) < 1e-18 {
            break;
        }
    }
    let e = Jet::in_a(a, 1.0, 0.0) * f;
    (-(f * e.exp_quotient() + e.exp() * sum)).log()
}
