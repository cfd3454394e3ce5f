//! Whether l falls round the answer as its curvature says. A curvature that is mere rounding, or that vanishes at the
//! answer itself (a quartic maximum, a supremum at infinity), is found out here.

use super::frame::Point;
use super::manifold::Manifold;
use crate::math::{Matrix, Vector};

/// What moving away showed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Fall {
    /// As the curvature says.
    AsSaid,
    /// Not so, at any distance that can be told from rounding.
    Otherwise,
    /// No move could be made.
    Untried,
}

/// Moves from the answer both ways along `direction` (by u) by parts of it; `predicted`: the fall at its full length.
fn fall(on: &Manifold, point: &Point, direction: &Vector, predicted: f64, tolerance: f64) -> Fall {
    let step = direction.component_mul(on.d);
    let mut outcome = Fall::Untried;
    for length in [0.1, 0.01, 1e-3, 1e-4] {
        let expected = predicted * length * length;
        if expected < 1e-13 * (1.0 + point.value.abs()) {
            break;
        }
        let drop = |sign: f64| {
            let (_, phi) = on.nearby(&(&point.phi + &step * (sign * length)))?;
            let inside = on.frame.contains(&on.frame.theta(&phi));
            let value = if inside { on.frame.value(&phi) } else { f64::NAN };
            value.is_finite().then_some(point.value - value)
        };
        let (Some(one), Some(other)) = (drop(1.0), drop(-1.0)) else { continue };
        if (0.5 * (one + other) / expected - 1.0).abs() <= tolerance {
            return Fall::AsSaid;
        }
        outcome = Fall::Otherwise;
    }
    outcome
}

/// Along all free directions at once: `values` are the curvatures (all positive), `vectors` by u.
pub(super) fn falls_as_said(on: &Manifold, point: &Point, values: &[f64], vectors: &Matrix) -> Fall {
    let k = values.len();
    let signs = Vector::from_fn(k, |i, _| if i % 2 == 0 { 1.0 } else { -1.0 } / values[i].sqrt());
    fall(on, point, &(vectors * signs), 0.5 * k as f64, 0.4 / k as f64)
}

/// Along each free direction by itself: those along which l does not fall as said.
pub(super) fn suspects(on: &Manifold, point: &Point, values: &[f64], vectors: &Matrix) -> Vec<usize> {
    let otherwise = |&i: &usize| {
        let direction = vectors.column(i) / values[i].sqrt();
        fall(on, point, &direction, 0.5, 0.4) == Fall::Otherwise
    };
    (0..values.len()).filter(otherwise).collect()
}
