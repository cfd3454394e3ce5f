//! Upper tail probabilities of test statistics, from the survival function itself, never as one minus the distribution function.

use crate::math::special::{erfc_scaled_argument, lgamma};
use libm::{log, log1p};
use statrs::distribution::{ChiSquared, ContinuousCDF};
use std::f64::consts::LN_10;

/// P(X >= x) for chi-square with `df` > 0 degrees of freedom; 1 at or below zero, NaN if `df` is not positive and finite.
pub fn chi_square_upper(x: f64, df: f64) -> f64 {
    if x.is_nan() || df == f64::INFINITY {
        return f64::NAN;
    }
    // ChiSquared::new refuses what is not positive.
    ChiSquared::new(df).map_or(f64::NAN, |law| law.sf(x))
}

/// log10 of [`chi_square_upper`], finite also where the probability itself underflows.
pub fn chi_square_log10_upper(x: f64, df: f64) -> f64 {
    let p = chi_square_upper(x, df);
    if p > 0.5 {
        // Close to one the distribution function has the digits.
        ChiSquared::new(df).map_or(f64::NAN, |law| log1p(-law.cdf(x)) / LN_10)
    } else if p > 1e-290 {
        log(p) / LN_10
    } else if p.is_nan() || x == f64::INFINITY {
        log(p) / LN_10
    } else {
        log_upper_gamma(0.5 * df, 0.5 * x) / LN_10
    }
}

/// P(|Z| >= |z|) for a standard normal Z.
pub fn normal_two_sided(z: f64) -> f64 {
    erfc_scaled_argument(z.abs())
}

/// log Q(a, x), the regularised upper incomplete gamma function for x well above a, from Legendre's continued fraction
/// (Abramowitz and Stegun 6.5.31) by the modified Lentz method.
fn log_upper_gamma(a: f64, x: f64) -> f64 {
    const TINY: f64 = 1e-300;
    let mut b = x + 1.0 - a;
    let mut c = 1.0 / TINY;
    let mut d = 1.0 / b;
    let mut fraction = d;
    for i in 1..100_000 {
        let i = f64::from(i);
        let numerator = -i * (i - a);
        b += 2.0;
        d = numerator * d + b;
        if d.abs() < TINY {
            d = TINY;
        }
        c = b + numerator / c;
        if c.abs() < TINY {
            c = TINY;
        }
        d = 1.0 / d;
        let change = c * d;
        fraction *= change;
        if (change - 1.0).abs() < 1e-16 {
            break;
        }
    }
    a * log(x) - x - lgamma(a) + log(fraction)
}
