//! The logistic function, its inverse, and sums on the logarithmic scale.

use libm::{exp, expm1, log, log1p};
use std::f64::consts::LN_2;

/// 1 / (1 + exp(-x)).
pub fn logistic(x: f64) -> f64 {
    if x >= 0.0 {
        1.0 / (1.0 + exp(-x))
    } else {
        let e = exp(x);
        e / (1.0 + e)
    }
}

/// log(logistic(x)) = -log(1 + exp(-x)), without overflow at large negative x.
pub fn log_logistic(x: f64) -> f64 {
    if x >= 0.0 { -log1p(exp(-x)) } else { x - log1p(exp(x)) }
}

/// log(p / (1 - p)); minus and plus infinity at 0 and 1, NaN outside [0, 1].
pub fn logit(p: f64) -> f64 {
    if !(0.0..=1.0).contains(&p) {
        f64::NAN
    } else if p < 0.25 {
        log(p) - log1p(-p)
    } else if p <= 0.75 {
        // Exact difference beside the zero at one half.
        log1p((2.0 * p - 1.0) / (1.0 - p))
    } else {
        log(p / (1.0 - p))
    }
}

/// log(1 - exp(-x)) for x > 0; minus infinity at 0, NaN below. Switches at log 2, where neither form loses digits
/// (Maechler 2012, note on log1mexp).
pub fn log1mexp(x: f64) -> f64 {
    if x < 0.0 {
        f64::NAN
    } else if x <= LN_2 {
        log(-expm1(-x))
    } else {
        log1p(-exp(-x))
    }
}

/// log(sum exp(x_i)), shifted by the largest term: absolute error a few eps of max(1, largest |x_i|). Minus infinity for an empty
/// sum; NaN if any term is NaN.
pub fn log_sum_exp(x: &[f64]) -> f64 {
    let mut largest = f64::NEG_INFINITY;
    let mut at = usize::MAX;
    for (i, &v) in x.iter().enumerate() {
        if v.is_nan() {
            return f64::NAN;
        }
        if v > largest {
            largest = v;
            at = i;
        }
    }
    if largest.is_infinite() {
        return largest;
    }
    let rest: f64 = x.iter().enumerate().filter(|&(i, _)| i != at).map(|(_, &v)| exp(v - largest)).sum();
    largest + log1p(rest)
}

/// log(sum w_i exp(a_i)) of the flat pairs (w_1, a_1, w_2, a_2, ...), weights >= 0. A term of weight 0 contributes nothing
/// whatever its exponent. Absolute error a few eps of max(1, largest |a_i|); NaN for a negative weight or an odd number of values.
pub fn log_mix(pairs: &[f64]) -> f64 {
    if !pairs.len().is_multiple_of(2) {
        return f64::NAN;
    }
    let terms = || pairs.chunks_exact(2).map(|p| (p[0], p[1])).filter(|&(w, _)| w != 0.0);
    let mut largest = f64::NEG_INFINITY;
    for (w, a) in terms() {
        if a.is_nan() || w.is_nan() || w < 0.0 {
            return f64::NAN;
        }
        largest = largest.max(a);
    }
    if largest.is_infinite() {
        return largest;
    }
    largest + log(terms().map(|(w, a)| w * exp(a - largest)).sum())
}
