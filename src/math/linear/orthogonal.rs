//! Orthogonalisation of a design by a scaled, column-pivoted Householder QR.

use super::dependent_rows;
use super::householder::{RANK, factorise, normalise};
use crate::math::{Error, Matrix};

/// X = Q R of a design with n rows and p columns.
#[derive(Debug, Clone, PartialEq)]
pub struct Orthogonal {
    /// `rank` orthonormal columns of length n (orthonormal in the weighted sense where weights were given).
    pub q: Vec<Vec<f64>>,
    /// rank x p, in the columns' own order and scale: X = Q R. Not triangular, because of the pivoting.
    pub r: Matrix,
    /// Columns that count.
    pub rank: usize,
    /// The columns which depend on those before them, ascending; empty at full rank.
    pub dependent: Vec<usize>,
    /// Triangular factor of the scaled, permuted columns (rank x p).
    triangle: Matrix,
    /// `order[k]`: the column pivoted to place k.
    order: Vec<usize>,
    /// Length of each column in its own order.
    length: Vec<f64>,
}

/// Factorises the design whose columns are given, each of length n; `weights` (n, not negative) makes Q' W Q = I instead of Q' Q = I.
/// Rows of weight 0 take no part in the factorisation; their rows of Q follow from X = Q R.
///
/// Businger and Golub (1965), with the columns scaled to unit length first.
///
/// # Errors
/// Columns of different lengths, or values that are not finite.
pub fn orthogonalise(columns: &[&[f64]], weights: Option<&[f64]>) -> Result<Orthogonal, Error> {
    let p = columns.len();
    let n = columns.first().map_or(0, |c| c.len());
    for c in columns {
        if c.len() != n {
            return Err(Error::Shape { what: "a column of the design", found: c.len(), wanted: n });
        }
        if c.iter().any(|v| !v.is_finite()) {
            return Err(Error::NotFinite { what: "a column of the design" });
        }
    }
    let roots: Option<Vec<f64>> = weights.map(|w| w.iter().map(|v| v.sqrt()).collect());
    if let Some(roots) = &roots {
        if roots.len() != n {
            return Err(Error::Shape { what: "the weights", found: roots.len(), wanted: n });
        }
        if roots.iter().any(|v| !v.is_finite()) {
            return Err(Error::NotFinite { what: "the square root of the weights" });
        }
    }
    let mut work: Vec<Vec<f64>> = columns
        .iter()
        .map(|c| match &roots {
            Some(roots) => c.iter().zip(roots).map(|(v, w)| v * w).collect(),
            None => c.to_vec(),
        })
        .collect();
    let length: Vec<f64> = work.iter_mut().map(|c| normalise(c)).collect();
    let (mut q, triangle, order) = factorise(work, n);
    let rank = q.len();
    if let Some(roots) = &roots {
        for column in &mut q {
            for (v, w) in column.iter_mut().zip(roots) {
                *v = if *w > 0.0 { *v / w } else { 0.0 };
            }
        }
    }
    let mut r = Matrix::zeros(rank, p);
    for (k, &c) in order.iter().enumerate() {
        for i in 0..rank.min(k + 1) {
            r[(i, c)] = triangle[(i, k)] * length[c];
        }
    }
    let dependent = if rank == p {
        Vec::new()
    } else {
        let mut unit = Matrix::zeros(p, rank);
        for (k, &c) in order.iter().enumerate() {
            for i in 0..rank {
                unit[(c, i)] = if length[c] > 0.0 { triangle[(i, k)] } else { 0.0 };
            }
        }
        dependent_rows(&unit, RANK * p as f64)
    };
    let mut result = Orthogonal { q, r, rank, dependent, triangle, order, length };
    if let Some(roots) = roots.filter(|_| rank == p) {
        for i in (0..n).filter(|&i| roots[i] == 0.0) {
            let row: Vec<f64> = columns.iter().map(|c| c[i]).collect();
            let row = result.covector(&row);
            for (column, v) in result.q.iter_mut().zip(row) {
                column[i] = v;
            }
        }
    }
    Ok(result)
}

impl Orthogonal {
    /// R^-1 gamma: coefficients of the columns from those of Q, by back substitution in the scaled columns. Full rank only:
    /// otherwise the dependent columns get 0.
    pub fn coefficients(&self, gamma: &[f64]) -> Vec<f64> {
        let mut x = gamma.to_vec();
        x.resize(self.rank, 0.0);
        for k in (0..self.rank).rev() {
            for j in k + 1..self.rank {
                x[k] -= self.triangle[(k, j)] * x[j];
            }
            x[k] /= self.triangle[(k, k)];
        }
        let mut beta = vec![0.0; self.order.len()];
        for (k, v) in x.into_iter().enumerate() {
            beta[self.order[k]] = v / self.length[self.order[k]];
        }
        beta
    }

