//! Sums over very many counts: the mass as a smooth function of the count is integrated over panels, and the ends of the integral
//! are corrected as by Euler and Maclaurin.

use super::super::jet::unit_nodes;
use super::{Mass, REST, Sums};

/// So many counts at either end are added one by one; the mass there may change from count to count.
pub(super) const SINGLE: f64 = 4096.0;
/// A panel is made so small that the logarithm of the mass changes by no more than this; twelve points then integrate it to
/// rounding.
const SPREAD: f64 = 4.0;

/// Adds what is left after the first [`SINGLE`] counts from `from` towards `end` (which may be infinite).
pub(super) fn rest(mass: &impl Mass, from: f64, end: f64, upward: bool, sums: &mut Sums) {
    let sign = if upward { 1.0 } else { -1.0 };
    let near = from + sign * (SINGLE - 0.5);
    let far = end - sign * (SINGLE - 0.5);
    boundary(mass, near, sign, 1.0, sums);
    let (mut at, mut width, mut done) = (near, SINGLE, false);
    let mut here = mass.at(at).value;
    while !done {
        let room = (far - at).abs();
        // no panel longer than half its distance from an end, where the mass need not be analytic
        width = width.min((0.5 * room).max(SINGLE));
        if width >= room {
            (width, done) = (room, true);
        }
        let there = loop {
            let (middle, there) = (mass.at(at + sign * 0.5 * width).value, mass.at(at + sign * width).value);
            let spread = here.max(middle).max(there) - here.min(middle).min(there);
            // not a number: beyond the range of doubles
            if spread <= SPREAD || spread.is_nan() || width < 2.0 {
                break there;
            }
            (width, done) = (0.5 * width, false);
        };
        let before = sums.total;
        for (u, weight) in unit_nodes() {
            sums.add_jet(width * weight, &mass.at(at + sign * width * u));
        }
        let added = sums.total - before;
        if added.is_nan() || (added <= REST * sums.total && mass.limit(upward) < f64::INFINITY) {
            return;
        }
        (at, here) = (at + sign * width, there);
        width *= 2.0;
    }
    boundary(mass, far, sign, -1.0, sums);
    let last = mass.at(end);
    if last.value.is_finite() {
        sums.walk(mass, &last, end, SINGLE - 1.0, !upward, f64::INFINITY);
    }
}

/// The sum beyond a point half way between two counts is the integral beyond it plus 1/24 of the first derivative there less 7/5760
/// of the third; the derivatives by differences of the four counts around.
fn boundary(mass: &impl Mass, at: f64, sign: f64, side: f64, sums: &mut Sums) {
    for (place, weight) in [(-1.5, 17.0), (-0.5, -291.0), (0.5, 291.0), (1.5, -17.0)] {
        sums.add_jet(side * weight / 5760.0, &mass.at(at + sign * place));
    }
}

#[cfg(test)]
mod tests {
    use super::super::{beta_binomial_log_tail, negative_binomial_log_tail};
    use crate::math::special::{gamma_log_cdf, gamma_log_survival};

    fn near(found: f64, want: f64, tolerance: f64, what: &str) {
        assert!((found - want).abs() <= tolerance * want.abs().max(1.0), "{what}: {found} not {want}");
    }

    #[test]
    fn dispersion_one_is_geometric() {
        for mean in [1e5_f64, 1e9, 1e14] {
            for share in [0.01, 0.7, 3.0, 40.0] {
                let y = (share * mean).floor();
                let what = format!("mean {mean}, y {y}");
                // P(Y > y) = (m / (1 + m))^(y + 1)
                let above = -(y + 1.0) * libm::log1p(1.0 / mean);
                let below = libm::log(-libm::expm1(above));
                let slope = (y + 1.0) / (mean * (1.0 + mean));
                let at = |side, i| negative_binomial_log_tail(side, i, 0.0, y, mean, 1.0);
                // some hundred panels and thousands of ratios, each with some roundings
                near(at(1.0, 0.0), above, 1e-12, &what);
                near(at(0.0, 0.0), below, 1e-12, &what);
                near(at(1.0, 1.0) / slope, 1.0, 1e-11, &what);
                let curvature = -slope * (1.0 / mean + 1.0 / (1.0 + mean));
                near(at(1.0, 2.0) / curvature, 1.0, 1e-10, &what);
            }
        }
    }

    #[test]
    fn dispersion_zero_is_poisson() {
        for mean in [1e8_f64, 1e10] {
            for steps in [-20.0, -1.0, 0.0, 2.0, 30.0] {
                let y = (mean + steps * mean.sqrt()).floor();
                let at = |side| negative_binomial_log_tail(side, 0.0, 0.0, y, mean, 0.0);
                near(at(0.0), gamma_log_survival(0.0, y + 1.0, mean), 1e-11, "below");
                near(at(1.0), gamma_log_cdf(0.0, y + 1.0, mean), 1e-11, "above");
            }
        }
    }

    #[test]
    fn shapes_of_one_are_uniform_and_half_a_point_is_symmetric() {
        for n in [1e5_f64, 1e9] {
            for share in [1e-4, 0.2, 0.5, 0.93] {
                let y = (share * n).floor();
                let below = |i: f64, j: f64, rho: f64| beta_binomial_log_tail(0.0, i, j, y, n, 0.5, rho);
                // rho = 1/3 makes both shapes 1
                near(below(0.0, 0.0, 1.0 / 3.0), libm::log((y + 1.0) / (n + 1.0)), 1e-11, "uniform");
                for rho in [1e-7, 0.02, 0.9] {
                    let what = format!("n {n}, y {y}, rho {rho}");
                    let mirrored = |i: f64, j: f64| beta_binomial_log_tail(1.0, i, j, n - y - 1.0, n, 0.5, rho);
                    near(below(0.0, 0.0, rho), mirrored(0.0, 0.0), 1e-11, &what);
                    near(below(1.0, 0.0, rho), -mirrored(1.0, 0.0), 1e-9, &what);
                    let h = 1e-4 * rho;
                    // in units of log rho, in which all parts are of order one
                    let mut unit = rho;
                    for j in [0.0, 1.0] {
                        let exact = unit * below(0.0, j + 1.0, rho);
                        let slope = unit * (below(0.0, j, rho + h) - below(0.0, j, rho - h)) / (2.0 * h);
                        // a step of 1e-4 leaves 1e-8 of a third derivative, and magnifies rounding to 1e-8
                        let close = (exact - slope).abs() <= 1e-6 * exact.abs() + 2e-8;
                        assert!(close, "{what}: {exact} not {slope}");
                        unit *= rho;
                    }
                }
            }
        }
    }

    #[test]
    fn no_count_is_too_large() {
        for (mean, k) in [(1e300, 1.0), (1e300, 0.0), (1e15, 1e3), (1e9, 1e-7), (1e200, 1e200)] {
            for y in [0.0, 1e6, 1e9, 1e15, 1e299] {
                for (i, j) in [(0.0, 0.0), (1.0, 0.0), (0.0, 2.0)] {
                    // no panic, and an end
                    let _ = negative_binomial_log_tail(1.0, i, j, y, mean, k);
                    let _ = negative_binomial_log_tail(0.0, i, j, y, mean, k);
                }
            }
        }
    }
}
