//! Back to the restrictions: least squares on their residuals within the ranges, by Gauss-Newton steps of least
//! length, damped (Levenberg 1944, Marquardt 1963) where those fail. Makes no pass over the data.

use super::filter::weights;
use super::frame::{Frame, gaps, infeasibility};
use super::quadratic::Model;
use crate::math::{Matrix, Vector};

/// Residuals as the contract measures them, below which a point is on the restrictions.
pub(super) const FEASIBLE: f64 = 1e-10;
/// Residuals at rounding: nothing left to gain.
const ROUNDING: f64 = 1e-15;
const STEPS: usize = 200;

/// Where a restoration ended.
#[derive(Debug, Clone)]
pub(super) struct Restored {
    pub phi: Vector,
    pub infeasibility: f64,
}

impl Restored {
    /// Whether the restrictions hold.
    pub fn feasible(&self) -> bool {
        self.infeasibility <= FEASIBLE
    }
}

/// Moves phi to the restrictions, changing u = phi / d little; to the least residuals if they cannot be met from
/// here. `None` where they are undefined at phi.
pub(super) fn restore(frame: &Frame, phi: &Vector, d: &Vector) -> Option<Restored> {
    let (mut sides, mut jacobian) = frame.restrictions(phi)?;
    let unit = weights(&jacobian, d);
    let mut phi = phi.clone();
    let mut damping: Option<f64> = None;
    for _ in 0..STEPS {
        let before = infeasibility(&sides);
        if before <= ROUNDING {
            break;
        }
        let (c, a) = scaled(&gaps(&sides), &jacobian, &unit, d);
        let size = c.norm_squared();
        let room: Vec<f64> = frame.bounds.iter().map(|b| b.room(&frame.theta(&phi))).collect();
        let step = match damping {
            None => {
                let zero = Vector::zeros(frame.n);
                let w = Matrix::identity(frame.n, frame.n);
                Model { frame, d, g: &zero, w, j: &a, c: &c, room }.maximise(&[], 0.0).map(|p| p.u)
            }
            Some(mu) => {
                let g = -a.tr_mul(&c);
                let w = a.tr_mul(&a) + Matrix::identity(frame.n, frame.n) * mu;
                let none = (Matrix::zeros(0, frame.n), Vector::zeros(0));
                Model { frame, d, g: &g, w, j: &none.0, c: &none.1, room }.maximise(&[], 0.0).map(|p| p.u)
            }
        };
        let better = step.and_then(|u| {
            let lengths: &[f64] = if damping.is_none() { &[1.0, 0.5, 0.25, 0.1] } else { &[1.0] };
            lengths.iter().find_map(|&length| {
                let trial = frame.moved(&phi, &(&u * length), d);
                let (sides, jacobian) = frame.restrictions(&trial)?;
                let now = gaps(&sides).iter().zip(&unit).map(|(c, w)| (c / w).powi(2)).sum::<f64>();
                let promised = size - (&c + &a * &u * length).norm_squared();
                (now < size && now <= size - 1e-4 * promised).then_some((trial, sides, jacobian, now))
            })
        });
        match better {
            Some((trial, s, j, now)) => {
                (phi, sides, jacobian) = (trial, s, j);
                damping = damping.map(|mu| 0.2 * mu);
                // Damped steps that gain next to nothing stand at a least-squares point.
                if damping.is_some() && now > size * (1.0 - 1e-15) {
                    break;
                }
            }
            None => {
                let largest = a.iter().fold(0.0, |m: f64, x| m.max(x * x));
                let mu = damping.map_or(1e-6 * largest, |mu| 10.0 * mu);
                if mu >= 1e12 * largest || before <= 1e-14 {
                    break;
                }
                damping = Some(mu);
            }
        }
    }
    Some(Restored { phi, infeasibility: infeasibility(&sides) })
}

/// Residuals and Jacobian with each row in its unit, the Jacobian by u.
fn scaled(c: &Vector, jacobian: &Matrix, unit: &[f64], d: &Vector) -> (Vector, Matrix) {
    let c = Vector::from_iterator(c.len(), c.iter().zip(unit).map(|(c, w)| c / w));
    let a = Matrix::from_fn(jacobian.nrows(), jacobian.ncols(), |i, k| jacobian[(i, k)] * d[k] / unit[i]);
    (c, a)
}
