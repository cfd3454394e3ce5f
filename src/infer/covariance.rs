//! Covariance of the estimates, and estimates with their intervals.

use super::Estimate;
use super::point::{Point, stack, symmetric};
use crate::likelihood::Information;
use crate::math::{Matrix, Vector};
use crate::solve::End;

/// Covariance of theta under everything the fit imposes: Z (Z' I Z)^-1 Z', robust C J C. For the restricted fit
/// (`tested` true) Z is free under all Jacobians and the observed form is -Hess of the full Lagrangian; for the
/// unrestricted one the tested restrictions are left out of both.
pub(super) fn covariance(point: &Point, kind: Information, tested: bool) -> Result<Matrix, String> {
    let rows = if tested { stack(&point.held, &point.tested) } else { point.held.clone() };
    let multipliers = if tested { &point.fit.multipliers } else { &point.held_multipliers };
    let (c, parts) = point.inverse(&rows, kind, multipliers)?;
    let by_phi = match parts.filling {
        Some(j) => symmetric(&(&c * j * &c)),
        None => c,
    };
    let out = symmetric(&point.likelihood.coordinates().covariance(&by_phi));
    if out.iter().all(|x| x.is_finite()) { Ok(out) } else { Err("the covariance is not finite".to_string()) }
}

/// One line a parameter: value, standard error, value minus and plus `quantile` standard errors, unclipped.
pub(super) fn estimates(point: &Point, covariance: Option<&Matrix>, quantile: f64) -> Vec<Estimate> {
    let ends = point.ends();
    let names = point.likelihood.parameters().iter().map(|p| p.name.as_str()).enumerate();
    names
        .map(|(j, name)| estimate(name, point.fit.theta[j], covariance.map(|c| c[(j, j)]), quantile, ends[j]))
        .collect()
}

/// One estimate from its variance.
pub(super) fn estimate(name: &str, value: f64, variance: Option<f64>, quantile: f64, edge: Option<End>) -> Estimate {
    let se = variance.map(|v| v.max(0.0).sqrt()).filter(|se| se.is_finite());
    Estimate {
        name: name.to_string(),
        value,
        se,
        lower: se.map(|se| value - quantile * se),
        upper: se.map(|se| value + quantile * se),
        edge,
    }
}

/// The variance of a quantity with this gradient (delta method); 0 where its terms cancel to rounding, as they do for a
/// quantity that the restrictions fix.
pub(super) fn delta(gradient: &Vector, covariance: &Matrix) -> f64 {
    let variance = (covariance * gradient).dot(gradient);
    let terms = (covariance.abs() * gradient.abs()).dot(&gradient.abs());
    if variance.abs() <= 1e-13 * terms { 0.0 } else { variance }
}
