//! The value of each function at plain numbers.

use super::Function;
use crate::math::special;

impl Function {
    /// The value at these arguments; NaN outside the domain. The table fixes how many there are.
    pub fn value(self, x: &[f64]) -> f64 {
        let a = x[0];
        match self {
            Function::Exp => libm::exp(a),
            Function::Log => libm::log(a),
            Function::Log1p => libm::log1p(a),
            Function::Expm1 => libm::expm1(a),
            Function::Sqrt => a.sqrt(),
            Function::Sin => libm::sin(a),
            Function::Cos => libm::cos(a),
            Function::Tan => libm::tan(a),
            Function::Asin => libm::asin(a),
            Function::Acos => libm::acos(a),
            Function::Atan => libm::atan(a),
            Function::Sinh => libm::sinh(a),
            Function::Cosh => libm::cosh(a),
            Function::Tanh => libm::tanh(a),
            Function::Logistic => special::logistic(a),
            Function::Logit => special::logit(a),
            Function::Lgamma => special::lgamma(a),
            Function::Digamma => special::digamma(a),
            Function::BesselI => special::bessel_i(a, x[1]),
            Function::Erf => special::erf(a),
            Function::Erfc => special::erfc(a),
            Function::NormalCdf => special::normal_cdf(a),
            Function::NormalLogCdf => special::normal_log_cdf(a),
            Function::LogSumExp => special::log_sum_exp(x),
            Function::Abs => a.abs(),
            Function::Min => x.iter().fold(a, |m, &v| if v < m || v.is_nan() { v } else { m }),
            Function::Max => x.iter().fold(a, |m, &v| if v > m || v.is_nan() { v } else { m }),
            Function::LogLogistic => special::log_logistic(a),
            Function::Log1mexp => special::log1mexp(a),
            Function::NormalLogInterval => special::normal_log_interval(a, x[1]),
            Function::InverseMills => special::inverse_mills(a),
            Function::InverseMillsSlope => special::inverse_mills_slope(a),
            Function::Polygamma => special::polygamma(a as u32, x[1]),
            Function::LogMix => special::log_mix(x),
            Function::Deviance => special::deviance(a, x[1]),
            Function::FactorialRemainder => special::factorial_remainder(a),
            Function::StirlingInverse => special::stirling_inverse(a, x[1]),
            Function::Log1pOver => special::log1p_over(a, x[1]),
            Function::Log1pExcess => special::log1p_excess(a, x[1]),
            Function::GammaLogCdf => special::gamma_log_cdf(a, x[1], x[2]),
            Function::GammaLogSurvival => special::gamma_log_survival(a, x[1], x[2]),
            Function::BetaLogCdf => special::beta_log_cdf(a, x[1], x[2], x[3], x[4], x[5]),
            Function::LogBesselI0 => special::log_bessel_i0(a),
            Function::LogBesselI0Scaled => special::log_bessel_i0_scaled(a),
            Function::BesselRatio => special::bessel_ratio(a),
            Function::BesselRatioSlope => special::bessel_ratio_slope(a),
            Function::HypergeometricLogSum => special::hypergeometric_log_sum(a, x[1], x[2], x[3], x[4]),
            Function::HypergeometricLogMass => special::hypergeometric_log_mass(a, x[1], x[2], x[3], x[4], x[5]),
            Function::HypergeometricLogTail => special::hypergeometric_log_tail(a, x[1], x[2], x[3], x[4], x[5], x[6]),
            Function::NegativeBinomialInformation => special::negative_binomial_information(a, x[1]),
            Function::BetaBinomialInformation => special::beta_binomial_information(a, x[1], x[2], x[3], x[4]),
            Function::NegativeBinomialLogTail => special::negative_binomial_log_tail(a, x[1], x[2], x[3], x[4], x[5]),
            Function::BetaBinomialLogTail => special::beta_binomial_log_tail(a, x[1], x[2], x[3], x[4], x[5], x[6]),
            Function::LogarithmicLogTail => special::logarithmic_log_tail(a, x[1], x[2], x[3]),
        }
    }
}
