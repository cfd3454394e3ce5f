//! Restrictions that depend on others at the answer: implied by them (redundant), or irregular there.

use super::frame::{Frame, Point};
use super::manifold::{Manifold, by_u};
use super::rank::Rows;
use crate::math::{Matrix, Vector};

/// Rows this near to dependent, in units of what they are nearby, are looked at.
const SUSPECT: f64 = 1e-3;
/// Length of the looks, in standard errors.
const LOOK: f64 = 1e-2;

/// What the restrictions are like at a point.
#[derive(Debug, Clone, Default)]
pub(super) struct Regularity {
    /// Restrictions implied by those before them.
    pub redundant: Vec<usize>,
    /// Restrictions that add nothing here, but do nearby: multipliers need not exist.
    pub irregular: Vec<usize>,
}

/// Looks round a point. A suspect row is judged by its residual after small moves that the other rows allow: it
/// stays zero if implied, grows as its gradient says if regular, and faster if irregular. Makes no pass.
pub(super) fn regularity(frame: &Frame, point: &Point, d: &Vector, edges: &[usize]) -> Regularity {
    let mut found = Regularity::default();
    if frame.m == 0 {
        return found;
    }
    let typical = typical_norms(frame, point, d);
    let rows = Rows::within(&by_u(&point.jacobian, d), typical.clone(), SUSPECT);
    if rows.dropped.is_empty() {
        return found;
    }
    let kept = Manifold { frame, d, kept: rows.kept.clone(), edges: edges.to_vec() };
    let looks = looks(&kept.free(&point.jacobian));
    for &i in &rows.dropped {
        let gradient = point.jacobian.row(i).transpose().component_mul(d);
        let mut implied = true;
        for look in &looks {
            let step = look.component_mul(d) * LOOK;
            for sign in [1.0, -1.0] {
                let Some((sides, _)) = kept.nearby(&(&point.phi + &step * sign)) else { continue };
                let gap = (sides[i].left - sides[i].right).abs();
                let rounding = 1e-13 * (sides[i].left.abs() + sides[i].right.abs());
                if gap <= (1e-9 * typical[i] * LOOK).max(rounding) {
                    continue;
                }
                implied = false;
                if gap > 3.0 * LOOK * gradient.dot(look).abs() && !found.irregular.contains(&i) {
                    found.irregular.push(i);
                }
            }
        }
        if implied {
            found.redundant.push(i);
        }
    }
    found
}

/// Largest norm of each row by u, here and a little away along every coordinate.
fn typical_norms(frame: &Frame, point: &Point, d: &Vector) -> Vec<f64> {
    let mut norms: Vec<f64> = by_u(&point.jacobian, d).row_iter().map(|r| r.norm()).collect();
    for k in 0..frame.n {
        for sign in [LOOK, -LOOK] {
            let mut phi = point.phi.clone();
            phi[k] += sign * d[k];
            if let Some((_, jacobian)) = frame.restrictions(&phi) {
                for (norm, row) in norms.iter_mut().zip(by_u(&jacobian, d).row_iter()) {
                    *norm = norm.max(row.norm());
                }
            }
        }
    }
    norms
}

/// Unit directions to look along: each free one, and two mixtures of all.
fn looks(z: &Matrix) -> Vec<Vector> {
    let k = z.ncols();
    let mut all: Vec<Vector> = z.column_iter().map(|c| c.into_owned()).collect();
    if k > 1 {
        let size = (k as f64).sqrt();
        all.push(z * Vector::from_fn(k, |i, _| (1.0 + 0.1 * i as f64) / size));
        all.push(z * Vector::from_fn(k, |i, _| if i % 2 == 0 { 1.0 } else { -0.9 } / size));
    }
    all
}
