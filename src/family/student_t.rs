//! Student's t distribution with location, scale and degrees of freedom.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The density at the median of scale 1 times the first terms of the series of the distribution function over z, z from the
/// median in scales.
macro_rules! series {
    () => {
        "exp(log1p_over(0, 1 / df) / 2 - 1 / 2 - log(2 * pi) / 2 + stirling_inverse(0, 2 / (df + 1)) \
         - stirling_inverse(0, 2 / df)) * (1 - (1 + 1 / df) * ((at - location) / scale)^2 / 6 \
         + (1 + 1 / df) * (1 + 3 / df) * ((at - location) / scale)^4 / 40)"
    };
}

/// sqrt(df log(1 + z^2 / df))
macro_rules! root {
    () => {
        "sqrt(df * log1p(((at - location) / scale)^2 / df))"
    };
}

/// log P(|T| > |t|): by the incomplete beta function; past a million degrees of freedom by a normal deviate, the expansion of Wallace
/// (1959), Annals of Mathematical Statistics 30, to the second order in 1 / df, so that what is left out is of the order of df^-3.
macro_rules! tail {
    () => {
        concat!(
            "if(df > 1e6, log(2) + normal_log_cdf(-",
            root!(),
            " * (1 - 1 / (4 * df) + (2 * ",
            root!(),
            "^2 + 3) / (96 * df^2))), beta_log_cdf(0, 0, df / 2, 1 / 2, df / (df + ((at - location) / scale)^2), ",
            "((at - location) / scale)^2 / (df + ((at - location) / scale)^2)))"
        )
    };
}

/// The family.
///
/// Written in 1 / df, with the remainders of Stirling's formula in place of two gamma functions: the normal limit is
/// approached without loss. Within a few hundredths of the median the distribution function is its power series, because there the
/// argument of the incomplete beta function has a slope of zero and its derivative has none.
pub const STUDENT_T: Family = Family {
    name: "student_t",
    response: "any numbers",
    support: Support::Real,
    parameters: &[
        RowParameter::new("location", Range::ALL, &[Link::Identity, Link::Log], "median of the response"),
        RowParameter::new(
            "scale",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "the standard deviation is scale * sqrt(df / (df - 2)) where df > 2",
        ),
        RowParameter::new(
            "df",
            Range::POSITIVE,
            &[Link::Log, Link::Identity],
            "degrees of freedom: 1 is the Cauchy law, many are the normal one",
        ),
    ],
    amounts: &[],
    log_density: "log1p_over(0, 1 / df) / 2 - 1 / 2 - log(2 * pi) / 2 \
                  + stirling_inverse(0, 2 / (df + 1)) - stirling_inverse(0, 2 / df) - log(scale) \
                  - (df + 1) / 2 * log1p(((y - location) / scale)^2 / df)",
    distribution: Some(Distribution {
        below: concat!(
            "if((1 + 1 / df) * ((at - location) / scale)^2 < 1e-4, log(1 / 2 + (at - location) / scale * ",
            series!(),
            "), if(at < location, ",
            tail!(),
            " - log(2), log1p(-exp(",
            tail!(),
            ") / 2)))"
        ),
        above: concat!(
            "if((1 + 1 / df) * ((at - location) / scale)^2 < 1e-4, log(1 / 2 - (at - location) / scale * ",
            series!(),
            "), if(at > location, ",
            tail!(),
            " - log(2), log1p(-exp(",
            tail!(),
            ") / 2)))"
        ),
        between: None,
    }),
    information: Information::Closed(&[
        ("location", "location", "(df + 1) / ((df + 3) * scale^2)"),
        ("scale", "scale", "2 * df / ((df + 3) * scale^2)"),
        ("scale", "df", "-2 / (scale * (df + 1) * (df + 3))"),
        // trigamma(df / 2) / 4 - trigamma((df + 1) / 2) / 4 - (df + 5) / (2 df (df + 1) (df + 3)), of which all is cancelled
        // at large df that can be
        (
            "df",
            "df",
            "(5 * df + 3) / (2 * df^2 * (df + 1)^2 * (df + 3)) \
             + 4 * stirling_inverse(2, 2 / df) / df^4 + 4 * stirling_inverse(1, 2 / df) / df^3 \
             - 4 * stirling_inverse(2, 2 / (df + 1)) / (df + 1)^4 - 4 * stirling_inverse(1, 2 / (df + 1)) / (df + 1)^3",
        ),
    ]),
    information_note: "closed form, by Lange, Little and Taylor (1989), Journal of the American Statistical Association 84",
    source: "Johnson, Kotz and Balakrishnan, Continuous Univariate Distributions, vol. 2, ch. 28",
    start,
    sample,
    concave: false,
};

/// The upper quartile of the law of scale 1, to 2%.
fn quartile(df: f64) -> f64 {
    0.6745 + 0.28 / df + 0.045 / (df * df)
}

fn start(m: &Moments, known: &[Option<f64>]) -> Vec<f64> {
    let spread = 0.5 * (m.quartiles[2] - m.quartiles[0]);
    // the variance over that of a normal law with the same quartiles grows as df falls to 2
    let ratio = if spread > 0.0 { m.variance / (spread / 0.6745).powi(2) } else { 1.0 };
    let df = known[2].unwrap_or(if ratio < 1.1 { 20.0 } else { (2.0 * ratio / (ratio - 1.0)).min(20.0) });
    let scale = if spread > 0.0 { spread / quartile(df) } else { m.variance.sqrt() };
    vec![m.quartiles[1], if scale > 0.0 { scale } else { m.quartiles[1].abs().max(1.0) }, df]
}

fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let chi_square = (2.0 * random.gamma(0.5 * p[2])).max(f64::MIN_POSITIVE);
    p[0] + p[1] * (random.normal() * (p[2] / chi_square).sqrt()).clamp(f64::MIN, f64::MAX)
}
