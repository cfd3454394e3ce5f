//! Ties u = 0 held beside the restrictions, and whether the slopes of l on both sides of each hold it there.

use super::equations::Equations;
use super::frame::Frame;
use super::local::stack;
use super::manifold::by_u;
use super::newton::Newton;
use super::rank::Rows;
use crate::likelihood::{Kink, LogLikelihood, Place, Residuals, Sample};
use crate::math::linear::least_squares;
use crate::math::{Matrix, Vector};
use crate::restriction::Sides;

/// A multiplier this near to half the jump, relative, is at it: its tie may be left to one side at no loss.
const AT_BOUND: f64 = 1e-7;
/// Slopes left over, relative to all that the ties can give, that are rounding.
const BALANCED: f64 = 1e-9;

/// Restrictions with ties behind them.
pub(super) struct Pinned<'a> {
    inner: &'a dyn Equations,
    sample: &'a Sample,
    residuals: Residuals,
    /// Size of what u is the difference of: its unit as a restriction.
    pub units: Vec<f64>,
    names: Vec<String>,
    /// phi by theta, where they differ.
    back: Option<Matrix>,
}

impl<'a> Pinned<'a> {
    pub fn new(
        inner: &'a dyn Equations,
        sample: &'a Sample,
        pins: &[Kink],
        phi: &Vector,
        typical: &[f64],
    ) -> Pinned<'a> {
        let places: Vec<Place> = pins.iter().map(|k| k.place).collect();
        let residuals = sample.residuals(&places);
        let jacobian = residuals.jacobian(phi);
        let least = typical.iter().copied().fold(f64::INFINITY, f64::min);
        let units = jacobian.row_iter().map(|r| least + r.transpose().component_mul(phi).abs().sum()).collect();
        let names = places.iter().map(|&p| format!("the row on line {} met exactly", sample.line(p))).collect();
        let coordinates = sample.coordinates();
        let n = phi.len();
        let back = (!coordinates.is_identity()).then(|| {
            let columns: Vec<Vector> = (0..n)
                .map(|j| {
                    let mut e = Vector::zeros(n);
                    e[j] = 1.0;
                    coordinates.phi(&e)
                })
                .collect();
            Matrix::from_columns(&columns)
        });
        Pinned { inner, sample, residuals, units, names, back }
    }

    fn phi(&self, theta: &Vector) -> Vector {
        self.sample.coordinates().phi(theta)
    }
}

impl Equations for Pinned<'_> {
    fn len(&self) -> usize {
        self.inner.len() + self.residuals.len()
    }

    fn name(&self, i: usize) -> &str {
        let m = self.inner.len();
        if i < m { self.inner.name(i) } else { &self.names[i - m] }
    }

    fn linear(&self) -> bool {
        self.inner.linear()
    }

    fn sides(&self, theta: &Vector) -> Vec<Sides> {
        let mut sides = self.inner.sides(theta);
        let u = self.residuals.values(&self.phi(theta));
        sides.extend(u.iter().zip(&self.units).map(|(u, unit)| Sides { left: u / unit, right: 0.0 }));
        sides
    }

    fn jacobian(&self, theta: &Vector) -> Matrix {
        let m = self.inner.len();
        let mut out = Matrix::zeros(self.len(), theta.len());
        out.rows_mut(0, m).copy_from(&self.inner.jacobian(theta));
        let mut rows = self.residuals.jacobian(&self.phi(theta));
        for (mut row, unit) in rows.row_iter_mut().zip(&self.units) {
            row /= *unit;
        }
        if let Some(back) = &self.back {
            rows *= back;
        }
        out.rows_mut(m, self.residuals.len()).copy_from(&rows);
        out
    }

    fn curvature(&self, theta: &Vector, multipliers: &Vector) -> Matrix {
        let m = self.inner.len();
        let inner = self.inner.curvature(theta, &multipliers.rows(0, m).into_owned());
        let own: Vec<f64> = (0..self.residuals.len()).map(|k| multipliers[m + k] / self.units[k]).collect();
        let c = self.residuals.curvature(&self.phi(theta), &own);
        inner
            + match &self.back {
                Some(back) => back.transpose() * c * back,
                None => c,
            }
    }
}

/// Whether the ties hold.
pub(super) enum Balance {
    /// The slope of l in each u, strictly between those of the two sides.
    Holds(Vector),
    /// Ties that may or must be left, and to which side.
    Releases(Vec<(usize, f64)>),
}

