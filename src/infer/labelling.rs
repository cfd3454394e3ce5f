//! Of the labellings of a mixture's components that are the same maximum, the one nearest the restricted estimate.

use crate::likelihood::LogLikelihood;
use crate::math::linear::least_squares;
use crate::math::{Matrix, Vector};
use crate::restriction::System;
use crate::solve::Fit;

/// A restriction met to this at a relabelled point is met as well as the certificate asks (contract, section 5).
const FEASIBLE: f64 = 1e-9;

/// The unrestricted fit relabelled, when some labelling that keeps the maintained restrictions and the ranges lies
/// nearer to `target` in units of `scale`.
pub(super) fn nearest(
    likelihood: &dyn LogLikelihood,
    held: &System,
    fit: &Fit,
    target: &Vector,
    scale: &Vector,
) -> Option<Fit> {
    let distance = |theta: &Vector| (theta - target).component_div(scale).norm();
    let allowed = |theta: &Vector| {
        likelihood.parameters().iter().zip(theta.iter()).all(|(p, &x)| p.range.contains(x))
            && held
                .sides(theta)
                .iter()
                .all(|s| (s.left - s.right).abs() <= FEASIBLE * (1.0 + s.left.abs() + s.right.abs()))
    };
    let relabelled = |order: &Vec<usize>| fit.theta.select_rows(order);
    let (order, theta) = likelihood
        .relabellings()
        .into_iter()
        .map(|order| {
            let theta = relabelled(&order);
            (order, theta)
        })
        .filter(|(_, theta)| allowed(theta))
        .min_by(|(_, a), (_, b)| distance(a).total_cmp(&distance(b)))?;
    if distance(&theta) >= distance(&fit.theta) {
        return None;
    }
    let mut out = fit.clone();
    out.phi = likelihood.coordinates().phi(&theta);
    out.theta = theta;
    // components are exchanged as they are named, which working coordinates of theirs are too
    out.slope = fit.slope.as_ref().map(|s| s.select_rows(&order));
    for edge in &mut out.edges {
        edge.parameter = order.iter().position(|&old| old == edge.parameter).unwrap_or(edge.parameter);
    }
    out.multipliers = multipliers(likelihood, held, &out);
    Some(out)
}

/// Multipliers at a stationary point by least squares of the slope on the rows of Jacobian and edges.
fn multipliers(likelihood: &dyn LogLikelihood, held: &System, fit: &Fit) -> Vector {
    let m = held.items().len();
    let n = fit.phi.len();
    let here = || likelihood.evaluate(&fit.phi, crate::likelihood::Order::Gradient).gradient;
    let gradient = fit.slope.clone().unwrap_or_else(here);
    let mut rows = Matrix::zeros(m + fit.edges.len(), n);
    rows.rows_mut(0, m).copy_from(&held.jacobian(&fit.theta));
    for (i, edge) in fit.edges.iter().enumerate() {
        rows[(m + i, edge.parameter)] = 1.0;
    }
    let rows = likelihood.coordinates().jacobian(&rows);
    least_squares(&rows.transpose(), &gradient, 1e-12).map_or_else(|_| Vector::zeros(m), |x| x.rows(0, m).into_owned())
}
