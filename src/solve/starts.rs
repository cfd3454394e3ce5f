//! Many starts: which answers they reach, which of those are the same, and which is the best.

use super::equations::Equations;
use super::error::SolveError;
use super::frame::Frame;
use super::local::scale;
use super::newton::{Ended, Known, Newton};
use super::run::{Outcome, led, run};
use super::second::{Opinion, second_opinion};
use super::verdict::{fit, nowhere};
use super::{Fit, Search, Verdict, kinks};
use crate::likelihood::LogLikelihood;
use crate::math::Vector;

/// Starts where l may have several maxima.
const STARTS: usize = 20;
/// Answers within this many standard errors of each other are one.
const SAME: f64 = 1e-3;
/// Log-likelihoods within this, relative to 1 + |l|, are one value.
const SAME_VALUE: f64 = 1e-8;

/// A point at which searches ended, and how many.
struct Answer<'a> {
    newton: Box<Newton<'a>>,
    reached: usize,
    collapsed: bool,
}

/// What the starts came to.
struct Findings<'a> {
    frame: &'a Frame<'a>,
    relabellings: Vec<Vec<usize>>,
    /// Distinct points where the first-order conditions hold.
    answers: Vec<Answer<'a>>,
    /// Searches that ended otherwise.
    others: Vec<Newton<'a>>,
    /// Where the restrictions are missed least, of the starts that could not meet them.
    missed: Option<(Vector, f64)>,
    undefined: Option<Vector>,
    collapsed: usize,
    starts: usize,
}

/// Searches from all starts, one after the other (a later one that comes near an answer of an earlier one ends
/// there), and returns the best answer with its certificate.
pub(super) fn maximise(
    likelihood: &dyn LogLikelihood,
    equations: &dyn Equations,
    search: &Search,
    extra: &[Vector],
) -> Result<Fit, SolveError> {
    let frame = Frame::new(likelihood, equations);
    let alone = likelihood.concave() && equations.linear();
    let count = search.starts.unwrap_or(if alone { 1 } else { STARTS });
    let mut starts = likelihood.starts(count, search.seed);
    starts.extend(extra.iter().cloned());
    if let Some(wrong) = starts.iter().find(|s| s.len() != frame.n) {
        return Err(SolveError::StartLength { found: wrong.len(), expected: frame.n });
    }
    let Some(first) = starts.first() else { return Err(SolveError::NoStart) };
    if let Some(sample) = likelihood.kinked()
        && let Some(fit) = kinks::maximise(sample, equations, search, &starts)?
    {
        return Ok(fit);
    }
    let first = first.clone();
    let thin = if count > 1 { likelihood.thinned() } else { None };
    let fates = match &thin {
        Some(thin) => advance(thin.as_ref(), equations, search, &mut starts[..count])?,
        None => Vec::new(),
    };
    let mut findings = Findings {
        frame: &frame,
        relabellings: harmless(&frame, &first),
        answers: Vec::new(),
        others: Vec::new(),
        missed: None,
        undefined: None,
        collapsed: 0,
        starts: starts.len(),
    };
    let mut landed: Vec<Option<usize>> = Vec::new();
    for (at, start) in starts.iter().enumerate() {
        match fates.get(at) {
            Some(Fate::Nowhere) => {
                landed.push(None);
                continue;
            }
            // what ended at one point of the thinned likelihood is one start of the whole one
            Some(&Fate::Twin(twin)) if let Some(answer) = landed[twin] => {
                findings.reached(answer);
                landed.push(Some(answer));
                continue;
            }
            _ => {}
        }
        let mut led_to = None;
        // the first start is one that somebody or something thought about
        if at == 0
            && let Some(newton) = led(&frame, start, search.iterations)?
        {
            let strict = fit(&frame, &newton).certificate.verdict == Verdict::StrictMaximum;
            let answer = findings.sort_in(Outcome::Ran(newton));
            if strict {
                landed.push(answer);
                continue;
            }
            led_to = answer;
        }
        let known = findings.answers.iter().map(|a| (a.newton.point.phi.clone(), a.newton.local.d.clone())).collect();
        let outcome = run(&frame, start, search.iterations, known)?;
        let answer = findings.sort_in(outcome);
        if let (Some(one), Some(other)) = (led_to, answer)
            && one == other
        {
            findings.answers[one].reached -= 1; // both were one start
        }
        landed.push(answer);
    }
    let mut fit = findings.best();
    if search.second_opinion && fit.certificate.verdict == Verdict::StrictMaximum {
        ask(&frame, &mut fit);
    }
    fit.certificate.passes = frame.passes();
    if thin.is_some() {
        fit.certificate.notes.push("starts were led over a part of the rows first, then over all".into());
    }
    Ok(fit)
}

/// What became of a start on a thinned likelihood.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Fate {
    /// It goes on over all rows.
    Goes,
    /// It ended where an earlier one did.
    Twin(usize),
    /// It wandered without end while others arrived: all rows would not mend that.
    Nowhere,
}

