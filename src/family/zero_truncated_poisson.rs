//! Poisson distribution of which the zeros are not seen.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const ZERO_TRUNCATED_POISSON: Family = Family {
    name: "zero_truncated_poisson",
    response: "counts 1, 2, ..., the zeros not being recorded",
    support: Support::CountFromOne,
    parameters: &[RowParameter::new(
        "rate",
        Range::NONNEGATIVE,
        &[Link::Log, Link::Identity],
        "expected count per unit of exposure, were zeros recorded; 0: all counts are 1",
    )],
    amounts: &["exposure"],
    // with m the mean: the Poisson mass at y - 1, times m / (1 - exp(-m)), over y; log1p_over(0, expm1(-m)) is m / (1 - exp(-m))
    log_density: "-deviance(y - 1, exposure * rate) - factorial_remainder(y - 1) - log(y) \
        + if(exposure * rate < 1, log(log1p_over(0, expm1(-exposure * rate))), log(exposure * rate) - log1mexp(exposure * rate))",
    // one or two: with the slopes that belong to them at rate 0, where the others have none; near it from the upper tail
    distribution: Some(Distribution {
        below: "if(at < 1, log(0), if(at < 3, log1p((at - 1) * exposure * rate / 2) - exposure * rate \
            + if(exposure * rate < 1, log(log1p_over(0, expm1(-exposure * rate))), log(exposure * rate) - log1mexp(exposure * rate)), \
            if(exposure * rate = 0, 0, \
            if(exposure * rate < 1, log1mexp(log1mexp(exposure * rate) - gamma_log_cdf(0, at + 1, exposure * rate)), \
            gamma_log_survival(0, at + 1, exposure * rate) - log1mexp(exposure * rate) \
            + log1mexp(gamma_log_survival(0, at + 1, exposure * rate) + exposure * rate)))))",
        above: "if(at < 1, 0, if(exposure * rate = 0, log(0), gamma_log_cdf(0, at + 1, exposure * rate) - log1mexp(exposure * rate)))",
        between: None,
    }),
    information: Information::Closed(&[(
        "rate",
        "rate",
        "exposure * if(exposure * rate < 1, (1 - exp(-exposure * rate) * log1p_excess(0, expm1(-exposure * rate))) / rate, \
        (1 - exposure * rate / expm1(exposure * rate)) / (rate * (1 - exp(-exposure * rate))))",
    )]),
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 4",
    start,
    sample,
    concave: true,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    // the mean is r / (1 - exp(-r)), about 1 + r/2 near rate 0
    let (mut low, mut high) = (1e-3, m.mean.max(2e-3));
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if -middle / libm::expm1(-middle) < m.mean {
            low = middle;
        } else {
            high = middle;
        }
    }
    vec![0.5 * (low + high)]
}

fn sample(p: &[f64], amounts: &Amounts, random: &mut Random) -> f64 {
    // the first event falls at a time known to lie within the exposure; the rest of it is free
    let mean = p[0] * amounts.exposure;
    let first = -libm::log1p(random.uniform() * libm::expm1(-mean));
    1.0 + random.poisson((mean - first).max(0.0))
}
