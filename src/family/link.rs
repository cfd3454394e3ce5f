//! Links between a row parameter and its linear predictor.

use crate::math::special;

/// A link function.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Link {
    /// parameter = predictor
    Identity,
    /// log(parameter) = predictor
    Log,
    /// log(p / (1 - p)) = predictor
    Logit,
    /// Phi^-1(p) = predictor
    Probit,
    /// log(-log(1 - p)) = predictor
    ComplementaryLogLog,
}

impl Link {
    /// All links.
    pub const ALL: [Link; 5] = [Link::Identity, Link::Log, Link::Logit, Link::Probit, Link::ComplementaryLogLog];

    /// The name in a study.
    pub fn text(self) -> &'static str {
        match self {
            Link::Identity => "identity",
            Link::Log => "log",
            Link::Logit => "logit",
            Link::Probit => "probit",
            Link::ComplementaryLogLog => "complementary_log_log",
        }
    }

    /// The link of this name.
    pub fn named(name: &str) -> Option<Link> {
        Link::ALL.into_iter().find(|l| l.text() == name)
    }

    /// Predictor from parameter.
    pub fn forward(self, value: f64) -> f64 {
        match self {
            Link::Identity => value,
            Link::Log => libm::log(value),
            Link::Logit => special::logit(value),
            Link::Probit => special::normal_quantile(value),
            Link::ComplementaryLogLog => libm::log(-libm::log1p(-value)),
        }
    }

    /// The inverse, as a text in `eta`.
    pub fn inverse(self) -> &'static str {
        match self {
            Link::Identity => "eta",
            Link::Log => "exp(eta)",
            Link::Logit => "logistic(eta)",
            Link::Probit => "normal_cdf(eta)",
            Link::ComplementaryLogLog => "-expm1(-exp(eta))",
        }
    }
}
