//! Newton's iteration on the Lagrangian, as an argmin solver.

use argmin::core::{Error, IterState, KV, Problem, Solver, State, TerminationReason};

use super::End;
use super::Step;
use super::degenerate::regularity;
use super::escape::{NEGATIVE, escape};
use super::filter::{Filter, Test, Trial, sides_at};
use super::frame::{Frame, Point};
use super::local::{Local, scale};
use super::quadratic::{Plan, plan, stacked};
use super::restore::restore;
use crate::math::Vector;

/// First-order errors (in standard errors) at which an answer counts as found; the certificate asks for 1e-7.
pub(super) const FOUND: f64 = 1e-8;
/// Errors at rounding level: nothing left to gain.
const ROUNDING: f64 = 1e-13;
/// Below this error Newton's full step may be judged by the error alone.
const NEAR: f64 = 0.3;
/// A row that has shrunk to this part of what it was at the start may be on its way to nothing.
const VANISHED: f64 = 1e-7;
const SHORTEST: f64 = 1e-10;

/// Why a search ended.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Ended {
    /// First-order conditions hold to rounding and no negative curvature was left to follow.
    Found,
    /// A parameter runs off: towards an open end, or beyond all bounds (`None`).
    RanOff(usize, Option<End>),
    /// It comes so near to an answer already known that it would end there.
    Known(usize),
    /// No step helps any more.
    Stuck,
    /// The restrictions cannot be met from here.
    Infeasible,
    /// It approaches a point where a restriction's gradient vanishes.
    Irregular,
    /// The most iterations allowed were made.
    Limit,
}

/// argmin's state: the current phi; its cost is the first-order error, so that argmin's 'best' is never an
/// infeasible point with a high l.
pub(super) type Iterate = IterState<Vec<f64>, (), (), (), (), f64>;

/// Answers known from earlier starts: phi and scale.
pub(super) type Known = Vec<(Vector, Vector)>;

/// The solver: the current point and what the search has learned.
pub(super) struct Newton<'a> {
    frame: &'a Frame<'a>,
    known: Known,
    filter: Filter,
    radius: f64,
    first: Point,
    /// Scale where it began.
    pub first_scale: Vector,
    last_step: Vector,
    /// Current point.
    pub point: Point,
    /// Lagrangian at it.
    pub local: Local,
    /// One line an iteration.
    pub trace: Vec<Step>,
    /// Steps in units of the first scale, for telling convergence from running off.
    pub strides: Vec<f64>,
    /// Why it ended.
    pub ended: Option<Ended>,
}

/// A step taken.
struct Taken {
    point: Point,
    length: f64,
    shift: f64,
}

impl<'a> Newton<'a> {
    /// Starts from an evaluated point.
    pub fn new(frame: &'a Frame<'a>, point: Point, known: Known) -> Self {
        let d = scale(&point);
        let local = Local::at(frame, &point, d.clone());
        let filter = Filter::new(&point.sides, &point.jacobian, &d);
        Newton {
            frame,
            known,
            filter,
            radius: 10.0,
            first: point.clone(),
            last_step: Vector::zeros(frame.n),
            first_scale: d,
            point,
            local,
            trace: Vec::new(),
            strides: Vec::new(),
            ended: None,
        }
    }

    /// One iteration: the next point, or why there is none.
    fn iterate(&mut self) -> Result<Taken, Ended> {
        if self.local.error() <= FOUND {
            return self.finish();
        }
        let plan = plan(self.frame, &self.point.theta, &self.local, self.radius).ok_or(Ended::Stuck)?;
        if let Some(known) = self.recognise(&plan) {
            return Err(Ended::Known(known));
        }
        self.near_step(&plan)
            .or_else(|| self.line_search(&plan))
            .or_else(|| self.restoration())
            .or_else(|| self.leave())
            .ok_or(if self.local.infeasibility > 1e-9 { Ended::Infeasible } else { Ended::Stuck })
    }

    /// At an answer: leave it if it is no maximum, else improve it to rounding.
    fn finish(&mut self) -> Result<Taken, Ended> {
        if let Some(taken) = self.leave() {
            return Ok(taken);
        }
        if self.local.error() <= ROUNDING {
            return Err(Ended::Found);
        }
        let plan = plan(self.frame, &self.point.theta, &self.local, self.radius).ok_or(Ended::Found)?;
        self.full_step(&plan, 0.5).ok_or(Ended::Found)
    }

    /// Newton's full step near an answer, judged by the first-order error.
    fn near_step(&self, plan: &Plan) -> Option<Taken> {
        if self.local.error() < NEAR { self.full_step(plan, 0.25) } else { None }
    }