    /// R beta: coefficients of Q from those of the columns.
    pub fn rotated(&self, beta: &[f64]) -> Vec<f64> {
        (0..self.rank).map(|i| (0..beta.len()).map(|j| self.r[(i, j)] * beta[j]).sum()).collect()
    }

    /// R^-T c: the row of a linear form c'beta written in gamma. Full rank only: otherwise the dependent columns are left out.
    pub fn covector(&self, c: &[f64]) -> Vec<f64> {
        let mut x: Vec<f64> = (0..self.rank).map(|k| c[self.order[k]] / self.length[self.order[k]]).collect();
        for k in 0..self.rank {
            for i in 0..k {
                x[k] -= self.triangle[(i, k)] * x[i];
            }
            x[k] /= self.triangle[(k, k)];
        }
        x
    }

    /// Smallest pivot of the unit-length columns over the largest: the inverse is a fair estimate of their condition number.
    pub fn least_pivot(&self) -> f64 {
        match self.rank {
            0 => 0.0,
            r => (self.triangle[(r - 1, r - 1)] / self.triangle[(0, 0)]).abs(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::{Orthogonal, RANK, orthogonalise};
    use crate::math::Error;
    use crate::math::linear::dot::dot;
    use crate::math::linear::{pseudo_random, scaled_condition};

    fn factorised(columns: &[Vec<f64>], weights: Option<&[f64]>) -> Orthogonal {
        let columns: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
        match orthogonalise(&columns, weights) {
            Ok(found) => found,
            Err(e) => panic!("{e}"),
        }
    }

    /// The largest departure of X from Q R beside each column's largest entry, and of Q'WQ from I.
    fn faults(columns: &[Vec<f64>], weights: Option<&[f64]>, found: &Orthogonal) -> (f64, f64) {
        let mut product = 0.0f64;
        for (j, column) in columns.iter().enumerate() {
            let largest = column.iter().fold(0.0f64, |m, v| m.max(v.abs()));
            for (i, entry) in column.iter().enumerate() {
                let sum: f64 = (0..found.rank).map(|k| found.q[k][i] * found.r[(k, j)]).sum();
                product = product.max((sum - entry).abs() / largest);
            }
        }
        let mut gram = 0.0f64;
        for a in 0..found.rank {
            for b in 0..=a {
                let weighted: Vec<f64> =
                    (0..found.q[a].len()).map(|i| found.q[a][i] * weights.map_or(1.0, |w| w[i])).collect();
                gram = gram.max((dot(&weighted, &found.q[b]) - if a == b { 1.0 } else { 0.0 }).abs());
            }
        }
        (product, gram)
    }

    #[test]
    fn certified_polynomial_of_degree_ten() {
        // NIST StRD, linear regression, Filip (Filippelli, A., NIST); source and check in tests/data/nist/README.md.
        let text = include_str!("../../../tests/data/nist/filip.csv");
        let (mut y, mut x) = (Vec::new(), Vec::new());
        for line in text.lines().skip(1) {
            let Some((a, b)) = line.split_once(',') else { panic!("{line}") };
            let (Ok(a), Ok(b)) = (a.parse::<f64>(), b.parse::<f64>()) else { panic!("{line}") };
            y.push(a);
            x.push(b);
        }
        assert_eq!(y.len(), 82);
        let columns: Vec<Vec<f64>> =
            (0..=10).map(|k| x.iter().map(|v| libm::pow(*v, f64::from(k))).collect()).collect();
        let found = factorised(&columns, None);
        assert_eq!(found.rank, 11, "least pivot {:e}", found.least_pivot());
        let (product, gram) = faults(&columns, None, &found);
        assert!(product < 1e-14 && gram < 1e-14, "{product:e} {gram:e}");
        let gamma: Vec<f64> = found.q.iter().map(|q| dot(q, &y)).collect();
        let certified = [
            -1467.48961422980,
            -2772.17959193342,
            -2316.37108160893,
            -1127.97394098372,
            -354.478233703349,
            -75.1242017393757,
            -10.8753180355343,
            -1.06221498588947,
            -0.670191154593408e-01,
            -0.246781078275479e-02,
            -0.402962525080404e-04,
        ];
        for (found, wanted) in found.coefficients(&gamma).iter().zip(certified) {
            // The scaled condition, about 1e10, leaves six digits at worst; seven are asked for.
            assert!((found / wanted - 1.0).abs() < 1e-7, "{found} {wanted}");
        }
        let views: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
        assert!(scaled_condition(&views, None) > 1e12);
        // The least pivot stands well clear of what counts as dependent.
        assert!(found.least_pivot() > 100.0 * RANK * 11.0, "{:e}", found.least_pivot());
    }

    #[test]
    fn maps_between_the_bases_are_inverse_to_each_other() {
        let mut next = pseudo_random(3);
        for case in 0..60 {
            // The last cases are tall enough to be reduced by blocks.
            let (n, p) = (if case < 54 { 20 + case * 40 } else { 9000 + case * 100 }, 1 + case % 12);
            let columns: Vec<Vec<f64>> =
                (0..p).map(|k| (0..n).map(|_| (next() + 2.0) * 10f64.powi(3 * k - 15)).collect()).collect();
            let weights: Option<Vec<f64>> = (case % 2 == 1)
                .then(|| (0..n).map(|i| if i % 5 == 0 { 0.0 } else { 1.0 + 3.0 * next().abs() }).collect());
            let found = factorised(&columns, weights.as_deref());
            assert_eq!(found.rank, p as usize);
            assert!(found.dependent.is_empty());
            let (product, gram) = faults(&columns, weights.as_deref(), &found);
            // Backward error of p reflections over n rows; rows of weight 0 pass through R^-1, condition about 10.
            assert!(product < 1e-13 && gram < 1e-13, "case {case}: {product:e} {gram:e}");
            let beta: Vec<f64> = (0..p).map(|k| next() * 10f64.powi(15 - 3 * k)).collect();
            let back = found.coefficients(&found.rotated(&beta));
            let form: Vec<f64> = (0..p).map(|k| next() * 10f64.powi(3 * k - 15)).collect();
            for k in 0..p as usize {
                assert!((back[k] - beta[k]).abs() < 1e-12 * 10f64.powi(15 - 3 * k as i32), "case {case}");
            }
            let direct: f64 = form.iter().zip(&beta).map(|(a, b)| a * b).sum();
            let rotated: f64 = found.covector(&form).iter().zip(found.rotated(&beta)).map(|(a, b)| a * b).sum();
            assert!((direct - rotated).abs() < 1e-12, "case {case}");
        }
    }

    #[test]
    fn dependent_columns_are_named_in_their_order() {
        let mut next = pseudo_random(11);
        for n in [500, 20_000] {
            let a: Vec<f64> = (0..n).map(|_| next()).collect();
            let b: Vec<f64> = (0..n).map(|_| 1e6 * next()).collect();
            let sum: Vec<f64> = a.iter().zip(&b).map(|(x, y)| 3.0 * x - y).collect();
            let c: Vec<f64> = (0..n).map(|_| next()).collect();
            let columns = vec![a, b, vec![0.0; n], sum, c.clone(), c];
            let found = factorised(&columns, None);
            assert_eq!((found.rank, found.dependent.as_slice()), (3, [2, 3, 5].as_slice()));
            let views: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
            assert_eq!(scaled_condition(&views, None), f64::INFINITY);
        }
        // Fewer rows than columns.
        let found = factorised(&[vec![1.0, 2.0], vec![2.0, 1.0], vec![1.0, 1.0]], None);
        assert_eq!((found.rank, found.dependent.as_slice()), (2, [2].as_slice()));
        assert_eq!(factorised(&[], None).rank, 0);
        assert_eq!(factorised(&[vec![]], None).rank, 0);
    }

    #[test]
    fn far_from_one_and_bad_columns() {
        let found = factorised(&[vec![1e300, 1e300, 0.0], vec![0.0, 1e-300, 1e-300]], None);
        assert_eq!(found.rank, 2);
        let (one, two, bad) = ([1.0, 2.0], [1.0, 2.0, 3.0], [1.0, f64::NAN]);
        assert!(matches!(orthogonalise(&[&one, &two], None), Err(Error::Shape { .. })));
        assert!(matches!(orthogonalise(&[&one, &bad], None), Err(Error::NotFinite { .. })));
        assert!(matches!(orthogonalise(&[&one], Some(&two)), Err(Error::Shape { .. })));
        assert!(matches!(orthogonalise(&[&one], Some(&[1.0, -1.0])), Err(Error::NotFinite { .. })));
    }
}
