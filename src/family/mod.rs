//! The library of likelihoods: each one room, described as data.

pub mod beta;
pub mod beta_binomial;
pub mod binomial;
pub mod categorical;
pub mod cauchy;
#[cfg(test)]
mod checks;
pub mod composite;
pub mod dirichlet;
pub mod exponential;
pub mod gamma;
pub mod generalised_pareto;
pub mod geometric;
pub mod gev;
pub mod gumbel;
pub mod gumbel_smallest;
pub mod half_normal;
pub mod hypergeometric;
pub mod inverse_gaussian;
pub mod laplace;
pub mod link;
pub mod listing;
pub mod log_logistic;
pub mod logarithmic;
pub mod logistic;
pub mod lognormal;
pub mod multivariate_normal;
pub mod negative_binomial;
pub mod normal;
pub mod ordered;
pub mod paired_comparison;
pub mod pareto;
pub mod point;
pub mod poisson;
pub mod rayleigh;
pub mod student_t;
pub mod von_mises;
pub mod weibull;
pub mod zero_truncated_poisson;

pub use composite::{COMPOSITES, Composite};
pub use link::Link;
pub use listing::Listing;

use crate::math::{Random, Range};

/// What a response of the family looks like; the reader checks the data against it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Support {
    /// Any finite number.
    Real,
    /// Numbers >= 0.
    Nonnegative,
    /// Numbers > 0.
    Positive,
    /// Numbers > 0 and < 1.
    Unit,
    /// Any finite number, of which 2 pi more is the same.
    Angle,
    /// Numbers at or above the known row parameter of this name.
    From(&'static str),
    /// The value of the known row parameter of this name, on which all mass lies.
    Lump(&'static str),
    /// Whole numbers >= 0.
    Count,
    /// Whole numbers >= 1.
    CountFromOne,
    /// Whole numbers from 0 to the number of trials.
    CountOfTrials,
    /// How many successes can be among `trials` draws from `successes` and `failures`.
    Draws,
}

impl Support {
    /// Whether the response counts, so that both ends of an interval belong to it.
    pub fn is_count(self) -> bool {
        matches!(self, Support::Count | Support::CountFromOne | Support::CountOfTrials | Support::Draws)
    }

    /// Whether all mass lies on one value, beside which a density has none there.
    pub fn is_lump(self) -> bool {
        matches!(self, Support::Lump(_))
    }
}

/// Whether a row parameter is estimated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Given {
    /// It is, unless the study makes it known.
    Estimated,
    /// It must be known: the family has no likelihood to estimate it by.
    Known,
    /// It is known, with this value unless the study says another.
    KnownAs(f64),
}

/// A row parameter of a family.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RowParameter {
    /// Its name, such as `mean`.
    pub name: &'static str,
    /// Natural range.
    pub range: Range,
    /// Links it may have with terms; the first is the default. Empty: it takes no terms.
    pub links: &'static [Link],
    /// In words.
    pub meaning: &'static str,
    /// Whether it is estimated.
    pub given: Given,
}

impl RowParameter {
    /// An estimated row parameter.
    pub const fn new(name: &'static str, range: Range, links: &'static [Link], meaning: &'static str) -> RowParameter {
        RowParameter { name, range, links, meaning, given: Given::Estimated }
    }
}

/// Per-row amounts that formulas may name beside `y` and the row parameters.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Amounts {
    /// Multiplies a rate; 1 unless said.
    pub exposure: f64,
    /// Number of trials or draws; 1 unless said.
    pub trials: f64,
    /// Successes among what is drawn from.
    pub successes: f64,
    /// Failures among what is drawn from.
    pub failures: f64,
}

/// A univariate family. The formulas are texts of the expression language over `y` (or `at`), the row parameters, and the amounts
/// the family names; they are the very texts that are computed.
#[derive(Debug, Clone, Copy)]
pub struct Family {
    /// Name in a study.
    pub name: &'static str,
    /// The response in words.
    pub response: &'static str,
    /// What the response may be.
    pub support: Support,
    /// Row parameters, in order.
    pub parameters: &'static [RowParameter],
    /// Which of `exposure`, `trials`, `successes`, `failures` the formulas name.
    pub amounts: &'static [&'static str],
    /// log f(y).
    pub log_density: &'static str,
    /// Distribution function, where the family has one.
    pub distribution: Option<Distribution>,
    /// Expected information of one row.
    pub information: Information,
    /// How the information is got, in words.
    pub information_note: &'static str,
    /// Where the method or the density is published.
    pub source: &'static str,
    /// Starting values from moments: one number a row parameter, inside its range. `known` holds the values of those that are known.
    pub start: fn(moments: &Moments, known: &[Option<f64>]) -> Vec<f64>,
    /// Draws one response from row parameters (in order) and amounts.
    pub sample: fn(parameters: &[f64], amounts: &Amounts, random: &mut Random) -> f64,
    /// Whether l is concave in the row parameters or under each default link.
    pub concave: bool,
}

/// The distribution function on the log scale, as texts in `at`.
#[derive(Debug, Clone, Copy)]
pub struct Distribution {
    /// log P(Y <= at)
    pub below: &'static str,
    /// log P(Y > at)
    pub above: &'static str,
    /// log P(lower < Y <= upper) in `lower` and `upper`, where a form better than the difference of the two is known.
    pub between: Option<&'static str>,
}