/// Leads starts to where they end on a thinned likelihood, as points to start from on the whole one.
fn advance(
    thin: &dyn LogLikelihood,
    equations: &dyn Equations,
    search: &Search,
    starts: &mut [Vector],
) -> Result<Vec<Fate>, SolveError> {
    let frame = Frame::new(thin, equations);
    let mut known: Known = Vec::new();
    // for each answer: the start that found it
    let mut finder: Vec<usize> = Vec::new();
    let mut fates = vec![Fate::Goes; starts.len()];
    for at in 0..starts.len() {
        let Outcome::Ran(newton) = run(&frame, &starts[at], search.iterations, known.clone())? else { continue };
        match newton.ended {
            Some(Ended::Known(k)) => {
                fates[at] = Fate::Twin(finder[k]);
                starts[at] = starts[finder[k]].clone();
            }
            Some(Ended::Found) if !newton.is_saddle() => {
                let scale = &newton.local.d;
                let same =
                    known.iter().position(|(phi, _)| (phi - &newton.point.phi).component_div(scale).amax() < SAME);
                match same {
                    Some(k) => {
                        fates[at] = Fate::Twin(finder[k]);
                        starts[at] = starts[finder[k]].clone();
                    }
                    None => {
                        known.push((newton.point.phi.clone(), newton.local.d.clone()));
                        finder.push(at);
                        starts[at] = newton.point.theta.clone();
                    }
                }
            }
            Some(Ended::Limit | Ended::Stuck) => fates[at] = Fate::Nowhere,
            // what runs off or cannot begin has its say over all rows, from the start itself
            _ => {}
        }
    }
    if known.is_empty() {
        fates.fill(Fate::Goes);
    }
    Ok(fates)
}

impl<'a> Findings<'a> {
    /// One more start that reached an answer.
    fn reached(&mut self, answer: usize) {
        self.answers[answer].reached += 1;
        self.collapsed += usize::from(self.answers[answer].collapsed);
    }

    /// Enters what became of a start; the answer it reached.
    fn sort_in(&mut self, outcome: Outcome<'a>) -> Option<usize> {
        let newton = match outcome {
            Outcome::Ran(newton) => newton,
            Outcome::Infeasible { phi, missed } => {
                if self.missed.as_ref().is_none_or(|m| missed < m.1) {
                    self.missed = Some((phi, missed));
                }
                return None;
            }
            Outcome::Undefined(phi) => {
                self.undefined.get_or_insert(phi);
                return None;
            }
        };
        let collapsed = self.frame.likelihood.collapsed(&newton.point.phi).is_some();
        match newton.ended {
            Some(Ended::Known(k)) => {
                self.reached(k);
                Some(k)
            }
            Some(Ended::Found) if !newton.is_saddle() => {
                self.collapsed += usize::from(collapsed);
                match (0..self.answers.len()).find(|&k| self.same(&self.answers[k].newton, &newton)) {
                    Some(k) => {
                        self.answers[k].reached += 1;
                        if newton.local.error() < self.answers[k].newton.local.error() {
                            self.answers[k].newton = newton;
                        }
                        Some(k)
                    }
                    None => {
                        self.answers.push(Answer { newton, reached: 1, collapsed });
                        Some(self.answers.len() - 1)
                    }
                }
            }
            _ if collapsed => {
                self.collapsed += 1;
                None
            }
            _ => {
                self.others.push(*newton);
                None
            }
        }
    }

    /// Whether two answers are one, up to a relabelling.
    fn same(&self, a: &Newton, b: &Newton) -> bool {
        let scale = a.point.value.abs().max(b.point.value.abs()) + 1.0;
        if (a.point.value - b.point.value).abs() > SAME_VALUE * scale {
            return false;
        }
        let near = |theta: &Vector| (self.frame.phi(theta) - &a.point.phi).component_div(&a.local.d).amax() < SAME;
        near(&b.point.theta) || self.relabellings.iter().any(|p| near(&relabelled(&b.point.theta, p)))
    }

    /// The best answer's fit: the highest l among those that are maxima, a strict one where values tie.
    fn best(mut self) -> Fit {
        self.answers.sort_by(|a, b| b.newton.point.value.total_cmp(&a.newton.point.value));
        let mut maxima: Vec<f64> = Vec::new();
        for answer in self.answers.iter().filter(|a| !a.collapsed) {
            maxima.push(answer.newton.point.value);
        }
        let mut best: Option<(Fit, usize)> = None;
        let mut ran_off: Option<Fit> = None;
        for answer in self.answers.iter().filter(|a| !a.collapsed) {
            let value = answer.newton.point.value;
            if best.as_ref().is_some_and(|(b, _)| value < b.log_likelihood - SAME_VALUE * (1.0 + value.abs())) {
                break;
            }
            let fit = fit(self.frame, &answer.newton);
            match fit.certificate.verdict {
                Verdict::StrictMaximum => {
                    best = Some((fit, answer.reached));
                    break;
                }
                Verdict::Unbounded => {
                    maxima.retain(|&m| m != value);
                    ran_off.get_or_insert(fit);
                }
                _ if best.is_none() => best = Some((fit, answer.reached)),
                _ => {}
            }
        }
        let (mut fit, reached) = best.or_else(|| ran_off.map(|f| (f, 0))).unwrap_or_else(|| (self.failed(), 0));
        self.remark(&mut fit);
        let certificate = &mut fit.certificate;
        certificate.maxima = maxima;
        certificate.starts = self.starts;
        certificate.starts_at_best = reached;
        certificate.collapsed = self.collapsed;
        fit
    }

