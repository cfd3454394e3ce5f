//! Beta-binomial distribution of successes among trials whose probability varies.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const BETA_BINOMIAL: Family = Family {
    name: "beta_binomial",
    response: "successes, whole numbers from 0 to the number of trials",
    support: Support::CountOfTrials,
    parameters: &[
        RowParameter::new(
            "mean",
            Range::UNIT,
            &[Link::Logit, Link::Probit, Link::ComplementaryLogLog, Link::Log, Link::Identity],
            "expected share of successes p",
        ),
        RowParameter::new(
            "overdispersion",
            Range { low: 0.0, high: 1.0, low_closed: true, high_closed: false },
            &[Link::Logit, Link::Identity],
            "correlation rho of two trials of one row: the variance is n p (1 - p) (1 + (n - 1) rho); 0 is binomial",
        ),
    ],
    amounts: &["trials"],
    // two cells and the whole, each in deviances and what Stirling's formula leaves: overdispersion 0 is no special case; a cell
    // without count takes a form that holds where nothing is expected in it either, one with far fewer than expected another
    log_density: "if(y = 0, -mean * trials * log1p_over(0, trials * overdispersion / (1 - overdispersion)), \
        -deviance(y, trials * (mean * (1 - overdispersion) + overdispersion * y) / (1 + (trials - 1) * overdispersion)) \
        - if(overdispersion * (y - trials * mean) / (mean * (1 + (trials - 1) * overdispersion)) < -0.5, \
        (1 - overdispersion) * ((y - trials * mean) / (1 + (trials - 1) * overdispersion) \
        - (log1p(overdispersion * y / ((1 - overdispersion) * mean)) - log1p(trials * overdispersion / (1 - overdispersion))) \
        * mean / overdispersion), \
        overdispersion * (1 - overdispersion) * ((y - trials * mean) / (1 + (trials - 1) * overdispersion))^2 / mean \
        * log1p_excess(0, overdispersion * (y - trials * mean) / (mean * (1 + (trials - 1) * overdispersion)))) \
        - log1p(overdispersion * y / ((1 - overdispersion) * mean)) / 2 \
        + stirling_inverse(0, overdispersion / (mean * (1 - overdispersion) + overdispersion * y)) \
        - stirling_inverse(0, overdispersion / ((1 - overdispersion) * mean))) \
        + if(y = trials, -(1 - mean) * trials * log1p_over(0, trials * overdispersion / (1 - overdispersion)), \
        -deviance(trials - y, trials * ((1 - mean) * (1 - overdispersion) + overdispersion * (trials - y)) \
        / (1 + (trials - 1) * overdispersion)) \
        - if(overdispersion * (trials * mean - y) / ((1 - mean) * (1 + (trials - 1) * overdispersion)) < -0.5, \
        (1 - overdispersion) * ((trials * mean - y) / (1 + (trials - 1) * overdispersion) \
        - (log1p(overdispersion * (trials - y) / ((1 - overdispersion) * (1 - mean))) \
        - log1p(trials * overdispersion / (1 - overdispersion))) * (1 - mean) / overdispersion), \
        overdispersion * (1 - overdispersion) * ((y - trials * mean) / (1 + (trials - 1) * overdispersion))^2 / (1 - mean) \
        * log1p_excess(0, overdispersion * (trials * mean - y) / ((1 - mean) * (1 + (trials - 1) * overdispersion)))) \
        - log1p(overdispersion * (trials - y) / ((1 - overdispersion) * (1 - mean))) / 2 \
        + stirling_inverse(0, overdispersion / ((1 - mean) * (1 - overdispersion) + overdispersion * (trials - y))) \
        - stirling_inverse(0, overdispersion / ((1 - overdispersion) * (1 - mean)))) \
        + log1p(trials * overdispersion / (1 - overdispersion)) / 2 \
        - stirling_inverse(0, overdispersion / (1 + (trials - 1) * overdispersion)) \
        + stirling_inverse(0, overdispersion / (1 - overdispersion)) \
        + factorial_remainder(trials) - factorial_remainder(y) - factorial_remainder(trials - y)",
    distribution: Some(Distribution {
        below: "beta_binomial_log_tail(0, 0, 0, at, trials, mean, overdispersion)",
        above: "beta_binomial_log_tail(1, 0, 0, at, trials, mean, overdispersion)",
        between: None,
    }),
    information: Information::Closed(&[
        ("mean", "mean", "beta_binomial_information(0, 0, trials, mean, overdispersion)"),
        ("mean", "overdispersion", "beta_binomial_information(0, 1, trials, mean, overdispersion)"),
        ("overdispersion", "overdispersion", "beta_binomial_information(1, 1, trials, mean, overdispersion)"),
    ]),
    information_note: "exact sum over the counts",
    source: "Skellam (1948), Journal of the Royal Statistical Society B 10; in deviances after Loader (2000), Fast and accurate \
        computation of binomial probabilities",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    let p = (m.mean * m.weight + 0.5) / (m.weight + 1.0);
    let n = m.trials.max(1.0);
    let excess = m.variance * n / (p * (1.0 - p)) - 1.0;
    // an overdispersion of zero is an edge: begin a little inside; single trials say nothing of it
    vec![p, if n > 1.0 { (excess / (n - 1.0)).clamp(0.01, 0.9) } else { 0.1 }]
}

fn sample(p: &[f64], amounts: &Amounts, random: &mut Random) -> f64 {
    let (mean, rho) = (p[0], p[1]);
    if rho == 0.0 || mean == 0.0 || mean == 1.0 {
        return random.binomial(amounts.trials, mean);
    }
    let size = (1.0 - rho) / rho;
    let drawn = random.beta(mean * size, (1.0 - mean) * size);
    // both gammas below the smallest double: all trials alike
    let share = if drawn.is_nan() { f64::from(u8::from(random.uniform() < mean)) } else { drawn };
    random.binomial(amounts.trials, share)
}
