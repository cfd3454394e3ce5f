//! Von Mises distribution of directions.

use super::{Amounts, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range};
use std::f64::consts::PI;

/// The family.
pub const VON_MISES: Family = Family {
    name: "von_mises",
    response: "angles in radians; 2 pi more is the same direction",
    support: Support::Angle,
    parameters: &[
        RowParameter::new("mean", Range::ALL, &[Link::Identity], "mean direction in radians; 2 pi more is the same"),
        RowParameter::new(
            "concentration",
            Range::NONNEGATIVE,
            &[Link::Log, Link::Identity],
            "0 where all directions are alike; many times 1 / variance of a small angle",
        ),
    ],
    amounts: &[],
    log_density: "-2 * concentration * sin((y - mean) / 2)^2 - log_bessel_i0_scaled(concentration) - log(2 * pi)",
    distribution: None,
    information: Information::Closed(&[
        ("mean", "mean", "concentration * bessel_ratio(concentration)"),
        ("concentration", "concentration", "bessel_ratio_slope(concentration)"),
    ]),
    information_note: "closed form",
    source: "Mardia and Jupp (2000), Directional Statistics, sec. 3.5.4 and 5.3",
    start,
    sample,
    concave: false,
};

fn start(m: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    let (c, s) = m.direction;
    let r = libm::hypot(c, s);
    // the inverse of the ratio of Bessel functions: Mardia and Jupp, sec. 5.3.1
    let concentration = if r < 0.53 {
        2.0 * r + r.powi(3) + 5.0 / 6.0 * r.powi(5)
    } else if r < 0.85 {
        -0.4 + 1.39 * r + 0.43 / (1.0 - r)
    } else {
        1.0 / (r.powi(3) - 4.0 * r * r + 3.0 * r).max(1e-6)
    };
    vec![libm::atan2(s, c), concentration]
}

/// Best and Fisher (1979), Applied Statistics 28: rejection from a wrapped Cauchy law. The angle drawn lies within pi of 0.
fn sample(p: &[f64], _: &Amounts, random: &mut Random) -> f64 {
    let k = p[1];
    // so flat a density that a uniform draw differs by less than its rounding is seen
    if k < 1e-9 {
        return PI * (2.0 * random.uniform() - 1.0);
    }
    let root = (1.0 + 4.0 * k * k).sqrt();
    let a = 1.0 + root;
    // (a - sqrt(2 a)) / (2 k) without its cancellation
    let b = 2.0 * k * a / (a * (a + (2.0 * a).sqrt()));
    let r = (1.0 + b * b) / (2.0 * b);
    let cosine = loop {
        let z = libm::cos(PI * random.uniform());
        let f = (1.0 + r * z) / (r + z);
        let c = k * (r - f);
        let u = random.uniform();
        if c * (2.0 - c) > u || libm::log(c / u) + 1.0 >= c {
            break f;
        }
    };
    let turn = libm::acos(cosine.clamp(-1.0, 1.0));
    let angle = p[0] + if random.uniform() < 0.5 { -turn } else { turn };
    angle - 2.0 * PI * libm::round(angle / (2.0 * PI))
}
