//! What should be said beside the numbers, each with a stable code.

use super::{Block, Tests};
use crate::likelihood::{Information, LogLikelihood};
use crate::restriction::{Restriction, Role, System};
use crate::solve::{Fit, Verdict};

/// A warning with its stable code.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Warning {
    /// Stable code, such as `few-rows`.
    pub code: &'static str,
    /// A sentence.
    pub message: String,
}

impl Warning {
    /// A warning of this code.
    pub fn new(code: &'static str, message: impl Into<String>) -> Warning {
        Warning { code, message: message.into() }
    }
}

/// Total weight per free parameter below which chi-square is not to be trusted (contract, section 6).
const ROWS_A_PARAMETER: f64 = 10.0;
/// Smallest over largest scaled curvature below which a direction is nearly flat: its quadratic picture rests on
/// changes of l a million times smaller than those along the best-known direction.
const NEARLY_FLAT: f64 = 1e-6;
/// What contract section 6 offers.
const REMEDY: &str = "a parametric bootstrap would be the remedy";

/// Names as text: `a`, `a and b`, `a, b and c`.
pub(super) fn list(names: &[&str]) -> String {
    match names {
        [] => String::new(),
        [one] => (*one).to_string(),
        [first @ .., last] => format!("{} and {last}", first.join(", ")),
    }
}

/// Total weight under ten per free parameter.
pub(super) fn few_rows(weight: f64, free: usize) -> Option<Warning> {
    (weight < ROWS_A_PARAMETER * free as f64).then(|| {
        Warning::new(
            "few-rows",
            format!(
                "there are {weight} rows (total weight) for {free} free parameter{}, under ten each: chi-square \
                 probabilities are rough here; {REMEDY}",
                if free == 1 { "" } else { "s" }
            ),
        )
    })
}

/// Cells or bins in which fewer than five rows are expected under the hypothesis.
pub(super) fn small_counts(counts: Option<(usize, usize)>) -> Option<Warning> {
    let (small, of) = counts.filter(|c| c.0 > 0)?;
    Some(Warning::new(
        "small-counts",
        format!(
            "{small} of {of} cells or bins have an expected count under five: chi-square probabilities are rough here; \
             join rare ones, or a parametric bootstrap would be the remedy"
        ),
    ))
}

/// Distance from one of a density's mass above which it is said: well above the error of the integrals.
const MASS: f64 = 1e-6;

/// A custom density that does not sum or integrate to one over its support.
pub(super) fn mass(error: Option<f64>) -> Option<Warning> {
    let error = error.filter(|e| e.is_nan() || *e > MASS)?;
    let found = match error.is_nan() {
        true => "the total mass of log_density over its support could not be computed".to_string(),
        false => format!("the total mass of log_density over its support misses 1 by {error:.2e}"),
    };
    Some(Warning::new(
        "mass-not-one",
        format!(
            "{found}: estimates and tests hold for a density only; add the term that makes it one, or correct [model.support]"
        ),
    ))
}

/// Restrictions that follow from the others.
pub(super) fn redundant(names: &[&str]) -> Option<Warning> {
    (!names.is_empty()).then(|| {
        let (follow, one) = if names.len() == 1 { ("follows", "it") } else { ("follow", "they") };
        Warning::new(
            "redundant-restriction",
            format!(
                "{} {follow} from the other restrictions, so {one} add{} no degree of freedom and no multiplier; leave {} out",
                list(names),
                if names.len() == 1 { "s" } else { "" },
                if names.len() == 1 { "it" } else { "them" },
            ),
        )
    })
}

/// Untested parameters on an edge at the restricted estimate.
pub(super) fn nuisance_on_edge(names: &[&str]) -> Option<Warning> {
    (!names.is_empty()).then(|| {
        let (is, its) = if names.len() == 1 { ("is", "its") } else { ("are", "their") };
        Warning::new(
            "nuisance-on-edge",
            format!(
                "{} {is} on the edge of {its} range at the restricted estimate and {is} held there in every formula, so \
                 probabilities are approximate; {REMEDY}",
                list(names)
            ),
        )
    })
}

/// Parameters that the hypothesis itself puts on an edge.
pub(super) fn tested_on_edge(names: &[&str]) -> Option<Warning> {
    (!names.is_empty()).then(|| {
        Warning::new(
            "tested-on-edge",
            format!(
                "the tested restrictions put {} on the edge of {} range, where the likelihood ratio follows a mixture of \
                 chi-squares (in the simplest case half of its p is right); the signed pull still holds, and {REMEDY}",
                list(names),
                if names.len() == 1 { "its" } else { "their" }
            ),
        )
    })
}

