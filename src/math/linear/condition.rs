//! The conditioning of a design, which decides whether its columns are to be orthogonalised.

use super::{dot::dot, symmetric_eigen};
use crate::math::Matrix;

/// Rows taken at a time, so that all columns of a block stay in the cache while their products are formed.
const ROWS: usize = 512;

/// Condition number (largest over smallest eigenvalue) of the Gram matrix of the columns scaled to unit length: the condition of
/// what a Newton step on the columns as they stand would meet. Infinite for dependent columns or values that are not finite;
/// 1 for fewer than two columns. `weights` (not negative) weigh the rows.
pub fn scaled_condition(columns: &[&[f64]], weights: Option<&[f64]>) -> f64 {
    let n = columns.first().map_or(0, |c| c.len());
    if columns.iter().any(|c| c.len() != n) || weights.is_some_and(|w| w.len() != n) {
        return f64::INFINITY;
    }
    let mut kept: Vec<Scaled> = Vec::with_capacity(columns.len());
    for &values in columns {
        let largest = values.iter().fold(0.0f64, |m, v| if v.is_nan() { f64::INFINITY } else { m.max(v.abs()) });
        if largest.is_infinite() {
            return f64::INFINITY;
        }
        // A power of two keeps the squares in range.
        let power = if largest > 0.0 { libm::ldexp(1.0, -libm::ilogb(largest)) } else { 1.0 };
        kept.push(Scaled { values, power });
    }
    let p = kept.len();
    if p < 2 {
        return 1.0;
    }
    let mut gram = gram(&kept, weights, 0, n);
    let scale: Vec<f64> = (0..p).map(|i| 1.0 / gram[(i, i)].sqrt()).collect();
    for i in 0..p {
        for j in 0..p {
            gram[(i, j)] *= scale[i] * scale[j];
        }
    }
    match symmetric_eigen(&gram) {
        Ok((values, _)) if values[0] > f64::EPSILON * p as f64 => values[p - 1] / values[0],
        _ => f64::INFINITY,
    }
}

/// A column as it enters: values times power.
struct Scaled<'a> {
    values: &'a [f64],
    power: f64,
}

/// Products of all pairs of columns over rows `from..to`, halves added up so that rounding grows with the logarithm of their
/// number only.
fn gram(columns: &[Scaled], weights: Option<&[f64]>, from: usize, to: usize) -> Matrix {
    if to - from > ROWS {
        let middle = from + ((to - from) / 2).div_ceil(ROWS) * ROWS;
        if middle < to {
            return gram(columns, weights, from, middle) + gram(columns, weights, middle, to);
        }
    }
    let p = columns.len();
    let root = weights.map(|w| w[from..to].iter().map(|v| v.sqrt()).collect::<Vec<f64>>());
    let block: Vec<Vec<f64>> = columns
        .iter()
        .map(|c| {
            let mut part: Vec<f64> = c.values[from..to].iter().map(|v| v * c.power).collect();
            if let Some(root) = &root {
                part.iter_mut().zip(root).for_each(|(v, w)| *v *= w);
            }
            part
        })
        .collect();
    let mut out = Matrix::zeros(p, p);
    for i in 0..p {
        for j in 0..=i {
            out[(i, j)] = dot(&block[i], &block[j]);
            out[(j, i)] = out[(i, j)];
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::scaled_condition;
    use crate::math::linear::pseudo_random;

    #[test]
    fn condition_of_known_designs() {
        // Constant, and x = 0, 1: the cosine is 1/sqrt(2).
        let (one, x) = ([1.0; 4], [0.0, 1.0, 0.0, 1.0]);
        let r = 0.5f64.sqrt();
        assert!((scaled_condition(&[&one, &x], None) / ((1.0 + r) / (1.0 - r)) - 1.0).abs() < 1e-14);
        // Weighted: the rows that count are 0, 0, 1, 1 either way.
        let (w, y) = ([2.0, 2.0, 0.0], [0.0, 1.0, 7.0]);
        assert!((scaled_condition(&[&one[..3], &y], Some(&w)) / ((1.0 + r) / (1.0 - r)) - 1.0).abs() < 1e-14);
        assert_eq!(scaled_condition(&[&x], None), 1.0);
        assert_eq!(scaled_condition(&[&one, &x, &x], None), f64::INFINITY);
        assert_eq!(scaled_condition(&[&[f64::NAN], &[1.0]], None), f64::INFINITY);
    }

    #[test]
    fn many_rows() {
        // Columns u and u + t v with u, v independent and uniform: cosine 1 / sqrt(1 + t^2) up to sampling error.
        let mut next = pseudo_random(4);
        let u: Vec<f64> = (0..100_003).map(|_| next()).collect();
        let v: Vec<f64> = u.iter().map(|a| a + 0.01 * next()).collect();
        let r = 1.0 / 1.0001f64.sqrt();
        for found in [scaled_condition(&[&u, &v], None), scaled_condition(&[&u, &v], Some(&vec![2.0; u.len()]))] {
            // Three standard errors of a correlation's distance from one, about 3 sqrt(2 / n).
            assert!((found / ((1.0 + r) / (1.0 - r)) - 1.0).abs() < 0.02, "{found}");
        }
    }
}
