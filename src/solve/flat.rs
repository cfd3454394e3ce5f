//! Flat directions named by the parameters in them, and the combinations that the data identify all the same.

use super::Direction;
use super::frame::Frame;
use crate::math::{Matrix, Vector};

/// Parts of a direction below this share of its largest (by u) are left out.
const NEGLIGIBLE: f64 = 1e-6;

/// Spectrum of the curvature on the free directions, split into flat and curved.
pub(super) struct Split<'a> {
    pub frame: &'a Frame<'a>,
    pub d: &'a Vector,
    pub theta: &'a Vector,
    /// Flat directions by u, a column each.
    pub flat: Matrix,
    /// Curved directions by u.
    pub curved: Matrix,
    /// Curvatures along them.
    pub values: Vec<f64>,
}

impl Split<'_> {
    /// The flat directions by theta, largest weight 1.
    pub fn directions(&self) -> Vec<Direction> {
        let theta = self.by_theta(&self.flat);
        (0..self.flat.ncols())
            .map(|k| self.named(&theta.column(k).into_owned(), &self.flat.column(k).into_owned(), None))
            .collect()
    }

    /// A basis of the combinations, among parameters in flat directions, that no flat direction changes.
    pub fn identified(&self) -> Vec<Direction> {
        let n = self.frame.n;
        let size = self.flat.amax();
        let touched: Vec<usize> = (0..n).filter(|&j| self.flat.row(j).amax() > NEGLIGIBLE * size).collect();
        let theta = self.by_theta(&self.flat);
        let mut a = Matrix::from_fn(theta.ncols(), touched.len(), |k, i| theta[(touched[i], k)]);
        let pivots = reduce(&mut a);
        let mut all = Vec::new();
        for free in (0..touched.len()).filter(|i| !pivots.contains(i)) {
            let mut w = Vector::zeros(n);
            w[touched[free]] = 1.0;
            for (row, &p) in pivots.iter().enumerate() {
                w[touched[p]] = tidy(-a[(row, free)]);
            }
            let by_phi = match &self.frame.map {
                Some(t) => t.tr_mul(&w),
                None => w.clone(),
            };
            let along = self.curved.tr_mul(&by_phi.component_mul(self.d));
            let variance: f64 = along.iter().zip(&self.values).map(|(x, v)| x * x / v).sum();
            all.push(self.named(&w, &w, Some(variance.sqrt())));
        }
        all
    }

    fn by_theta(&self, by_u: &Matrix) -> Matrix {
        let mut phi = by_u.clone();
        for (j, mut row) in phi.row_iter_mut().enumerate() {
            row *= self.d[j];
        }
        match &self.frame.map {
            Some(t) => t * phi,
            None => phi,
        }
    }

    fn named(&self, weights: &Vector, sizes: &Vector, se: Option<f64>) -> Direction {
        let (size, largest) = (sizes.amax(), weights.amax());
        let first = weights.iter().copied().find(|w| w.abs() == largest).unwrap_or(1.0);
        let unit = if se.is_some() { 1.0 } else { first };
        let mut named: Vec<(usize, f64)> = (0..weights.len())
            .filter(|&j| sizes[j].abs() > NEGLIGIBLE * size)
            .map(|j| (j, weights[j] / unit))
            .collect();
        named.sort_by(|a, b| b.1.abs().total_cmp(&a.1.abs()).then(a.0.cmp(&b.0)));
        let value = named.iter().map(|&(j, w)| w * self.theta[j]).sum();
        Direction { weights: named, se, value }
    }
}

/// Whole numbers blurred by rounding made whole.
fn tidy(x: f64) -> f64 {
    if (x - x.round()).abs() < 1e-7 { x.round() + 0.0 } else { x }
}

/// Reduced row echelon form in place; the pivot columns.
fn reduce(a: &mut Matrix) -> Vec<usize> {
    let mut pivots = Vec::new();
    let size = a.amax();
    for column in 0..a.ncols() {
        let row = pivots.len();
        if row == a.nrows() {
            break;
        }
        let best = (row..a.nrows()).max_by(|&i, &k| a[(i, column)].abs().total_cmp(&a[(k, column)].abs()));
        let Some(best) = best.filter(|&i| a[(i, column)].abs() > 1e-9 * size) else { continue };
        a.swap_rows(row, best);
        let pivot = a[(row, column)];
        a.row_mut(row).scale_mut(1.0 / pivot);
        for other in (0..a.nrows()).filter(|&i| i != row) {
            let factor = a[(other, column)];
            let taken = a.row(row) * factor;
            let mut target = a.row_mut(other);
            target -= taken;
        }
        pivots.push(column);
    }
    pivots
}