    /// Where no start came to an answer: the search that says most about why.
    fn failed(&self) -> Fit {
        let rank = |n: &Newton| match n.ended {
            Some(Ended::RanOff(..)) => 0,
            Some(Ended::Limit | Ended::Stuck) => 1,
            Some(Ended::Infeasible) => 3,
            _ => 2,
        };
        let best =
            self.others.iter().min_by(|a, b| rank(a).cmp(&rank(b)).then(b.point.value.total_cmp(&a.point.value)));
        match (best, &self.missed, &self.undefined) {
            (Some(newton), _, _) => fit(self.frame, newton),
            (None, Some((phi, _)), _) => nowhere(self.frame, phi, true),
            (None, None, Some(phi)) => nowhere(self.frame, phi, false),
            (None, None, None) => nowhere(self.frame, &Vector::zeros(self.frame.n), false),
        }
    }

    /// Says what else the starts met.
    fn remark(&self, fit: &mut Fit) {
        let above = |n: &&Newton| {
            n.local.infeasibility <= 1e-9
                && n.point.value > fit.log_likelihood + SAME_VALUE * (1.0 + n.point.value.abs())
        };
        let higher: Vec<_> = self.others.iter().filter(above).collect();
        let (off, open): (Vec<_>, Vec<_>) =
            higher.into_iter().partition(|n| matches!(n.ended, Some(Ended::RanOff(..))));
        let notes = &mut fit.certificate.notes;
        if !off.is_empty() && fit.certificate.verdict != Verdict::Unbounded {
            notes.push(format!("from {} of the starts the log-likelihood rose without end", off.len()));
        }
        if !open.is_empty() && fit.certificate.verdict == Verdict::StrictMaximum {
            notes.push(format!("{} of the starts broke off at a higher log-likelihood than this maximum", open.len()));
        }
        if self.missed.is_some() && fit.certificate.verdict != Verdict::Infeasible {
            notes.push("from some starts the restrictions could not be met".into());
        }
    }
}

/// Asks for a second opinion; one that differs fails the certificate.
fn ask(frame: &Frame, fit: &mut Fit) {
    let Some(point) = frame.point(&fit.phi) else { return };
    let opinion = second_opinion(frame, &point.phi, point.value, &scale(&point), &point.jacobian);
    heed(frame, fit, &opinion);
}

/// Enters a second opinion.
pub(super) fn heed(frame: &Frame, fit: &mut Fit, opinion: &Opinion) {
    let certificate = &mut fit.certificate;
    certificate.second_opinion = Some(opinion.agrees);
    if !opinion.agrees {
        let named = |theta: &Vector| {
            let parts: Vec<String> =
                theta.iter().enumerate().map(|(j, x)| format!("{} = {x:.8}", frame.name(j))).collect();
            parts.join(", ")
        };
        certificate.verdict = Verdict::Stopped;
        certificate.reason = Some(format!(
            "a second method ended elsewhere: log-likelihood {:.8} at {}; this one {:.8} at {}",
            opinion.value,
            named(&opinion.theta),
            fit.log_likelihood,
            named(&fit.theta)
        ));
    }
}

fn relabelled(theta: &Vector, permutation: &[usize]) -> Vector {
    Vector::from_fn(theta.len(), |i, _| theta[permutation[i]])
}

/// The relabellings that leave restrictions and ranges as they are: the residuals are the same set at two points of
/// no special kind.
fn harmless(frame: &Frame, theta: &Vector) -> Vec<Vec<usize>> {
    let parameters = frame.likelihood.parameters();
    let residuals = |theta: &Vector| {
        let mut c: Vec<f64> = frame.sides(theta)?.iter().map(|s| (s.left - s.right).abs()).collect();
        c.sort_by(f64::total_cmp);
        Some(c)
    };
    let unchanged = |permutation: &Vec<usize>| {
        let ranges = (0..frame.n).all(|i| parameters[i].range == parameters[permutation[i]].range);
        ranges
            && [0.013, 0.027].iter().all(|by| {
                let odd = Vector::from_fn(frame.n, |j, _| theta[j] * (1.0 + by * (1.0 + (j as f64 * 0.618).fract())));
                match (residuals(&odd), residuals(&relabelled(&odd, permutation))) {
                    (Some(a), Some(b)) => a.iter().zip(&b).all(|(x, y)| (x - y).abs() <= 1e-12 * (1.0 + x.abs())),
                    _ => false,
                }
            })
    };
    frame.likelihood.relabellings().into_iter().filter(unchanged).collect()
}
