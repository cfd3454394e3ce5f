//! From a likelihood and its restrictions to everything that is inferred.

use super::information::sandwich;
use super::point::Point;
use super::release::Release;
use super::warning::{self, Warning};
use super::{InferError, Options, Outcome, Test, block, labelling, likelihood_ratio, multipliers, score, wald};
use crate::likelihood::{Information, LogLikelihood};
use crate::math::{Vector, special};
use crate::restriction::{Quantities, Role, System};
use crate::solve::{self, Fit, Problem, Verdict};

const NOT_WANTED: &str = "not asked for";
const NOTHING_TESTED: &str = "no tested restriction";
const NOTHING_LEFT: &str = "the tested restrictions follow from the maintained ones, so there is nothing to test";

/// Makes the restricted fit, the unrestricted one where a wanted test needs it, and infers what the contract's
/// sections 2 to 4 define. Not finding a maximum is no error: the certificate says so and nothing is inferred.
///
/// # Errors
/// A confidence that is no probability, an information kind this likelihood does not have, or what the search refuses.
pub fn run(
    likelihood: &dyn LogLikelihood,
    system: &System,
    quantities: &Quantities,
    options: &Options,
) -> Result<Outcome, InferError> {
    if !(options.confidence > 0.0 && options.confidence < 1.0) {
        return Err(InferError::Confidence(options.confidence));
    }
    let held = system.only(|r| r.role != Role::Tested);
    let restricted = solve::maximise(Problem { likelihood, restrictions: system }, &options.search, &[])?;
    let job = Job {
        likelihood,
        system,
        held: &held,
        quantities,
        options,
        kind: choose(likelihood, &restricted.phi, options)?,
        // From the small tail, which keeps its digits when the confidence is close to 1.
        quantile: -special::normal_quantile((1.0 - options.confidence) / 2.0),
        any_tested: system.items().iter().any(|r| r.role == Role::Tested),
    };
    if restricted.certificate.verdict != Verdict::StrictMaximum {
        return Ok(job.without_maximum(restricted));
    }
    let unrestricted = if !job.any_tested {
        Err(format!("{NOTHING_TESTED}, so it is the restricted fit"))
    } else if !options.tests.need_unrestricted() {
        Err("none of the tests asked for needs it".to_string())
    } else {
        let problem = Problem { likelihood, restrictions: &held };
        // Starting from the restricted estimate too: a worse local maximum cannot then make the ratio negative.
        Ok(solve::maximise(problem, &options.search, std::slice::from_ref(&restricted.theta))?)
    };
    Ok(job.infer(restricted, unrestricted))
}

/// The kind asked for, else the default rule of the contract's section 3.
fn choose(likelihood: &dyn LogLikelihood, phi: &Vector, options: &Options) -> Result<Information, InferError> {
    let has = |kind| likelihood.information(kind, phi).is_some();
    match options.information {
        Some(Information::Expected) if !has(Information::Expected) => {
            Err(InferError::NoInformation("expected", "observed"))
        }
        Some(kind @ (Information::Outer | Information::Robust)) if !has(Information::Outer) => {
            Err(InferError::NoInformation(kind.text(), "observed"))
        }
        Some(kind) => Ok(kind),
        None if !likelihood.observed_by_default() && has(Information::Expected) => Ok(Information::Expected),
        None => Ok(Information::Observed),
    }
}

/// Why a fit gives nothing to infer from.
fn failure(which: &str, fit: &Fit) -> String {
    let verdict = fit.certificate.verdict.text();
    match &fit.certificate.reason {
        Some(reason) => format!("the {which} fit has no trustworthy maximum ({verdict}: {reason})"),
        None => format!("the {which} fit has no trustworthy maximum ({verdict})"),
    }
}

/// One inference under way.
struct Job<'a> {
    likelihood: &'a dyn LogLikelihood,
    system: &'a System,
    held: &'a System,
    quantities: &'a Quantities,
    options: &'a Options,
    kind: Information,
    quantile: f64,
    any_tested: bool,
}

