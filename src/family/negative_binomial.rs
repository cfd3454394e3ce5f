//! Negative binomial distribution of counts more dispersed than Poisson ones.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const NEGATIVE_BINOMIAL: Family = Family {
    name: "negative_binomial",
    response: "counts 0, 1, 2, ...",
    support: Support::Count,
    parameters: &[
        RowParameter::new(
            "mean",
            Range::NONNEGATIVE,
            &[Link::Log, Link::Identity],
            "expected count m (per unit of exposure, where there is one)",
        ),
        RowParameter::new(
            "dispersion",
            Range::NONNEGATIVE,
            &[Link::Log, Link::Identity],
            "k of the variance m + k m^2; 0 is Poisson",
        ),
    ],
    amounts: &["exposure"],
    // what Stirling's formula leaves, and deviances: nothing cancels at large counts, and dispersion 0 is no special case; the other
    // branch is the same where far fewer were counted than expected
    log_density: "stirling_inverse(0, dispersion / (1 + dispersion * y)) - stirling_inverse(0, dispersion) - factorial_remainder(y) \
        - deviance(y, exposure * mean * (1 + dispersion * y) / (1 + dispersion * exposure * mean)) \
        - if(dispersion * (y - exposure * mean) / (1 + dispersion * exposure * mean) < -0.5, \
        ((y - exposure * mean) / (1 + dispersion * exposure * mean) \
        - (log1p(dispersion * y) - log1p(dispersion * exposure * mean)) / dispersion), \
        dispersion * ((y - exposure * mean) / (1 + dispersion * exposure * mean))^2 \
        * log1p_excess(0, dispersion * (y - exposure * mean) / (1 + dispersion * exposure * mean))) \
        - log1p(dispersion * y) / 2",
    distribution: Some(Distribution {
        below: "negative_binomial_log_tail(0, 0, 0, at, exposure * mean, dispersion)",
        above: "negative_binomial_log_tail(1, 0, 0, at, exposure * mean, dispersion)",
        between: None,
    }),
    information: Information::Closed(&[
        ("mean", "mean", "exposure / (mean * (1 + dispersion * exposure * mean))"),
        ("dispersion", "dispersion", "negative_binomial_information(exposure * mean, dispersion)"),
    ]),
    information_note: "exact sum over the counts",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 5; in deviances after Loader (2000), Fast and accurate \
        computation of binomial probabilities",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    let mean = m.mean.max(0.5 / m.weight.max(1.0));
    // a dispersion of zero is an edge: begin a little inside
    vec![mean, ((m.variance - mean) / (mean * mean)).clamp(0.02, 1e3)]
}

fn sample(p: &[f64], amounts: &Amounts, random: &mut Random) -> f64 {
    let (mean, k) = (p[0] * amounts.exposure, p[1]);
    let level = if k > 0.0 { random.gamma(1.0 / k) * k } else { 1.0 };
    random.poisson(mean * level)
}
