//! The standard normal law and the error function.

use libm::{exp, log, log1p};
use std::f64::consts::{FRAC_1_SQRT_2, FRAC_2_SQRT_PI};

/// log sqrt(2 pi).
pub(super) const LOG_SQRT_2PI: f64 = 0.918_938_533_204_672_7;
/// 1/sqrt(2 pi).
const INV_SQRT_2PI: f64 = 0.398_942_280_401_432_7;
/// What 1/sqrt(2) has beyond its double.
const FRAC_1_SQRT_2_REST: f64 = -4.833_646_656_726_457e-17;
/// Below this the asymptotic series of the Mills ratio serves: its eighth term is under 3e-15 there, and divided by x^2/2
/// in the logarithm.
const TAIL: f64 = -25.0;

/// The error function.
pub fn erf(x: f64) -> f64 {
    libm::erf(x)
}

/// 1 - erf(x), relatively accurate in the upper tail.
pub fn erfc(x: f64) -> f64 {
    libm::erfc(x)
}

/// The product of two doubles and its rounding error (Dekker 1971), for |a|, |b| < 1e150.
fn two_product(a: f64, b: f64) -> (f64, f64) {
    let split = |v: f64| {
        let c = 134_217_729.0 * v;
        let high = c - (c - v);
        (high, v - high)
    };
    let product = a * b;
    let ((ah, al), (bh, bl)) = (split(a), split(b));
    (product, ((ah * bh - product) + ah * bl + al * bh) + al * bl)
}

/// erfc(x / sqrt 2), correcting for the rounding of the argument, which the tail magnifies by x^2.
pub(crate) fn erfc_scaled_argument(x: f64) -> f64 {
    if !(1.0..40.0).contains(&x) {
        return libm::erfc(x * FRAC_1_SQRT_2);
    }
    let (t, rest) = two_product(x, FRAC_1_SQRT_2);
    let rest = rest + x * FRAC_1_SQRT_2_REST;
    libm::erfc(t) - rest * FRAC_2_SQRT_PI * exp(-t * t)
}

/// Phi(x), the standard normal distribution function, relatively accurate to 1e-15 or so in both tails.
pub fn normal_cdf(x: f64) -> f64 {
    0.5 * erfc_scaled_argument(-x)
}

/// log phi(x), the standard normal log density.
pub fn normal_log_density(x: f64) -> f64 {
    -0.5 * x * x - LOG_SQRT_2PI
}

/// phi(x), correcting for the rounding of x^2 / 2.
fn normal_density(x: f64) -> f64 {
    if !(-40.0..40.0).contains(&x) {
        return if x.is_nan() { f64::NAN } else { 0.0 };
    }
    let (square, rest) = two_product(x, x);
    INV_SQRT_2PI * exp(-0.5 * square) * (1.0 - 0.5 * rest)
}

/// x (1 - Phi(x)) / phi(x) for large x, less one: -1/x^2 + 3/x^4 - 15/x^6 + ... (Abramowitz and Stegun 26.2.12).
fn mills_series(x: f64) -> f64 {
    let v = 1.0 / (x * x);
    let mut sum = 0.0;
    for k in (1..=8).rev() {
        sum = -v * f64::from(2 * k - 1) * (1.0 + sum);
    }
    sum
}

/// log Phi(x), relative error at most 1e-14 for every x: far below zero from the asymptotic series of the Mills ratio, far
/// above from the other tail.
pub fn normal_log_cdf(x: f64) -> f64 {
    if x > 0.5 {
        log1p(-normal_cdf(-x))
    } else if x > TAIL {
        log(normal_cdf(x))
    } else {
        -0.5 * x * x - (LOG_SQRT_2PI + log(-x)) + log1p(mills_series(x))
    }
}

/// phi(x) / Phi(x), the derivative of [`normal_log_cdf`], by its own series where the difference of logarithms loses digits
/// (1e-6 at x = -1e5).
pub fn inverse_mills(x: f64) -> f64 {
    if x > TAIL { normal_density(x) / normal_cdf(x) } else { -x / (1.0 + mills_series(x)) }
}

/// The derivative of [`inverse_mills`], -m (x + m): the curvature of log Phi. In the tail x + m, the difference of two large
/// numbers, comes from the series itself.
pub fn inverse_mills_slope(x: f64) -> f64 {
    let m = inverse_mills(x);
    if x == f64::NEG_INFINITY {
        -1.0
    } else if x > TAIL {
        // From above the density is 0 before x + m overflows.
        if m == 0.0 { -0.0 } else { -m * (x + m) }
    } else {
        let series = mills_series(x);
        -m * (x * series / (1.0 + series))
    }
}

/// The value below which a standard normal falls with probability p; minus and plus infinity at 0 and 1, NaN outside.
///
/// A rational start, then three Halley steps (phi' = -x phi), each of which triples the digits.
pub fn normal_quantile(p: f64) -> f64 {
    if !(0.0..=1.0).contains(&p) {
        return f64::NAN;
    }
    if p > 0.5 {
        return -normal_quantile(1.0 - p);
    }
    if p == 0.0 {
        return f64::NEG_INFINITY;
    }
    if p == 0.5 {
        return 0.0;
    }
    // Hastings' rational start (Abramowitz and Stegun 26.2.23), error under 4.5e-4.
    let t = libm::sqrt(-2.0 * log(p));
    let mut x =
        -(t - (2.515517 + t * (0.802853 + t * 0.010328)) / (1.0 + t * (1.432788 + t * (0.189269 + t * 0.001308))));
    for _ in 0..3 {
        x -= if p < 1e-280 {
            // Where Phi is near the end of the doubles, Newton on its logarithm, nearly straight there.
            (normal_log_cdf(x) - log(p)) / inverse_mills(x)
        } else {
            // Near the middle the distance from one half is the accurate one.
            let excess = if p > 0.3 { 0.5 * libm::erf(x * FRAC_1_SQRT_2) + (0.5 - p) } else { normal_cdf(x) - p };
            let step = excess / normal_density(x);
            step / (1.0 + 0.5 * x * step)
        };
    }
    x
}