    /// The full step of an uncorrected model if it lowers the first-order error to `part` of what it is.
    fn full_step(&self, plan: &Plan, part: f64) -> Option<Taken> {
        if plan.shift > 0.0 {
            return None;
        }
        let phi = self.frame.moved(&self.point.phi, &plan.u, &self.local.d);
        let point = self.frame.point(&phi)?;
        // By the scale of the point that is left: a scale that grows with the step must not hide the error.
        let after = Local::at(self.frame, &point, self.local.d.clone());
        (after.error() <= part * self.local.error()).then_some(Taken { point, length: 1.0, shift: 0.0 })
    }

    /// Filter line search along the step, with a second-order correction of the first trial.
    fn line_search(&mut self, plan: &Plan) -> Option<Taken> {
        if plan.left > 0.9 * self.local.violation && plan.left > 1e-8 {
            return None;
        }
        let frame = self.frame;
        let test = Test::new(&self.filter, &self.point, self.local.g.dot(&plan.u));
        let mut length = 1.0;
        let mut accepted = None;
        while length > SHORTEST {
            let phi = frame.moved(&self.point.phi, &(&plan.u * length), &self.local.d);
            // The first trial is usually taken: evaluate it in full at once.
            let full = if length == 1.0 { frame.point(&phi) } else { None };
            let sides = sides_at(frame, &phi);
            let value = match (&full, &sides) {
                (Some(p), _) => p.value,
                (None, Some(_)) if length < 1.0 => frame.value(&phi),
                _ => f64::NAN,
            };
            let trial = sides.as_ref().map_or(Trial::Refused, |s| test.judge(length, s, value));
            if trial != Trial::Refused
                && let Some(point) = full.or_else(|| frame.point(&phi))
            {
                accepted = Some((point, trial, length));
                break;
            }
            if length == 1.0
                && let Some(s) = &sides
                && let Some((point, trial)) = self.corrected(plan, s, &test)
            {
                accepted = Some((point, trial, 1.0));
                break;
            }
            length = test.shorter(length, value);
        }
        let (point, trial, length) = accepted?;
        if trial == Trial::Filtered {
            self.filter.add(self.filter.violation(&self.point.sides), self.point.value);
        }
        self.radius = if length == 1.0 { 4.0 * self.radius } else { (self.radius * 2.0 * length).max(1e-3) };
        Some(Taken { point, length, shift: plan.shift })
    }

    /// The full step with the curvature of the restrictions made good, if that is accepted.
    fn corrected(&self, plan: &Plan, sides: &[crate::restriction::Sides], test: &Test) -> Option<(Point, Trial)> {
        if self.filter.violation(sides) <= self.filter.violation(&self.point.sides) {
            return None;
        }
        let frame = self.frame;
        let mut u = plan.u.clone();
        let mut sides = sides.to_vec();
        for _ in 0..2 {
            let residual = stacked(&-super::frame::gaps(&sides), plan.edges.len());
            u += plan.rows.solve(&residual);
            let phi = frame.moved(&self.point.phi, &u, &self.local.d);
            if !frame.contains(&frame.theta(&phi)) {
                return None;
            }
            sides = sides_at(frame, &phi)?;
            let value = frame.value(&phi);
            let trial = test.judge(1.0, &sides, value);
            if trial != Trial::Refused {
                return frame.point(&phi).map(|p| (p, trial));
            }
        }
        None
    }

    /// Back to the restrictions, if they are missed and that leads to a point not yet refused.
    fn restoration(&mut self) -> Option<Taken> {
        if self.local.infeasibility <= 1e-9 {
            return None;
        }
        let back = restore(self.frame, &self.point.phi, &self.local.d)?;
        if !back.feasible() {
            return None;
        }
        let point = self.frame.point(&back.phi)?;
        // From the restrictions the search begins anew: they are met now, and the old pairs speak of far away.
        self.filter = Filter::new(&point.sides, &point.jacobian, &scale(&point));
        Some(Taken { point, length: 0.0, shift: 0.0 })
    }

    /// Along negative curvature, where the gradient is too small to lead.
    fn leave(&mut self) -> Option<Taken> {
        let point = escape(self.frame, &self.point, &self.local)?;
        self.filter = Filter::new(&point.sides, &point.jacobian, &scale(&point));
        self.radius = 10.0;
        Some(Taken { point, length: 0.0, shift: 0.0 })
    }

    /// An answer already known to which the uncorrected step leads, within a twentieth of a standard error.
    fn recognise(&self, plan: &Plan) -> Option<usize> {
        if plan.shift > 0.0 || self.local.error() > 1.0 {
            return None;
        }
        let target = &self.point.phi + plan.u.component_mul(&self.local.d);
        self.known.iter().position(|(phi, d)| (&target - phi).component_div(d).amax() < 0.05)
    }

