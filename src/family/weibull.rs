//! Weibull distribution of lifetimes and strengths.

use super::gumbel::EULER;
use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const WEIBULL: Family = Family {
    name: "weibull",
    response: "numbers > 0, such as lifetimes or strengths",
    support: Support::Positive,
    parameters: &[
        RowParameter::new(
            "shape",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "above 1 the hazard rises with age, at 1 it is constant",
        ),
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "the value that a part 1 / e of the responses exceeds",
        ),
    ],
    amounts: &[],
    log_density: "log(shape) - log(y) + shape * log(y / scale) - exp(shape * log(y / scale))",
    distribution: Some(Distribution {
        // far down the power goes below the doubles and its logarithm does not
        below: "if(shape * log(at / scale) < -30, \
                shape * log(at / scale) - exp(shape * log(at / scale)) / 2, \
                log1mexp(exp(shape * log(at / scale))))",
        above: "-exp(shape * log(at / scale))",
        between: Some(
            "-exp(shape * log(lower / scale)) \
             + log1mexp(-exp(shape * log(upper / scale)) * expm1(-shape * log1p((upper - lower) / lower)))",
        ),
    }),
    information: Information::Closed(&[
        ("shape", "shape", "(pi^2 / 6 + digamma(2)^2) / shape^2"),
        ("shape", "scale", "-digamma(2) / scale"),
        ("scale", "scale", "(shape / scale)^2"),
    ]),
    information_note: "closed form; digamma(2) is 1 less the constant of Euler",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 1, ch. 21",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    // the logarithm is Gumbel of the smallest with scale 1 / shape
    let sd = m.log_variance.sqrt();
    let shape = known[0].unwrap_or(if sd > 0.0 { std::f64::consts::PI / (6f64.sqrt() * sd) } else { 1.0 });
    vec![shape, libm::exp(m.log_mean + EULER / shape)]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    (p[1] * libm::pow(random.exponential(), 1.0 / p[0])).clamp(f64::MIN_POSITIVE, f64::MAX)
}
