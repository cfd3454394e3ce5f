//! The four information matrices at a point, in working coordinates, as the tests and covariances use them.

use super::point::{Point, pinned};
use crate::likelihood::Information;
use crate::math::{Matrix, Vector};

/// The matrix that is inverted, and for the robust form what is put between two inverses (White 1982; Boos 1992).
pub(super) struct Sandwich {
    /// The information, or the bread.
    pub bread: Matrix,
    /// Sum of s s' over the rows; robust form only.
    pub filling: Option<Matrix>,
}

/// The information of this kind at the point. `multipliers` (one a restriction of the whole system) say whose curvature
/// belongs to minus the Hessian: the maintained ones' for tests, all for the restricted covariance. `rows` are what is
/// imposed where the matrix will be used.
pub(super) fn sandwich(
    point: &Point,
    kind: Information,
    multipliers: &Vector,
    rows: &Matrix,
) -> Result<Sandwich, String> {
    let bread = match kind {
        Information::Expected | Information::Outer => point
            .likelihood
            .information(kind, &point.fit.phi)
            .ok_or_else(|| format!("this likelihood has no {} information", kind.text()))?,
        Information::Observed | Information::Robust => {
            let curvature = point.system.curvature(&point.fit.theta, multipliers);
            point.likelihood.coordinates().form(&curvature) - &point.hessian
        }
    };
    let filling = match kind {
        Information::Robust => Some(
            point
                .likelihood
                .information(Information::Outer, &point.fit.phi)
                .ok_or("this likelihood has no outer-product information, which the robust form is filled with")?,
        ),
        _ => None,
    };
    let bread = clean(point, bread, 1.0, kind, rows)?;
    let filling = filling.map(|j| clean(point, j, 0.0, kind, rows)).transpose()?;
    Ok(Sandwich { bread, filling })
}

/// Takes a parameter that `rows` pin (an active edge, say) out of a matrix where its entries are not finite: no direction
/// left free meets them. Anywhere else an entry that is not finite leaves no statistic.
fn clean(point: &Point, mut matrix: Matrix, diagonal: f64, kind: Information, rows: &Matrix) -> Result<Matrix, String> {
    let n = matrix.nrows();
    if matrix.iter().all(|x| x.is_finite()) {
        return Ok(matrix);
    }
    let pinned = pinned(rows, n);
    for j in (0..n).filter(|&j| pinned[j]) {
        if (0..n).any(|i| !matrix[(i, j)].is_finite() || !matrix[(j, i)].is_finite()) {
            matrix.row_mut(j).fill(0.0);
            matrix.column_mut(j).fill(0.0);
            matrix[(j, j)] = diagonal;
        }
    }
    match (0..n).find(|&j| (0..n).any(|i| !matrix[(i, j)].is_finite())) {
        None => Ok(matrix),
        Some(j) => {
            let j = (0..n).find(|&i| !matrix[(i, i)].is_finite()).unwrap_or(j);
            let name = &point.likelihood.parameters()[j].name;
            Err(format!("the {} information of {name} is not finite at {}", kind.text(), point.fit.theta[j]))
        }
    }
}
