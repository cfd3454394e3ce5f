//! Maxima that sit on kinks of the log-likelihood: `abs(u)` of something estimated, as in the Laplace family, whose location is
//! a median. There the gradient jumps, and Newton's iteration has nothing to converge by.
//!
//! Every `abs(u)` is rounded off to sqrt(u^2 + width^2) first, ever narrower, each maximum from the one before (the path
//! following of Charalambous and Conn, and Madsen and Nielsen 1993, for sums of absolute values). The rows whose u then is next
//! to zero are met exactly: u = 0 joins the restrictions, the other rows keep their side, and what is left is smooth. At the
//! answer the multiplier of each such tie must lie within half the jump of the slope there (Osborne 1985, *Finite Algorithms in
//! Optimization and Data Analysis*, chapter 2); a tie whose multiplier does not is released to its side.

use std::cell::Cell;

use super::equations::Equations;
use super::error::SolveError;
use super::frame::Frame;
use super::local::scale;
use super::manifold::by_u;
use super::newton::{Ended, Known, Newton};
use super::rank::Rows;
use super::run::{Outcome, run};
use super::second::second_opinion;
use super::starts::heed;
use super::ties::{Balance, Pinned, balance};
use super::verdict::{condition, fit};
use super::{Fit, Search, Verdict};
use crate::likelihood::{Kink, LogLikelihood, Place, Sample};
use crate::math::{Matrix, Vector};

/// Widths of the rounding in typical residuals, from the widest to the narrowest.
const WIDTHS: [f64; 10] = [0.1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9, 1e-10];
/// A u within this many widths of zero may be a tie: its multiplier is within 0.06 percent of half the jump at most.
const CANDIDATE: f64 = 30.0;
/// |u| in typical residuals below which it is zero, where rounding does not ask for more.
const TIE: f64 = 1e-11;
/// Roundings, of what u is the difference of, below which it is zero.
const ROUNDINGS: f64 = 32.0;
/// Width, in typical residuals, on which another method looks for the answer.
const OTHER: f64 = 1e-2;
/// The rounded maximum may lie this much lower in log-likelihood: a small part of a standard error.
const LOWER: f64 = 0.05;
/// Rounds of releasing and meeting ties on one width.
const ROUNDS: usize = 12;
/// First-order error, in standard errors, at which a rounded maximum is good enough to go on from: far from zero, rounding
/// leaves no less.
const ARRIVED: f64 = 1e-4;
/// Most answers of the widest rounding that are followed.
const FOLLOWED: usize = 5;
/// Log-likelihoods within this, relative to 1 + |l|, are one value.
const SAME_VALUE: f64 = 1e-8;
/// Rows named in a note.
const NAMED: usize = 6;
/// Rows of a tie that depend on those before them to this part add nothing.
const DEPENDENT: f64 = 1e-7;

/// One search.
struct Kinked<'a> {
    sample: &'a Sample,
    equations: &'a dyn Equations,
    search: &'a Search,
    /// Mean |u| of each fold.
    typical: Vec<f64>,
    /// |u| in typical residuals below which it is zero.
    tie: f64,
    passes: Cell<usize>,
}

/// Where a search on one width came to.
enum Landing {
    Found(Box<Fit>),
    /// l rises without end along kinks.
    Off(Box<Fit>),
    Missed,
}

/// The best maximum from all starts (theta), on kinks or off them; `None` where no start leads to any.
pub(super) fn maximise(
    sample: &Sample,
    equations: &dyn Equations,
    search: &Search,
    starts: &[Vector],
) -> Result<Option<Fit>, SolveError> {
    let Some(first) = starts.first() else { return Ok(None) };
    let mut kinked = Kinked { sample, equations, search, typical: Vec::new(), tie: TIE, passes: Cell::new(0) };
    kinked.look(first);
    let found = kinked.answers(starts)?;
    let mut best: Option<(Fit, usize)> = None;
    let mut maxima: Vec<f64> = Vec::new();
    for (theta, reached) in found.answers.iter().take(FOLLOWED) {
        kinked.look(theta);
        let Some(fit) = kinked.follow(theta)? else { continue };
        let maximum = fit.certificate.verdict != Verdict::Unbounded;
        if maximum {
            maxima.push(fit.log_likelihood);
        }
        let better = best.as_ref().is_none_or(|(b, _)| {
            let was = b.certificate.verdict != Verdict::Unbounded;
            (maximum, fit.log_likelihood) > (was, b.log_likelihood)
        });
        if better {
            best = Some((fit, *reached));
        }
    }
    maxima.sort_by(|a, b| b.total_cmp(a));
    maxima.dedup_by(|a, b| (*a - *b).abs() <= SAME_VALUE * (1.0 + b.abs()));
    Ok(best.map(|(mut fit, reached)| {
        let certificate = &mut fit.certificate;
        certificate.maxima = maxima;
        certificate.starts = starts.len();
        certificate.starts_at_best = reached;
        certificate.collapsed = found.collapsed;
        certificate.passes = kinked.passes.get();
        fit
    }))
}

