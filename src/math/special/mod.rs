//! Scalar special functions. Each is total: NaN outside its domain, never a panic, and the same bits on every machine
//! because all transcendental parts come from the `libm` crate.

mod bessel;
mod gamma;
mod interval;
mod logistic;
mod normal;
#[cfg(test)]
mod reference;

pub use bessel::{bessel_i, bessel_i_scaled};
pub use gamma::{digamma, lgamma, polygamma};
pub use interval::{normal_interval_slopes, normal_log_interval};
pub use logistic::{log_logistic, log_mix, log_sum_exp, log1mexp, logistic, logit};
pub(super) use normal::erfc_scaled_argument;
pub use normal::{
    erf, erfc, inverse_mills, inverse_mills_slope, normal_cdf, normal_log_cdf, normal_log_density, normal_quantile,
};
