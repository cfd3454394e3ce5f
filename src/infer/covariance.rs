//! Covariance of the estimates, and estimates with their intervals.

use super::Estimate;
use super::point::{Point, stack, symmetric};
use crate::likelihood::Information;
use crate::math::linear::symmetric_eigen;
use crate::math::{Matrix, Vector};
use crate::solve::End;

/// Standard error of a combination, over the sum of those of its terms, below which it is rounding: the combination is
/// one that the restrictions fix. A root carries some 1e-16 a term.
const CANCELLED: f64 = 1e-12;

/// A covariance of theta by its root: root root', n by the number of free directions.
pub(super) struct Covariance {
    root: Matrix,
}

impl Covariance {
    /// Under everything the fit imposes: Z (Z' I Z)^-1 Z', robust C J C. For the restricted fit (`tested` true) Z is free
    /// under all Jacobians and the observed form is -Hess of the full Lagrangian; for the unrestricted one the tested
    /// restrictions are left out of both.
    pub fn new(point: &Point, kind: Information, tested: bool) -> Result<Covariance, String> {
        let rows = if tested { stack(&point.held, &point.tested) } else { point.held.clone() };
        let multipliers = if tested { &point.fit.multipliers } else { &point.held_multipliers };
        let (mut root, parts) = point.inverse(&rows, kind, multipliers)?;
        if let Some(filling) = parts.filling {
            // C J C = R (R' J R) R', and the middle is not negative.
            let middle = symmetric(&root.tr_mul(&(filling * &root)));
            let (values, vectors) = symmetric_eigen(&middle).map_err(|error| error.to_string())?;
            root = &root * vectors * Matrix::from_diagonal(&values.map(|x| x.max(0.0).sqrt()));
        }
        let coordinates = point.likelihood.coordinates();
        if !coordinates.is_identity() {
            root = coordinates.matrix(root.nrows()) * root;
        }
        if root.iter().all(|x| x.is_finite()) {
            Ok(Covariance { root })
        } else {
            Err("the covariance is not finite".to_string())
        }
    }

    /// The matrix, n by n.
    pub fn matrix(&self) -> Matrix {
        symmetric(&(&self.root * self.root.transpose()))
    }

    /// Standard error of parameter j.
    pub fn se(&self, j: usize) -> f64 {
        self.root.row(j).norm()
    }

    /// Standard error of a quantity with this gradient (delta method).
    pub fn delta(&self, gradient: &Vector) -> f64 {
        let se = self.root.tr_mul(gradient).norm();
        let terms: f64 = gradient.iter().enumerate().map(|(j, g)| g.abs() * self.se(j)).sum();
        if se <= CANCELLED * terms { 0.0 } else { se }
    }
}

/// One line a parameter: value, standard error, value minus and plus `quantile` standard errors, unclipped.
pub(super) fn estimates(point: &Point, covariance: Option<&Covariance>, quantile: f64) -> Vec<Estimate> {
    let ends = point.ends();
    let names = point.likelihood.parameters().iter().map(|p| p.name.as_str()).enumerate();
    names.map(|(j, name)| estimate(name, point.fit.theta[j], covariance.map(|c| c.se(j)), quantile, ends[j])).collect()
}

/// One estimate from its standard error.
pub(super) fn estimate(name: &str, value: f64, se: Option<f64>, quantile: f64, edge: Option<End>) -> Estimate {
    let se = se.filter(|se| se.is_finite());
    Estimate {
        name: name.to_string(),
        value,
        se,
        lower: se.map(|se| value - quantile * se),
        upper: se.map(|se| value + quantile * se),
        edge,
    }
}
