//! Logarithmic (series) distribution of counts from one.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};

/// The family.
pub const LOGARITHMIC: Family = Family {
    name: "logarithmic",
    response: "counts 1, 2, ..., such as individuals a species",
    support: Support::CountFromOne,
    parameters: &[RowParameter::new(
        "probability",
        Range { low: 0.0, high: 1.0, low_closed: false, high_closed: false },
        &[Link::Logit, Link::Probit, Link::ComplementaryLogLog, Link::Identity],
        "p of the mass p^y / (-y log(1 - p))",
    )],
    amounts: &[],
    // -log(1 - p) is p log1p_over(0, -p)
    log_density: "(y - 1) * log(probability) - log(y) - log(log1p_over(0, -probability))",
    distribution: Some(Distribution {
        below: "logarithmic_log_tail(0, 0, at, probability)",
        above: "logarithmic_log_tail(1, 0, at, probability)",
        between: None,
    }),
    information: Information::Closed(&[(
        "probability",
        "probability",
        "log1p_excess(0, -probability) / (probability * (1 - probability)^2 * log1p_over(0, -probability)^2)",
    )]),
    information_note: "closed form",
    source: "Johnson, Kemp and Kotz, Univariate Discrete Distributions, ch. 7",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    // the mean is p / ((1 - p) (-log(1 - p))), increasing in the log odds
    let mean = |p: f64| -p / ((1.0 - p) * libm::log1p(-p));
    let (mut low, mut high) = (-7.0, 30.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if mean(crate::math::special::logistic(middle)) < m.mean {
            low = middle;
        } else {
            high = middle;
        }
    }
    vec![crate::math::special::logistic(0.5 * (low + high))]
}

/// Kemp (1981), Applied Statistics 30: a geometric count whose probability is itself drawn.
fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let v = random.uniform();
    if v > p[0] {
        return 1.0;
    }
    let q = -libm::expm1(random.uniform() * libm::log1p(-p[0]));
    if v < q * q {
        (1.0 + libm::log(v) / libm::log(q)).floor()
    } else if v > q {
        1.0
    } else {
        2.0
    }
}