/// Expected information of one row between row parameters.
#[derive(Debug, Clone, Copy)]
pub enum Information {
    /// (row parameter, row parameter, text), symmetric, zero where not listed.
    Closed(&'static [(&'static str, &'static str, &'static str)]),
    /// By sum over the support, or by quadrature.
    Computed,
}

/// Weighted summaries of a response, from which starting values are computed (per unit of exposure, or per trial).
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Moments {
    /// Sum of the weights.
    pub weight: f64,
    /// Weighted mean.
    pub mean: f64,
    /// Weighted variance about it (divisor the weight).
    pub variance: f64,
    /// Third central moment over the 3/2 power of the variance; 0 where there is no variance.
    pub skewness: f64,
    /// Smallest value.
    pub min: f64,
    /// Largest value.
    pub max: f64,
    /// Weighted quartiles: a quarter, half and three quarters of the weight lie at or below them.
    pub quartiles: [f64; 3],
    /// Mean of log y over the positive values; 0 where there is none.
    pub log_mean: f64,
    /// Variance of log y over the positive values.
    pub log_variance: f64,
    /// Mean of 1 / y over the positive values; 0 where there is none.
    pub inverse_mean: f64,
    /// Mean number of trials or draws a row (1 where there are none).
    pub trials: f64,
    /// Weighted means of cos y and sin y.
    pub direction: (f64, f64),
}

impl Moments {
    /// Summaries of values with weights; rows of weight 0 say nothing. `trials` is left 1.
    pub fn of(rows: impl Iterator<Item = (f64, f64)>) -> Moments {
        let mut rows: Vec<(f64, f64)> = rows.filter(|r| r.1 > 0.0 && r.0.is_finite()).collect();
        let mut m = Moments { trials: 1.0, ..Moments::default() };
        if rows.is_empty() {
            return m;
        }
        rows.sort_by(|a, b| a.0.total_cmp(&b.0));
        m.weight = rows.iter().map(|r| r.1).sum();
        let mean = |f: &dyn Fn(f64) -> f64| rows.iter().map(|&(y, w)| w * f(y)).sum::<f64>() / m.weight;
        let centre = mean(&|y| y);
        let variance = mean(&|y| (y - centre).powi(2));
        let third = mean(&|y| (y - centre).powi(3));
        m.direction = (mean(&libm::cos), mean(&libm::sin));
        (m.mean, m.variance) = (centre, variance);
        m.skewness = if variance > 0.0 { third / (variance * variance.sqrt()) } else { 0.0 };
        (m.min, m.max) = (rows[0].0, rows[rows.len() - 1].0);
        let mut sum = 0.0;
        let mut next = 0;
        for &(y, w) in &rows {
            sum += w;
            while next < 3 && sum >= 0.25 * (next as f64 + 1.0) * m.weight {
                m.quartiles[next] = y;
                next += 1;
            }
        }
        let positive: Vec<(f64, f64)> = rows.iter().copied().filter(|r| r.0 > 0.0).collect();
        let weight: f64 = positive.iter().map(|r| r.1).sum();
        if weight > 0.0 {
            m.log_mean = positive.iter().map(|r| r.1 * libm::log(r.0)).sum::<f64>() / weight;
            m.log_variance = positive.iter().map(|r| r.1 * (libm::log(r.0) - m.log_mean).powi(2)).sum::<f64>() / weight;
            m.inverse_mean = positive.iter().map(|r| r.1 / r.0).sum::<f64>() / weight;
        }
        m
    }
}

/// The table: a new family is a room of its own and a row here.
pub const FAMILIES: &[&Family] = &[
    &beta::BETA,
    &beta_binomial::BETA_BINOMIAL,
    &binomial::BINOMIAL,
    &cauchy::CAUCHY,
    &exponential::EXPONENTIAL,
    &gamma::GAMMA,
    &generalised_pareto::GENERALISED_PARETO,
    &geometric::GEOMETRIC,
    &gev::GEV,
    &gumbel::GUMBEL,
    &gumbel_smallest::GUMBEL_SMALLEST,
    &half_normal::HALF_NORMAL,
    &hypergeometric::HYPERGEOMETRIC,
    &inverse_gaussian::INVERSE_GAUSSIAN,
    &laplace::LAPLACE,
    &log_logistic::LOG_LOGISTIC,
    &logarithmic::LOGARITHMIC,
    &logistic::LOGISTIC,
    &lognormal::LOGNORMAL,
    &negative_binomial::NEGATIVE_BINOMIAL,
    &normal::NORMAL,
    &pareto::PARETO,
    &point::POINT,
    &poisson::POISSON,
    &rayleigh::RAYLEIGH,
    &student_t::STUDENT_T,
    &von_mises::VON_MISES,
    &weibull::WEIBULL,
    &zero_truncated_poisson::ZERO_TRUNCATED_POISSON,
];

impl Family {
    /// The family of this name.
    pub fn named(name: &str) -> Option<&'static Family> {
        FAMILIES.iter().copied().find(|f| f.name == name)
    }
}