    /// Takes a step, and looks whether it runs off.
    fn take(&mut self, taken: Taken) {
        let moved = (&taken.point.phi - &self.point.phi).component_div(&self.first_scale);
        self.strides.push(moved.norm());
        self.last_step = &taken.point.theta - &self.point.theta;
        self.record(taken.length, taken.shift);
        self.point = taken.point;
        self.local = Local::at(self.frame, &self.point, scale(&self.point));
        self.ended = self.runs_off();
    }

    /// A parameter next to an open end, or far beyond where the search began, with l still rising.
    fn runs_off(&self) -> Option<Ended> {
        if self.local.error() <= FOUND {
            return None;
        }
        if self.local.infeasibility <= FOUND && self.filter.shrunk(&self.local.j) < VANISHED {
            let looked = regularity(self.frame, &self.point, &self.first_scale, &self.local.edges());
            return (!looked.irregular.is_empty()).then_some(Ended::Irregular);
        }
        for b in self.frame.bounds.iter().filter(|b| !b.closed) {
            let (now, then) = (b.room(&self.point.theta), b.room(&self.first.theta));
            if now < 1e-13 * then {
                return Some(Ended::RanOff(b.parameter, Some(b.end)));
            }
        }
        let far = |j: &usize| {
            let (now, then) = (self.point.theta[*j], self.first.theta[*j]);
            now.abs() > 1e15 * (then.abs() + self.first_scale[*j].min(1.0))
        };
        (0..self.frame.n).find(far).map(|j| Ended::RanOff(j, None))
    }

    fn record(&mut self, length: f64, shift: f64) {
        self.trace.push(Step {
            iteration: self.trace.len(),
            log_likelihood: self.point.value,
            feasibility: self.local.infeasibility,
            stationarity: self.local.stationarity,
            length,
            shift,
        });
    }

    /// Whether the last steps grew shorter, as they do on the way to a point (and do not on the way to infinity).
    pub fn strides_shrink(&self) -> bool {
        let window = (self.strides.len() / 2).min(5);
        let (before, last) = self.strides.split_at(self.strides.len() - window);
        let before: f64 = before.iter().rev().take(window).sum();
        window == 0 || last.iter().sum::<f64>() < 0.6 * before
    }

    /// Whether l rose over the last iterations.
    pub fn still_rises(&self) -> bool {
        let last: Vec<f64> = self.trace.iter().rev().take(5).map(|s| s.log_likelihood).collect();
        last.len() >= 3 && last.windows(2).all(|w| w[0] >= w[1]) && last[0] > last[last.len() - 1]
    }

    /// The parameter that moved most in the last step, in units of the first scale.
    pub fn swiftest(&self) -> usize {
        let speed = |&j: &usize| self.last_step[j].abs() / self.first_scale[j];
        (0..self.frame.n).max_by(|a, b| speed(a).total_cmp(&speed(b)).then(b.cmp(a))).unwrap_or(0)
    }

    /// Which way a parameter moved in the last step.
    pub fn heading(&self, j: usize) -> f64 {
        self.last_step[j]
    }

    /// Smallest and largest eigenvalue on the free directions; `None` where none is free.
    pub fn extremes(&self) -> Option<(f64, f64)> {
        let rows = self.local.rows(self.frame, &self.local.edges());
        let (values, _) = self.local.spectrum(&rows.z)?;
        Some((*values.first()?, *values.last()?))
    }

    /// Whether the curvature is negative somewhere on the free directions.
    pub fn is_saddle(&self) -> bool {
        self.extremes().is_some_and(|(low, high)| low < -NEGATIVE * low.abs().max(high.abs()))
    }
}

impl<'a> Solver<(), Iterate> for Newton<'a> {
    fn name(&self) -> &str {
        "Newton on the Lagrangian"
    }

    fn next_iter(&mut self, _problem: &mut Problem<()>, state: Iterate) -> Result<(Iterate, Option<KV>), Error> {
        match self.iterate() {
            Ok(taken) => self.take(taken),
            Err(ended) => self.ended = Some(ended),
        }
        let state = state.param(self.point.phi.as_slice().to_vec()).cost(self.local.error());
        let state = match self.ended.clone() {
            None => state,
            Some(ended) => {
                self.record(0.0, 0.0);
                state.terminate_with(match ended {
                    Ended::Found => TerminationReason::SolverConverged,
                    other => TerminationReason::SolverExit(format!("{other:?}")),
                })
            }
        };
        Ok((state, None))
    }
}
