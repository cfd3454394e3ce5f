//! The Wald test at the unrestricted estimate.

use super::Test;
use super::point::Point;
use super::release::Release;
use crate::likelihood::Information;
use crate::math::Vector;
use crate::restriction::Sides;

/// h' [H C H']^-1 h, robust h' [H C J C H']^-1 h, with h = left - right of the tested restrictions kept.
pub(super) fn test(point: &Point, kind: Information, kept: &[usize], sides: &[Sides]) -> Result<Test, String> {
    if !point.edges.is_empty() {
        return Err(format!(
            "the unrestricted estimate is on an edge of a range ({}), where the Wald statistic has no chi-square law",
            point.edge_names().join(", ")
        ));
    }
    let release = Release::new(point, kind, kept.to_vec())?;
    let gap = |&position: &usize| {
        let side = sides[point.tested_at[position]];
        side.left - side.right
    };
    let h = Vector::from_iterator(kept.len(), kept.iter().map(gap));
    let chi_square = h.dot(&release.m_factor.solve(&h));
    if chi_square.is_finite() {
        Ok(Test::new(chi_square.max(0.0), kept.len()))
    } else {
        Err("the Wald statistic is not finite".to_string())
    }
}
