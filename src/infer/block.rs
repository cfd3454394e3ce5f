//! A fit with what is inferred from it, or with the reason why nothing is.

use super::covariance::{Covariance, estimate, estimates};
use super::point::Point;
use super::{Block, Estimate, Multiplier};
use crate::likelihood::Information;
use crate::restriction::Quantities;
use crate::solve::Fit;

/// Estimates, covariance and quantities at a maximum. `tested`: whether the fit imposes the tested restrictions.
pub(super) fn of_maximum(
    point: &Point,
    kind: Information,
    tested: bool,
    quantities: &Quantities,
    quantile: f64,
    multipliers: Vec<Multiplier>,
) -> Block {
    let (covariance, reason) = match Covariance::new(point, kind, tested) {
        Ok(covariance) => (Some(covariance), None),
        Err(reason) => (None, Some(reason)),
    };
    let values = quantities.values(&point.fit.theta);
    let gradients = quantities.gradient(&point.fit.theta);
    let quantity = |(i, name): (usize, &String)| -> Estimate {
        let se = covariance.as_ref().map(|c| c.delta(&gradients.row(i).transpose()));
        estimate(name, values[i], se, quantile, None)
    };
    Block {
        estimates: estimates(point, covariance.as_ref(), quantile),
        quantities: quantities.names().iter().enumerate().map(quantity).collect(),
        covariance: covariance.map(|c| c.matrix()),
        multipliers,
        reason,
        fit: point.fit.clone(),
    }
}

/// A fit without a trustworthy maximum: nothing is printed as an estimate, multipliers included.
pub(super) fn of_failure(fit: Fit, reason: &str, multipliers: Vec<Multiplier>) -> Block {
    let without = |line: Multiplier| Multiplier {
        value: None,
        se: None,
        z: None,
        p: None,
        gap: None,
        reason: Some(reason.to_string()),
        gap_reason: Some(reason.to_string()),
        ..line
    };
    Block {
        fit,
        estimates: Vec::new(),
        covariance: None,
        quantities: Vec::new(),
        multipliers: multipliers.into_iter().map(without).collect(),
        reason: Some(reason.to_string()),
    }
}
