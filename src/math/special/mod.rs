//! Scalar special functions. Each is total: NaN outside its domain, never a panic, and the same bits on every machine
//! because all transcendental parts come from the `libm` crate.

mod bessel;
mod counts;
mod gamma;
mod incomplete_beta;
mod incomplete_gamma;
mod interval;
mod jet;
mod logistic;
mod mass;
mod moments;
mod normal;
#[cfg(test)]
mod reference;
mod smooth;
mod stirling;

pub use bessel::{bessel_i, bessel_ratio, bessel_ratio_slope, log_bessel_i0, log_bessel_i0_scaled};
pub use counts::{deviance, factorial_remainder};
pub use gamma::{digamma, lgamma, polygamma};
pub use incomplete_beta::beta_log_cdf;
pub use incomplete_gamma::{gamma_log_cdf, gamma_log_survival};
pub use interval::normal_log_interval;
pub use logistic::{log_logistic, log_mix, log_sum_exp, log1mexp, logistic, logit};
pub use mass::{
    beta_binomial_information, beta_binomial_log_tail, hypergeometric_log_mass, hypergeometric_log_sum,
    hypergeometric_log_tail, logarithmic_log_tail, negative_binomial_information, negative_binomial_log_tail,
};
pub(super) use normal::erfc_scaled_argument;
pub use normal::{
    erf, erfc, inverse_mills, inverse_mills_slope, normal_cdf, normal_log_cdf, normal_log_density, normal_quantile,
};
pub use smooth::{log1p_excess, log1p_over};
pub use stirling::stirling_inverse;

/// A derivative order handed in as a double: a whole number up to `most`.
fn whole(order: f64, most: usize) -> Option<usize> {
    (0..=most).find(|&m| m as f64 == order)
}
