//! Multipliers with their standard errors: which restriction is to blame, and in which direction.

use super::Multiplier;
use super::release::Release;
use crate::math::Matrix;
use crate::math::tail::normal_two_sided;
use crate::restriction::{Role, Sides, System};
use crate::solve::Fit;

impl Multiplier {
    /// Probability of a pull at least this strong in its own direction, were the restriction true: half of `p`.
    pub fn one_sided(&self) -> Option<f64> {
        self.p.map(|p| p / 2.0)
    }
}

/// Cov(lambda) = V^-1, robust V^-1 M V^-1, over the rows kept.
pub(super) fn covariance(release: &Release) -> Matrix {
    release.v_factor.solve(&release.v_factor.solve(&release.m).transpose())
}

/// One line a restriction of `system`, in its order, from `fit`, which imposed exactly these. `release` is given for
/// the restricted fit, with the reason where it could not be made.
pub(super) fn lines(
    system: &System,
    fit: &Fit,
    release: Option<&Result<Release, String>>,
    gaps: Result<&[Sides], &str>,
) -> Vec<Multiplier> {
    let covariance = release.and_then(|r| r.as_ref().ok()).map(|r| (r, covariance(r)));
    let mut position = 0;
    let mut out = Vec::new();
    for (i, item) in system.items().iter().enumerate() {
        let redundant = fit.redundant.contains(&i);
        let mut line = Multiplier {
            name: item.name.clone(),
            role: item.role,
            equation: item.equation.clone(),
            value: Some(fit.multipliers[i]).filter(|x| x.is_finite() && !redundant),
            se: None,
            z: None,
            p: None,
            gap: gaps.ok().map(|g| g[i].left - g[i].right).filter(|x| x.is_finite()),
            reason: None,
            gap_reason: gaps.err().map(str::to_string),
        };
        if redundant {
            line.reason = Some("it follows from the other restrictions, so its multiplier is undetermined".to_string());
        }
        if item.role == Role::Tested {
            match (release, &covariance) {
                (Some(Ok(_)), Some((release, covariance))) => {
                    match release.kept.iter().position(|&kept| kept == position) {
                        Some(row) => {
                            let se = covariance[(row, row)].max(0.0).sqrt();
                            line.se = Some(se).filter(|se| se.is_finite());
                            line.z = line.value.zip(line.se).map(|(value, se)| value / se).filter(|z| z.is_finite());
                            line.p = line.z.map(normal_two_sided);
                        }
                        None => {
                            line.value = None;
                            line.reason = Some(
                                "it follows from the other restrictions, so its multiplier is undetermined".to_string(),
                            );
                        }
                    }
                }
                (Some(Err(reason)), _) if line.reason.is_none() => line.reason = Some(reason.clone()),
                _ => {}
            }
            position += 1;
        } else if line.reason.is_none() {
            line.reason = Some("always imposed, not tested".to_string());
        }
        out.push(line);
    }
    out
}