impl Job<'_> {
    /// The outcome when the restricted fit gives nothing to infer from.
    fn without_maximum(&self, fit: Fit) -> Outcome {
        let reason = failure("restricted", &fit);
        let lines = multipliers::lines(self.system, &fit, None, Err(&reason));
        let none = if self.any_tested { reason.as_str() } else { NOTHING_TESTED };
        let mut warnings = self.options.warnings.clone();
        warnings.extend(warning::from_search(&fit, None));
        Outcome {
            information: self.kind,
            confidence: self.options.confidence,
            restricted: block::of_failure(fit, &reason, lines),
            score: Err(none.to_string()),
            lr: Err(none.to_string()),
            wald: Err(none.to_string()),
            unrestricted: Err(reason),
            warnings,
        }
    }

    /// Everything, from a restricted maximum.
    fn infer(&self, fit: Fit, unrestricted: Result<Fit, String>) -> Outcome {
        let (likelihood, kind, wanted) = (self.likelihood, self.kind, self.options.tests);
        let mut warnings = self.options.warnings.clone();
        let point = Point::new(likelihood, self.system, &fit, true, &fit.multipliers);
        let scale = sandwich(&point, kind, &point.held_multipliers, &point.held)
            .map_or_else(|_| Vector::from_element(fit.phi.len(), 1.0), |s| Point::scale(&s.bread));
        let kept = point.independent(&scale);
        let df = kept.len();
        let release = self.any_tested.then(|| Release::new(&point, kind, kept.clone()));
        let on_edge = point.put_on_edge();
        warnings.extend(self.about_restricted(&point, &kept, &scale, &on_edge));
        let asked = |wanted: bool| match (self.any_tested, df, wanted) {
            (false, ..) => Err(NOTHING_TESTED.to_string()),
            (true, 0, _) => Err(NOTHING_LEFT.to_string()),
            (true, _, false) => Err(NOT_WANTED.to_string()),
            _ => Ok(()),
        };

        let score = asked(wanted.score).and_then(|()| {
            let release = release
                .as_ref()
                .map_or_else(|| Err(NOTHING_TESTED.to_string()), |r| r.as_ref().map_err(Clone::clone))?;
            let routes = score::Routes::new(&point, kind, release);
            warnings.extend(routes.disagreement());
            score::test(&routes, df)
        });

        let unrestricted = unrestricted.map(|free| self.settle(free, &fit, &scale));
        let usable: Result<&Fit, String> = match &unrestricted {
            Err(reason) => Err(reason.clone()),
            Ok(free) if free.certificate.verdict == Verdict::StrictMaximum => Ok(free),
            Ok(free) => Err(failure("unrestricted", free)),
        };
        let failed = unrestricted.is_ok() && usable.is_err();
        if let (true, Err(reason)) = (failed, &usable) {
            let message =
                format!("{reason}, so there is no likelihood-ratio and no Wald test; the score test does not need it");
            warnings.push(Warning::new("unrestricted-failed", message));
        }
        let whole =
            usable.as_ref().map_or_else(|_| Vector::zeros(self.system.items().len()), |f| self.spread(&f.multipliers));
        let free = usable.as_ref().map(|f| Point::new(likelihood, self.system, f, false, &whole)).map_err(Clone::clone);
        let sides = free.as_ref().map(|f| self.system.sides(&f.fit.theta)).map_err(Clone::clone);

        let lr = asked(wanted.lr).and_then(|()| {
            let free = free.as_ref().map_err(Clone::clone)?;
            likelihood_ratio::test(&fit, free, df, !on_edge.is_empty())
        });
        let wald = asked(wanted.wald).and_then(|()| {
            let free = free.as_ref().map_err(Clone::clone)?;
            wald::test(free, kind, &kept, sides.as_ref().map_err(Clone::clone)?)
        });

        warnings.extend(warning::from_search(&fit, unrestricted.as_ref().ok()));
        warnings.extend(warning::from_writing(self.system, kind, wald.is_ok(), lr.is_ok()));
        // A failed unrestricted fit has its own warning; the tests it takes along need none each.
        let missing =
            |test: &Result<Test, String>, said: bool| test.as_ref().err().filter(|_| self.any_tested && !said).cloned();
        warnings.extend(warning::not_available(
            wanted,
            missing(&score, false).as_deref(),
            missing(&lr, failed).as_deref(),
            missing(&wald, failed).as_deref(),
        ));

        let gaps = sides.as_deref().map_err(String::as_str);
        let lines = multipliers::lines(self.system, &fit, release.as_ref(), gaps);
        let restricted = block::of_maximum(&point, kind, true, self.quantities, self.quantile, lines);
        warnings.extend(warning::outside(likelihood, &restricted));
        let unrestricted = unrestricted.as_ref().map_err(Clone::clone).map(|raw| match &free {
            Ok(free) => {
                let sides = self.held.sides(&raw.theta);
                let lines = multipliers::lines(self.held, raw, None, Ok(&sides));
                block::of_maximum(free, kind, false, self.quantities, self.quantile, lines)
            }
            Err(reason) => {
                let lines = multipliers::lines(self.held, raw, None, Err(reason));
                block::of_failure(raw.clone(), reason, lines)
            }
        });
        Outcome {
            information: kind,
            confidence: self.options.confidence,
            restricted,
            unrestricted,
            score,
            lr,
            wald,
            warnings,
        }
    }

    /// The unrestricted fit in the labelling nearest the restricted estimate; one that lies below the restricted fit has
    /// failed (contract, section 2).
    fn settle(&self, free: Fit, restricted: &Fit, scale: &Vector) -> Fit {
        let nearer = labelling::nearest(self.likelihood, self.held, &free, &restricted.theta, scale);
        let mut free = nearer.unwrap_or(free);
        if free.certificate.verdict == Verdict::StrictMaximum
            && likelihood_ratio::statistic(restricted, &free).is_none()
        {
            free.certificate.verdict = Verdict::Stopped;
            free.certificate.reason = Some(format!(
                "its log-likelihood {} is below that of the restricted fit, {}; make more starts",
                free.log_likelihood, restricted.log_likelihood
            ));
        }
        free
    }

    /// Warnings that need the restricted fit only.
    fn about_restricted(&self, point: &Point, kept: &[usize], scale: &Vector, on_edge: &[&str]) -> Vec<Warning> {
        let mut out = Vec::new();
        let free = super::point::free(&point.held, scale).ncols();
        out.extend(warning::few_rows(self.likelihood.weight_total(), free));
        out.extend(warning::mass(self.likelihood.mass_error(&point.fit.phi)));
        out.extend(warning::small_counts(self.likelihood.small_counts(&point.fit.phi)));
        let mut redundant = point.fit.redundant.clone();
        let dropped = point.tested_at.iter().enumerate().filter(|(position, _)| !kept.contains(position));
        redundant.extend(dropped.map(|(_, &at)| at));
        redundant.sort_unstable();
        redundant.dedup();
        let mut names: Vec<&str> = self.system.left_out().iter().map(|r| r.name.as_str()).collect();
        names.extend(redundant.into_iter().map(|i| self.system.items()[i].name.as_str()));
        out.extend(warning::redundant(&names));
        out.extend(warning::nuisance_on_edge(&point.edge_names()));
        out.extend(warning::tested_on_edge(on_edge));
        out
    }

    /// Multipliers of the held restrictions as a vector of the whole system, 0 for the tested ones.
    fn spread(&self, held: &Vector) -> Vector {
        let mut values = held.iter();
        let each = |role: Role| if role == Role::Tested { 0.0 } else { values.next().copied().unwrap_or(0.0) };
        Vector::from_iterator(self.system.items().len(), self.system.items().iter().map(|r| r.role).map(each))
    }
}
