//! The score (Lagrange-multiplier) test (Rao 1948; Silvey 1959; robust form Boos 1992). It needs the restricted fit only.

use super::point::Point;
use super::release::Release;
use super::{Test, Warning};
use crate::likelihood::Information;
use crate::math::Vector;

/// The two routes to the same statistic should agree to this, relative; both are a handful of products and one
/// factorisation away from multipliers that are certified to 1e-7.
const AGREEMENT: f64 = 1e-6;

/// The statistic by both routes.
pub(super) struct Routes {
    /// From the slope of l along the directions that the maintained restrictions leave free.
    pub slope: f64,
    /// From the multipliers.
    pub multipliers: f64,
}

impl Routes {
    /// s' C s and lambda' V lambda; robust s' C H' M^-1 H C s and (V lambda)' M^-1 (V lambda).
    pub fn new(point: &Point, kind: Information, release: &Release) -> Routes {
        let lambda = Vector::from_iterator(
            release.kept.len(),
            release.kept.iter().map(|&position| point.fit.multipliers[point.tested_at[position]]),
        );
        let by_lambda = &release.v * &lambda;
        if kind == Information::Robust {
            let by_slope = &release.h * (&release.c * &point.gradient);
            Routes {
                slope: by_slope.dot(&release.m_factor.solve(&by_slope)),
                multipliers: by_lambda.dot(&release.m_factor.solve(&by_lambda)),
            }
        } else {
            Routes { slope: (&release.c * &point.gradient).dot(&point.gradient), multipliers: lambda.dot(&by_lambda) }
        }
    }

    /// Whether they agree. A slope certified to 1e-7 a coordinate moves a statistic by twice its root times that, which
    /// outweighs the relative part for statistics near 0.
    pub fn agree(&self) -> bool {
        let size = self.slope.abs().max(self.multipliers.abs());
        (self.slope - self.multipliers).abs() <= AGREEMENT * size + 4e-7 * size.sqrt() + 1e-12
    }

    /// What to say if they do not.
    pub fn disagreement(&self) -> Option<Warning> {
        (!self.agree()).then(|| {
            let message = format!(
                "the score statistic from the slopes ({}) and from the multipliers ({}) should be equal; the problem is \
                 too ill-conditioned for this test to be trusted; rescale columns or restrictions",
                self.slope, self.multipliers
            );
            Warning::new("score-routes-disagree", message)
        })
    }
}

/// The test.
pub(super) fn test(routes: &Routes, df: usize) -> Result<Test, String> {
    if !routes.slope.is_finite() {
        return Err("the score statistic is not finite".to_string());
    }
    Ok(Test::new(routes.slope.max(0.0), df))
}