/// At the maximum under the ties that come first among `kinks` (the pinned ones); the others hang on those.
pub(super) fn balance(frame: &Frame, newton: &Newton, pinned: &Pinned, sample: &Sample, kinks: &[Kink]) -> Balance {
    let (m, pins) = (pinned.inner.len(), pinned.residuals.len());
    let mut slopes = Vector::zeros(kinks.len());
    for k in 0..pins {
        slopes[k] = -newton.local.lambda[m + k] / pinned.units[k];
    }
    let ratio = |k: usize, x: f64| x.abs() / kinks[k].fall;
    let within = |slopes: &Vector| (0..kinks.len()).all(|k| ratio(k, slopes[k]) < 1.0 - AT_BOUND);
    if within(&slopes) {
        return Balance::Holds(slopes);
    }
    let side = |k: usize, x: f64| (k, -x.signum());
    if kinks.len() == pins {
        let worst = (0..pins).map(|k| ratio(k, slopes[k])).fold(0.0, f64::max);
        // one that must go goes alone: it may set the others right
        let least = if worst > 1.0 + AT_BOUND { worst } else { 1.0 - AT_BOUND };
        let list = (0..pins).filter(|&k| ratio(k, slopes[k]) >= least).map(|k| side(k, slopes[k]));
        return Balance::Releases(list.collect());
    }
    // More ties than directions: the slopes are not unique, and some choice has to lie between all sides.
    let d = &newton.local.d;
    let jacobian = newton.point.jacobian.rows(0, m).into_owned();
    let free = Rows::of(&stack(frame, &by_u(&jacobian, d), d, &newton.local.edges())).z;
    let places: Vec<Place> = kinks.iter().map(|k| k.place).collect();
    let b = free.transpose() * by_u(&sample.residuals(&places).jacobian(&newton.point.phi), d).transpose();
    let g = free.tr_mul(&newton.local.g);
    let falls: Vec<f64> = kinks.iter().map(|k| k.fall).collect();
    let size: f64 = (0..kinks.len()).map(|k| falls[k] * b.column(k).norm()).sum();
    let narrow: Vec<f64> = falls.iter().map(|f| f * (1.0 - AT_BOUND)).collect();
    let inside = bounded(&b, &g, &narrow);
    if (&b * &inside + &g).norm() <= BALANCED * size {
        return Balance::Holds(inside);
    }
    let all = bounded(&b, &g, &falls);
    let list = (0..kinks.len()).filter(|&k| ratio(k, all[k]) >= 1.0 - 2.0 * AT_BOUND).map(|k| side(k, all[k]));
    Balance::Releases(list.collect())
}

/// Least |b x + g| within |x_k| <= bounds_k, by active sets (Stark and Parker 1995).
fn bounded(b: &Matrix, g: &Vector, bounds: &[f64]) -> Vector {
    let k = bounds.len();
    let mut x = Vector::zeros(k);
    let mut free = vec![true; k];
    for _ in 0..20 * (k + 1) {
        let at: Vec<usize> = (0..k).filter(|&j| free[j]).collect();
        if !at.is_empty() {
            let mut fixed = x.clone();
            at.iter().for_each(|&j| fixed[j] = 0.0);
            let right = -(b * &fixed + g);
            let Ok(z) = least_squares(&b.select_columns(&at), &right, 1e-12) else { return x };
            // as far towards the solution as the bounds allow
            let mut part = 1.0;
            let mut stop = None;
            for (i, &j) in at.iter().enumerate() {
                let (step, room) = (z[i] - x[j], bounds[j] - x[j] * (z[i] - x[j]).signum());
                if step.abs() * part > room {
                    part = (room / step.abs()).max(0.0);
                    stop = Some((j, step.signum()));
                }
            }
            at.iter().enumerate().for_each(|(i, &j)| x[j] += part * (z[i] - x[j]));
            if let Some((j, sign)) = stop {
                x[j] = sign * bounds[j];
                free[j] = false;
                continue;
            }
        }
        let slope = b.tr_mul(&(b * &x + g));
        let least = 1e-14 * (b.norm() * g.norm()).max(f64::MIN_POSITIVE);
        let wrong = (0..k)
            .filter(|&j| !free[j] && slope[j] * x[j].signum() > least)
            .max_by(|&i, &j| slope[i].abs().total_cmp(&slope[j].abs()));
        match wrong {
            Some(j) => free[j] = true,
            None => return x,
        }
    }
    x
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounded_least_squares() {
        // x + y = 3 within 1 and 5: many solutions, one is met; within 1 and 1: both at their bounds
        let b = Matrix::from_row_slice(1, 2, &[1.0, 1.0]);
        let g = Vector::from_vec(vec![-3.0]);
        let x = bounded(&b, &g, &[1.0, 5.0]);
        assert!((x[0] + x[1] - 3.0).abs() < 1e-14 && x[0].abs() <= 1.0, "{x}");
        let x = bounded(&b, &g, &[1.0, 1.0]);
        assert_eq!((x[0], x[1]), (1.0, 1.0));
        // two equations: x = 0.5 beyond its bound pulls y along
        let b = Matrix::from_row_slice(2, 2, &[1.0, 0.5, 0.0, 1.0]);
        let g = Vector::from_vec(vec![-4.0, -1.0]);
        let x = bounded(&b, &g, &[2.0, 9.0]);
        // y minimises (2 + y / 2 - 4)^2 + (y - 1)^2: 0.5 (y / 2 - 2) + (y - 1) = 0
        assert!((x[0] - 2.0).abs() < 1e-15 && (x[1] - 1.6).abs() < 1e-13, "{x}");
    }
}
