//! Why an answer may be believed.

/// The last word of a certificate.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Verdict {
    /// A strict local maximum under the restrictions.
    StrictMaximum,
    /// The likelihood does not change along a free direction.
    Flat,
    /// Stationary, but not a maximum.
    Saddle,
    /// The Jacobian of the restrictions loses rank at the answer.
    Irregular,
    /// The restrictions contradict each other.
    Infeasible,
    /// l grows without bound, or approaches its supremum only at infinity or an open end.
    Unbounded,
    /// The search ended without an answer.
    #[default]
    Stopped,
}

impl Verdict {
    /// The word as printed.
    pub fn text(self) -> &'static str {
        match self {
            Verdict::StrictMaximum => "strict maximum",
            Verdict::Flat => "flat",
            Verdict::Saddle => "saddle",
            Verdict::Irregular => "irregular",
            Verdict::Infeasible => "infeasible",
            Verdict::Unbounded => "unbounded",
            Verdict::Stopped => "stopped",
        }
    }
}

/// A direction in parameter space: weights by parameter index, largest first.
#[derive(Debug, Clone, PartialEq)]
pub struct Direction {
    /// (parameter index, weight) with the negligible ones left out.
    pub weights: Vec<(usize, f64)>,
    /// Standard error of the combination where it is identified.
    pub se: Option<f64>,
    /// Value of the combination at the point.
    pub value: f64,
}

/// The figures of the contract's section on the certificate. All are scale-free.
#[derive(Debug, Clone, PartialEq)]
pub struct Certificate {
    /// The verdict.
    pub verdict: Verdict,
    /// Why, in one sentence, when the verdict is not a strict maximum.
    pub reason: Option<String>,
    /// max |c| / (1 + |left| + |right|).
    pub feasibility: f64,
    /// max |grad L|_j d_j.
    pub stationarity: f64,
    /// Rank of the scaled Jacobian (restrictions only).
    pub rank: usize,
    /// How many restrictions.
    pub restrictions: usize,
    /// Condition number of the scaled Jacobian; `None` without restrictions.
    pub condition: Option<f64>,
    /// Smallest eigenvalue of the scaled curvature on the tangent space; `None` if no direction is free.
    pub curvature_min: Option<f64>,
    /// Largest one.
    pub curvature_max: Option<f64>,
    /// Exact against difference derivatives, relative.
    pub derivatives: f64,
    /// Agreement of the second opinion, when asked for.
    pub second_opinion: Option<bool>,
    /// Iterations of the best start.
    pub iterations: usize,
    /// Passes over the data in all.
    pub passes: usize,
    /// Starts made.
    pub starts: usize,
    /// Starts that reached the best value.
    pub starts_at_best: usize,
    /// Log-likelihoods of the distinct maxima, best first.
    pub maxima: Vec<f64>,
    /// Collapsed points met.
    pub collapsed: usize,
    /// Flat directions.
    pub flat: Vec<Direction>,
    /// Identified combinations when some direction is flat.
    pub identified: Vec<Direction>,
    /// Remarks in words.
    pub notes: Vec<String>,
}
