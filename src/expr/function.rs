//! The table of functions an expression may call.

/// Every function of the language.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[allow(missing_docs, reason = "each variant is the function of that name; the table below documents it")]
pub enum Function {
    Exp,
    Log,
    Log1p,
    Expm1,
    Sqrt,
    Sin,
    Cos,
    Tan,
    Asin,
    Acos,
    Atan,
    Sinh,
    Cosh,
    Tanh,
    Logistic,
    Logit,
    Lgamma,
    Digamma,
    BesselI,
    Erf,
    Erfc,
    NormalCdf,
    NormalLogCdf,
    LogSumExp,
    Abs,
    Min,
    Max,
    // Further ones the families are written in; users may call them too.
    /// `log_logistic(x)` = -log(1 + exp(-x))
    LogLogistic,
    /// `log1mexp(x)` = log(1 - exp(-x)), x > 0
    Log1mexp,
    /// `normal_log_interval(a, b)` = log(Phi(b) - Phi(a)), a < b
    NormalLogInterval,
    /// `inverse_mills(x)` = phi(x) / Phi(x), the derivative of `normal_log_cdf`
    InverseMills,
    /// `inverse_mills_slope(x)`, its derivative
    InverseMillsSlope,
    /// `polygamma(m, x)`, m a whole number >= 1 (1: trigamma)
    Polygamma,
    /// `log_mix(w1, a1, w2, a2, ...)` = log(sum w_i exp(a_i)), weights >= 0
    LogMix,
    /// `deviance(x, m)` = x log(x/m) - x + m, x, m >= 0
    Deviance,
    /// `factorial_remainder(x)` = lgamma(x+1) - x log x + x
    FactorialRemainder,
    /// `stirling_inverse(order, c)`, derivatives of lgamma(1/c) less Stirling's formula
    StirlingInverse,
    /// `log1p_over(order, w)`, derivatives of log1p(w)/w
    Log1pOver,
    /// `log1p_excess(order, w)`, derivatives of (w - log1p(w))/w^2
    Log1pExcess,
    /// `gamma_log_cdf(order, a, x)`, derivatives in a of the log of the regularised incomplete gamma function P(a, x)
    GammaLogCdf,
    /// `gamma_log_survival(order, a, x)`, likewise of Q = 1 - P
    GammaLogSurvival,
    /// `beta_log_cdf(i, j, a, b, x, y)`, derivatives in a and b of the log of I_x(a, b), y = 1 - x
    BetaLogCdf,
    /// `log_bessel_i0(x)` = log I_0(x)
    LogBesselI0,
    /// `log_bessel_i0_scaled(x)` = log I_0(x) - x, x >= 0
    LogBesselI0Scaled,
    /// `bessel_ratio(x)` = I_1(x) / I_0(x), its derivative
    BesselRatio,
    /// `bessel_ratio_slope(x)`, the derivative of that
    BesselRatioSlope,
    /// `hypergeometric_log_sum(order, t, s, f, n)`, derivatives of log sum_u C(s, u) C(f, n - u) exp(t u)
    HypergeometricLogSum,
    /// `hypergeometric_log_mass(order, y, w, s, f, n)`, derivatives in the odds ratio w of its log mass at y
    HypergeometricLogMass,
    /// `hypergeometric_log_tail(side, order, y, w, s, f, n)`, of log P(Y <= y) (side 0) or log P(Y > y) (side 1)
    HypergeometricLogTail,
    /// `negative_binomial_information(mean, k)`: expected information about k
    NegativeBinomialInformation,
    /// `beta_binomial_information(i, j, n, p, rho)`: expected information between p (0) and rho (1)
    BetaBinomialInformation,
    /// `negative_binomial_log_tail(side, i, j, y, mean, k)`
    NegativeBinomialLogTail,
    /// `beta_binomial_log_tail(side, i, j, y, n, p, rho)`
    BetaBinomialLogTail,
    /// `logarithmic_log_tail(side, order, y, p)`
    LogarithmicLogTail,
}

