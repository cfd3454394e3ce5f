//! The likelihood-ratio test.

use super::Test;
use super::point::Point;
use crate::solve::Fit;

/// An unrestricted fit that lies further below the restricted one than this, relative, is a failed one (contract, section 2).
const WORSE: f64 = 1e-8;

/// 2 (l_unrestricted - l_restricted), or `None` when the unrestricted fit is worse than the restricted one.
pub(super) fn statistic(restricted: &Fit, unrestricted: &Fit) -> Option<f64> {
    let ratio = 2.0 * (unrestricted.log_likelihood - restricted.log_likelihood);
    let enough = -WORSE * (1.0 + restricted.log_likelihood.abs());
    (ratio >= enough).then(|| ratio.max(0.0))
}

/// The test. On an edge it stands if it is finite and the tested point is interior (Self and Liang 1987).
pub(super) fn test(restricted: &Fit, unrestricted: &Point, df: usize, tested_on_edge: bool) -> Result<Test, String> {
    if tested_on_edge && !unrestricted.edges.is_empty() {
        return Err(
            "both the tested point and the unrestricted estimate are on an edge of the parameters' ranges, where \
                    the likelihood ratio has no chi-square law"
                .to_string(),
        );
    }
    match statistic(restricted, unrestricted.fit) {
        Some(ratio) if ratio.is_finite() => Ok(Test::new(ratio, df)),
        Some(_) => Err("the likelihood ratio is not finite".to_string()),
        None => Err("the unrestricted fit is worse than the restricted one".to_string()),
    }
}