/// Intervals that reach outside the range of their parameter.
pub(super) fn outside(likelihood: &dyn LogLikelihood, block: &Block) -> Option<Warning> {
    let names: Vec<&str> = likelihood
        .parameters()
        .iter()
        .zip(&block.estimates)
        .filter(|(p, e)| e.lower.is_some_and(|x| x < p.range.low) || e.upper.is_some_and(|x| x > p.range.high))
        .map(|(p, _)| p.name.as_str())
        .collect();
    (!names.is_empty()).then(|| {
        let (interval, its) = if names.len() == 1 { ("interval", "its") } else { ("intervals", "their") };
        Warning::new(
            "interval-outside-range",
            format!(
                "the {interval} of {} {} outside {its} range: the quadratic picture behind standard errors is rough there; \
                 trust the direction, not the limits",
                list(&names),
                if names.len() == 1 { "reaches" } else { "reach" }
            ),
        )
    })
}

/// What the two certificates have to say: collapses, other maxima, directions that are nearly flat.
pub(super) fn from_search(restricted: &Fit, unrestricted: Option<&Fit>) -> Vec<Warning> {
    let mut out = Vec::new();
    let fits = || std::iter::once(("restricted", restricted)).chain(unrestricted.map(|f| ("unrestricted", f)));
    let collapsed: usize = fits().map(|(_, f)| f.certificate.collapsed).sum();
    if collapsed > 0 {
        out.push(Warning::new(
            "mixture-unbounded",
            format!(
                "{collapsed} start{} ran into a collapse, a component on next to no rows where l grows without bound; the \
                 estimate is the best maximum in which no component has collapsed; put a range on the spreads to rule \
                 collapses out",
                if collapsed == 1 { "" } else { "s" }
            ),
        ));
    }
    for (which, fit) in fits() {
        // On a flat ridge every start ends elsewhere at the same height; that is no second maximum.
        if fit.certificate.verdict == Verdict::StrictMaximum && fit.certificate.maxima.len() > 1 {
            out.push(Warning::new(
                "several-maxima",
                format!(
                    "the {which} likelihood has at least {} maxima (l {:.6} and next {:.6}); the best is reported; make more \
                     starts to see whether a better one exists",
                    fit.certificate.maxima.len(),
                    fit.certificate.maxima[0],
                    fit.certificate.maxima[1]
                ),
            ));
        }
        if let (Some(low), Some(high)) = (fit.certificate.curvature_min, fit.certificate.curvature_max)
            && low > 0.0
            && low < NEARLY_FLAT * high
        {
            out.push(Warning::new(
                "nearly-flat",
                format!(
                    "the {which} likelihood is nearly flat along a direction (curvature {low:.1e} beside {high:.1e}), so \
                     standard errors and chi-square probabilities are rough; {REMEDY}"
                ),
            ));
        }
    }
    out
}

/// What depends on how the restrictions are written, and on the kind of information.
pub(super) fn from_writing(system: &System, information: Information, wald: bool, lr: bool) -> Vec<Warning> {
    let mut out = Vec::new();
    let nonlinear = |r: &&Restriction| !r.linear;
    let tested = |r: &&Restriction| r.role == Role::Tested;
    let some_tested = system.items().iter().any(|r| tested(&r));
    if information.uses_hessian() && some_tested && system.items().iter().any(|r| !tested(&r) && nonlinear(&r)) {
        out.push(Warning::new(
            "observed-depends-on-writing",
            "a maintained restriction is nonlinear, so the score test with observed information depends on how the tested \
             restrictions are written; expected or outer information does not",
        ));
    }
    if wald && system.items().iter().any(|r| tested(&r) && nonlinear(&r)) {
        out.push(Warning::new(
            "wald-depends-on-writing",
            "a tested restriction is nonlinear, so the Wald statistic depends on how it is written; the score and \
             likelihood-ratio tests do not",
        ));
    }
    if lr && information == Information::Robust {
        out.push(Warning::new(
            "lr-not-robust",
            "the likelihood ratio has no robust form and assumes that the model is right; read the score test instead",
        ));
    }
    out
}

/// Tests that were wanted and cannot be given.
pub(super) fn not_available(wanted: Tests, score: Option<&str>, lr: Option<&str>, wald: Option<&str>) -> Vec<Warning> {
    [(wanted.score, "score test", score), (wanted.lr, "likelihood-ratio test", lr), (wanted.wald, "Wald test", wald)]
        .into_iter()
        .filter_map(|(wanted, name, reason)| reason.filter(|_| wanted).map(|reason| (name, reason)))
        .map(|(name, reason)| Warning::new("test-not-available", format!("no {name}: {reason}")))
        .collect()
}