/// What the starts came to on the widest rounding.
struct Answers {
    /// Different maxima (theta), best first, with how many starts reached each.
    answers: Vec<(Vector, usize)>,
    collapsed: usize,
}

impl Kinked<'_> {
    /// Takes the sizes of residuals from a point.
    fn look(&mut self, theta: &Vector) {
        let phi = self.sample.coordinates().phi(theta);
        self.typical = self.sample.typical_residuals(&phi);
        let rounding = ROUNDINGS * f64::EPSILON * self.sample.cancellation(&phi, &self.typical);
        self.tie = TIE.max(rounding);
    }

    fn widths(&self, width: f64) -> Vec<f64> {
        self.typical.iter().map(|t| t * width).collect()
    }

    fn answers(&self, starts: &[Vector]) -> Result<Answers, SolveError> {
        let rounded = self.sample.rounded(&self.widths(WIDTHS[0]));
        let frame = Frame::new(&rounded, self.equations);
        let mut known: Known = Vec::new();
        let mut all: Vec<(f64, Vector, usize)> = Vec::new();
        let mut collapsed = 0;
        for start in starts {
            let Outcome::Ran(newton) = run(&frame, start, self.search.iterations, known.clone())? else { continue };
            if self.sample.collapsed(&newton.point.phi).is_some() {
                collapsed += 1;
                continue;
            }
            let value = newton.point.value;
            match newton.ended {
                Some(Ended::Known(k)) => all[k].2 += 1,
                Some(Ended::Found | Ended::Stuck) if newton.local.error() <= ARRIVED && !newton.is_saddle() => {
                    // one value is one answer: another labelling, or another point of a flat stretch
                    match all.iter().position(|a| (a.0 - value).abs() <= SAME_VALUE * (1.0 + value.abs())) {
                        Some(k) => all[k].2 += 1,
                        None => {
                            known.push((newton.point.phi.clone(), newton.local.d.clone()));
                            all.push((value, newton.point.theta.clone(), 1));
                        }
                    }
                }
                _ => {}
            }
        }
        self.count(&frame);
        all.sort_by(|a, b| b.0.total_cmp(&a.0));
        Ok(Answers { answers: all.into_iter().map(|(_, theta, reached)| (theta, reached)).collect(), collapsed })
    }

    fn count(&self, frame: &Frame) {
        self.passes.set(self.passes.get() + frame.passes());
    }

    /// From a maximum of the widest rounding to one of l itself.
    fn follow(&self, theta: &Vector) -> Result<Option<Fit>, SolveError> {
        let mut theta = theta.clone();
        let mut off = None;
        for (k, &width) in WIDTHS.iter().enumerate().filter(|(_, w)| CANDIDATE * **w > self.tie) {
            if k > 0 {
                let rounded = self.sample.rounded(&self.widths(width));
                let frame = Frame::new(&rounded, self.equations);
                let outcome = run(&frame, &theta, self.search.iterations, Known::new())?;
                self.count(&frame);
                match outcome {
                    Outcome::Ran(newton) if !matches!(newton.ended, Some(Ended::RanOff(..))) => {
                        theta = newton.point.theta.clone();
                    }
                    _ => break,
                }
            }
            match self.land(&theta, width)? {
                Landing::Found(fit) => return Ok(Some(*fit)),
                Landing::Off(fit) => off = Some(*fit),
                Landing::Missed => {}
            }
        }
        Ok(off)
    }

    fn near(&self, phi: &Vector, within: f64, released: &[(Place, f64)]) -> Option<Vec<Kink>> {
        let most = 3 * phi.len() + 20 + released.len();
        let mut near = self.sample.kinks_near(phi, &self.typical, within, most)?;
        near.retain(|k| released.iter().all(|r| r.0 != k.place));
        Some(near)
    }

    /// Meets the ties near theta, the maximum on this width, and looks whether that is a maximum of l.
    fn land(&self, theta: &Vector, width: f64) -> Result<Landing, SolveError> {
        let coordinates = self.sample.coordinates();
        let mut phi = coordinates.phi(theta);
        let mut reach = CANDIDATE * width;
        let mut released: Vec<(Place, f64)> = Vec::new();
        for _ in 0..ROUNDS {
            let Some(near) = self.near(&phi, reach, &released) else { return Ok(Landing::Missed) };
            let (pins, rest) = self.independent(&phi, near);
            let mut zero: Vec<Place> = pins.iter().chain(&rest).map(|k| k.place).collect();
            zero.sort_unstable();
            let mut sides = released.clone();
            sides.extend(zero.iter().map(|&p| (p, 0.0)));
            let sided = self.sample.sided(&phi, &sides);
            let pinned = Pinned::new(self.equations, self.sample, &pins, &phi, &self.typical);
            let frame = Frame::new(&sided, &pinned);
            let outcome = run(&frame, &coordinates.theta(&phi), self.search.iterations, Known::new())?;
            self.count(&frame);
            let Outcome::Ran(newton) = outcome else { return Ok(Landing::Missed) };
            let there = newton.point.phi.clone();
            match newton.ended {
                Some(Ended::Found) => {}
                Some(Ended::RanOff(..)) => {
                    let (value, sided) = (self.sample.at(&there), newton.point.value);
                    let same = (value - sided).abs() <= SAME_VALUE * (1.0 + sided.abs());
                    return Ok(match same && value > self.sample.at(&phi) {
                        true => Landing::Off(Box::new(self.finish(&frame, &newton, &[], &Vector::zeros(0))?)),
                        false => Landing::Missed,
                    });
                }
                _ => return Ok(Landing::Missed),
            }
            let mut except = zero.clone();
            except.extend(released.iter().map(|r| r.0));
            let crossed = self.sample.crossed(&phi, &there, &self.typical, self.tie, &except);
            if self.wrong_side(&there, &released) {
                return Ok(Landing::Missed);
            }
            let Some(ties) = self.near(&there, self.tie, &released) else { return Ok(Landing::Missed) };
            let mut met: Vec<Place> = ties.iter().map(|k| k.place).collect();
            met.sort_unstable();
            phi = there;
            reach = self.tie;
            if crossed || met != zero {
                continue;
            }
            // as they are at the answer: how l falls off a tie depends on the scale
            let here = |k: &Kink| ties.iter().find(|t| t.place == k.place).copied();
            let kinks: Vec<Kink> = pins.iter().chain(&rest).filter_map(here).collect();
            match balance(&frame, &newton, &pinned, self.sample, &kinks) {
                Balance::Holds(slopes) => {
                    return Ok(Landing::Found(Box::new(self.finish(&frame, &newton, &kinks, &slopes)?)));
                }
                Balance::Releases(which) => {
                    released.extend(which.into_iter().map(|(k, side)| (kinks[k].place, side)));
                }
            }
        }
        Ok(Landing::Missed)
    }

    /// Whether a released row has gone to the other side all the same.
    fn wrong_side(&self, phi: &Vector, released: &[(Place, f64)]) -> bool {
        let places: Vec<Place> = released.iter().map(|r| r.0).collect();
        let values = self.sample.residuals(&places).values(phi);
        let least = self.typical.iter().copied().fold(f64::INFINITY, f64::min) * self.tie;
        values.iter().zip(released).any(|(u, (_, side))| u * side < -least)
    }

    /// The kinks, nearest first, that restrictions and those before leave to be met; and those met by these already.
    fn independent(&self, phi: &Vector, near: Vec<Kink>) -> (Vec<Kink>, Vec<Kink>) {
        let places: Vec<Place> = near.iter().map(|k| k.place).collect();
        let b = self.sample.residuals(&places).jacobian(phi);
        let coordinates = self.sample.coordinates();
        let a = coordinates.jacobian(&self.equations.jacobian(&coordinates.theta(phi)));
        let (m, n) = (self.equations.len(), phi.len());
        let mut all = Matrix::zeros(m + places.len(), n);
        all.rows_mut(0, m).copy_from(&a);
        all.rows_mut(m, places.len()).copy_from(&b);
        for (j, mut column) in all.column_iter_mut().enumerate() {
            let size = b.column(j).amax();
            if size > 0.0 {
                column /= size;
            }
        }
        let norms = all.row_iter().map(|r| r.norm()).collect();
        let rows = Rows::within(&all, norms, DEPENDENT);
        let (mut pins, mut rest) = (Vec::new(), Vec::new());
        for (k, kink) in near.into_iter().enumerate() {
            if rows.kept.contains(&(m + k)) {
                pins.push(kink);
            } else if kink.distance <= self.tie {
                rest.push(kink);
            }
        }
        (pins, rest)
    }

    /// The fit of the likelihood itself from that under the ties; `slopes`: that of l in each u.
    fn finish(&self, frame: &Frame, newton: &Newton, kinks: &[Kink], slopes: &Vector) -> Result<Fit, SolveError> {
        let mut fit = fit(frame, newton);
        let places: Vec<Place> = kinks.iter().map(|k| k.place).collect();
        if self.search.second_opinion && fit.certificate.verdict == Verdict::StrictMaximum {
            self.ask(&mut fit)?;
        }
        let m = self.equations.len();
        let gradient = &newton.point.gradient + self.sample.residuals(&places).jacobian(&fit.phi).tr_mul(slopes);
        let local = &newton.local;
        let restrictions = newton.point.jacobian.rows(0, m).into_owned();
        let mut rows = by_u(&restrictions, &local.d);
        for &i in fit.redundant.iter().filter(|&&i| i < m) {
            rows.row_mut(i).fill(0.0);
        }
        let alone = Rows::of(&rows);
        let stacked = super::local::stack(frame, &rows, &local.d, &local.edges());
        let held = Rows::of(&stacked);
        let by_scale = gradient.component_mul(&local.d);
        let multipliers = held.multipliers(&by_scale);
        fit.multipliers = multipliers.rows(0, m).into_owned();
        fit.redundant.retain(|&i| i < m);
        fit.log_likelihood = self.sample.at(&fit.phi);
        let certificate = &mut fit.certificate;
        certificate.restrictions = m;
        certificate.rank = alone.kept.len();
        certificate.condition = condition(&stacked, &held);
        if !kinks.is_empty() {
            certificate.stationarity = (&by_scale - stacked.tr_mul(&multipliers)).amax();
            certificate.notes.push(self.note(kinks));
            fit.slope = Some(gradient);
        }
        Ok(fit)
    }

    /// Another method's opinion, on l rounded off, where both it and Newton's iteration can work: they must end at one point,
    /// near the answer, which must be no lower on l itself.
    fn ask(&self, fit: &mut Fit) -> Result<(), SolveError> {
        let rounded = self.sample.rounded(&self.widths(OTHER));
        let frame = Frame::new(&rounded, self.equations);
        let Outcome::Ran(newton) = run(&frame, &fit.theta, self.search.iterations, Known::new())? else {
            return Ok(());
        };
        let point = &newton.point;
        let mut opinion = second_opinion(&frame, &point.phi, point.value, &scale(point), &point.jacobian);
        self.count(&frame);
        opinion.value = self.sample.at(&frame.phi(&opinion.theta));
        let here = self.sample.at(&fit.phi);
        opinion.agrees &= opinion.value <= here + SAME_VALUE * (1.0 + here.abs()) && opinion.value >= here - LOWER;
        heed(&frame, fit, &opinion);
        Ok(())
    }

    fn note(&self, kinks: &[Kink]) -> String {
        let mut lines: Vec<usize> = kinks.iter().map(|k| self.sample.line(k.place)).collect();
        lines.sort_unstable();
        lines.dedup();
        let met = match lines.as_slice() {
            [one] => format!("the row on line {one} is met exactly"),
            some if some.len() <= NAMED => {
                let list: Vec<String> = some.iter().map(usize::to_string).collect();
                format!("the rows on lines {} are met exactly", list.join(", "))
            }
            many => format!("{} rows are met exactly, the first on line {}", many.len(), many[0]),
        };
        format!("the maximum sits at a kink of the likelihood: {met}")
    }
}