/// One row of the table: the function, its written name, how many arguments (fewest, most), and what it is in words.
pub struct Entry(pub Function, pub &'static str, pub usize, pub usize, pub &'static str);

/// All functions by name.
pub const TABLE: &[Entry] = &[
    Entry(Function::Exp, "exp", 1, 1, "e to the power x"),
    Entry(Function::Log, "log", 1, 1, "natural logarithm"),
    Entry(Function::Log1p, "log1p", 1, 1, "log(1 + x), accurate near 0"),
    Entry(Function::Expm1, "expm1", 1, 1, "exp(x) - 1, accurate near 0"),
    Entry(Function::Sqrt, "sqrt", 1, 1, "square root"),
    Entry(Function::Sin, "sin", 1, 1, "sine"),
    Entry(Function::Cos, "cos", 1, 1, "cosine"),
    Entry(Function::Tan, "tan", 1, 1, "tangent"),
    Entry(Function::Asin, "asin", 1, 1, "inverse sine"),
    Entry(Function::Acos, "acos", 1, 1, "inverse cosine"),
    Entry(Function::Atan, "atan", 1, 1, "inverse tangent"),
    Entry(Function::Sinh, "sinh", 1, 1, "hyperbolic sine"),
    Entry(Function::Cosh, "cosh", 1, 1, "hyperbolic cosine"),
    Entry(Function::Tanh, "tanh", 1, 1, "hyperbolic tangent"),
    Entry(Function::Logistic, "logistic", 1, 1, "1 / (1 + exp(-x))"),
    Entry(Function::Logit, "logit", 1, 1, "log(x / (1 - x))"),
    Entry(Function::Lgamma, "lgamma", 1, 1, "logarithm of the gamma function"),
    Entry(Function::Digamma, "digamma", 1, 1, "derivative of lgamma"),
    Entry(Function::BesselI, "bessel_i", 2, 2, "modified Bessel function of the first kind, (order, x)"),
    Entry(Function::Erf, "erf", 1, 1, "error function"),
    Entry(Function::Erfc, "erfc", 1, 1, "1 - erf(x), accurate in the tail"),
    Entry(Function::NormalCdf, "normal_cdf", 1, 1, "standard normal distribution function"),
    Entry(Function::NormalLogCdf, "normal_log_cdf", 1, 1, "its logarithm, accurate far in the tail"),
    Entry(Function::LogSumExp, "log_sum_exp", 1, usize::MAX, "log of the sum of exponentials"),
    Entry(Function::Abs, "abs", 1, 1, "absolute value"),
    Entry(Function::Min, "min", 1, usize::MAX, "smallest"),
    Entry(Function::Max, "max", 1, usize::MAX, "largest"),
    Entry(Function::LogLogistic, "log_logistic", 1, 1, "log(logistic(x))"),
    Entry(Function::Log1mexp, "log1mexp", 1, 1, "log(1 - exp(-x)), x > 0"),
    Entry(
        Function::NormalLogInterval,
        "normal_log_interval",
        2,
        2,
        "log of the standard normal probability between a and b",
    ),
    Entry(
        Function::InverseMills,
        "inverse_mills",
        1,
        1,
        "normal density over distribution function, accurate far in the tail",
    ),
    Entry(Function::InverseMillsSlope, "inverse_mills_slope", 1, 1, "derivative of inverse_mills"),
    Entry(Function::Polygamma, "polygamma", 2, 2, "derivative of digamma of the given order, (order, x)"),
    Entry(Function::LogMix, "log_mix", 2, usize::MAX, "log(w1 exp(a1) + w2 exp(a2) + ...), (w1, a1, w2, a2, ...)"),
    Entry(Function::Deviance, "deviance", 2, 2, "x log(x/m) - x + m, accurate near x = m, (x, m)"),
    Entry(
        Function::FactorialRemainder,
        "factorial_remainder",
        1,
        1,
        "lgamma(x + 1) - x log(x) + x, accurate at large x",
    ),
    Entry(
        Function::StirlingInverse,
        "stirling_inverse",
        2,
        2,
        "derivative of the given order of lgamma(1/c) - (1/c - 1/2) log(1/c) + 1/c - log(2 pi)/2, (order, c)",
    ),
    Entry(Function::Log1pOver, "log1p_over", 2, 2, "derivative of the given order of log1p(w)/w, (order, w)"),
    Entry(
        Function::Log1pExcess,
        "log1p_excess",
        2,
        2,
        "derivative of the given order of (w - log1p(w))/w^2, (order, w)",
    ),
    Entry(
        Function::GammaLogCdf,
        "gamma_log_cdf",
        3,
        3,
        "derivative in a of the given order of log P(a, x), the incomplete gamma function, (order, a, x)",
    ),
    Entry(
        Function::GammaLogSurvival,
        "gamma_log_survival",
        3,
        3,
        "derivative in a of the given order of log(1 - P(a, x)), (order, a, x)",
    ),
    Entry(
        Function::BetaLogCdf,
        "beta_log_cdf",
        6,
        6,
        "derivative in a and b of the given orders of log I_x(a, b), the incomplete beta function, (order in a, order in b, a, b, \
         x, 1 - x)",
    ),
    Entry(Function::LogBesselI0, "log_bessel_i0", 1, 1, "log of the modified Bessel function of order 0"),
    Entry(Function::LogBesselI0Scaled, "log_bessel_i0_scaled", 1, 1, "log_bessel_i0(x) - x, accurate for large x >= 0"),
    Entry(
        Function::BesselRatio,
        "bessel_ratio",
        1,
        1,
        "derivative of log_bessel_i0: ratio of Bessel functions 1 and 0",
    ),
    Entry(Function::BesselRatioSlope, "bessel_ratio_slope", 1, 1, "derivative of bessel_ratio"),
    Entry(
        Function::HypergeometricLogSum,
        "hypergeometric_log_sum",
        5,
        5,
        "derivative of the given order in t of log(sum over u of C(s, u) C(f, n - u) exp(t u)), (order, t, s, f, n)",
    ),
    Entry(
        Function::HypergeometricLogMass,
        "hypergeometric_log_mass",
        6,
        6,
        "derivative of the given order in the odds ratio w of log P(Y = y), (order, y, w, successes, failures, draws)",
    ),
    Entry(
        Function::HypergeometricLogTail,
        "hypergeometric_log_tail",
        7,
        7,
        "the same of log P(Y <= y) (side 0) or log P(Y > y) (side 1), (side, order, y, w, successes, failures, draws)",
    ),
    Entry(
        Function::NegativeBinomialInformation,
        "negative_binomial_information",
        2,
        2,
        "expected information of a negative binomial count about its dispersion, (mean, dispersion)",
    ),
    Entry(
        Function::BetaBinomialInformation,
        "beta_binomial_information",
        5,
        5,
        "expected information of a beta-binomial count, (i, j, trials, mean, overdispersion), 0 for the mean and 1 for the overdispersion",
    ),
    Entry(
        Function::NegativeBinomialLogTail,
        "negative_binomial_log_tail",
        6,
        6,
        "derivative of order i in the mean, j in the dispersion of log P(Y <= y) or log P(Y > y), (side, i, j, y, mean, k)",
    ),
    Entry(
        Function::BetaBinomialLogTail,
        "beta_binomial_log_tail",
        7,
        7,
        "derivative of order i in p, j in rho of log P(Y <= y) or log P(Y > y), (side, i, j, y, trials, p, rho)",
    ),
    Entry(
        Function::LogarithmicLogTail,
        "logarithmic_log_tail",
        4,
        4,
        "derivative of the given order in p of log P(Y <= y) or log P(Y > y), (side, order, y, p)",
    ),
];

impl Function {
    /// The function with this written name.
    pub fn named(name: &str) -> Option<Function> {
        TABLE.iter().find(|e| e.1 == name).map(|e| e.0)
    }

    /// Its row in the table.
    pub fn entry(self) -> &'static Entry {
        TABLE.iter().find(|e| e.0 == self).unwrap_or(&TABLE[0])
    }
}
