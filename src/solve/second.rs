//! A second opinion: the same optimum by a method that shares nothing with the first. Augmented Lagrangian (Hestenes 1969,
//! Powell 1969) over argmin's L-BFGS, values of l only (derivatives by differences), ranges removed by substitution,
//! from a point moved away from the answer.

use std::cell::RefCell;

use argmin::core::{CostFunction, Error, Executor, Gradient};
use argmin::solver::linesearch::MoreThuenteLineSearch;
use argmin::solver::quasinewton::LBFGS;

use super::filter::{sides_at, weights};
use super::frame::{Frame, gaps};
use crate::likelihood::Parameter;
use crate::math::{Matrix, Vector};

/// Difference step, in standard errors.
const STEP: f64 = 1e-4;
/// Log-likelihoods within this are the same: the difference derivatives are good for about 1e-7.
const SAME_VALUE: f64 = 1e-5;
/// Points within this many standard errors are the same.
const SAME_POINT: f64 = 0.01;
/// Residuals in standard errors that end the outer iteration.
const FEASIBLE: f64 = 1e-7;
/// Residuals in standard errors that show a minimum of the penalised function far from the restrictions.
const FAR: f64 = 1e3;
const OUTER: usize = 25;
const AFRESH: usize = 5;
const INNER: u64 = 200;

/// What the other method found.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Opinion {
    pub agrees: bool,
    /// Where it ended, nearest to agreement of its attempts.
    pub theta: Vector,
    pub value: f64,
}

/// Asks for the optimum near `phi` (l there `value`), with scale `d` and the Jacobian by phi.
pub(super) fn second_opinion(frame: &Frame, phi: &Vector, value: f64, d: &Vector, jacobian: &Matrix) -> Opinion {
    let mut nearest: Option<Opinion> = None;
    for away in [0.5, -0.3, 0.1] {
        let mut problem = Augmented::new(frame, phi, d, jacobian);
        let t = problem.solve(away);
        let there = problem.phi(&t);
        let Some(sides) = sides_at(frame, &there) else { continue };
        let found = frame.value(&there);
        let violation = gaps(&sides).iter().zip(&problem.units).fold(0.0, |w: f64, (c, u)| w.max((c / u).abs()));
        let near = (&there - phi).component_div(d).amax() <= SAME_POINT;
        let same = (found - value).abs() <= SAME_VALUE + 1e-12 * value.abs();
        let opinion = Opinion { agrees: near && same && violation < 1e-4, theta: frame.theta(&there), value: found };
        let higher = violation < 1e-6 && found > value + 2.0 * SAME_VALUE;
        if opinion.agrees || higher {
            return opinion;
        }
        if nearest.as_ref().is_none_or(|o| (o.value - value).abs() > (found - value).abs()) {
            nearest = Some(opinion);
        }
    }
    nearest.unwrap_or(Opinion { agrees: false, theta: frame.theta(phi), value: f64::NAN })
}

/// How a working coordinate follows from a free variable t, in which a standard error is about 1.
enum Way {
    Straight {
        at: f64,
        unit: f64,
    },
    /// end + sign * size * (root + rate * t)^2
    Square {
        end: f64,
        sign: f64,
        size: f64,
        root: f64,
        rate: f64,
    },
    /// end + sign * size * exp(rate * t)
    Exponential {
        end: f64,
        sign: f64,
        size: f64,
        rate: f64,
    },
    /// low + width * sin(angle + rate * t)^2
    Sine {
        low: f64,
        width: f64,
        angle: f64,
        rate: f64,
    },
}

impl Way {
    fn of(parameter: &Parameter, at: f64, d: f64) -> Way {
        let range = &parameter.range;
        match (range.low.is_finite(), range.high.is_finite()) {
            (false, false) => Way::Straight { at, unit: d },
            (true, true) => {
                let width = range.high - range.low;
                let angle = ((at - range.low) / width).clamp(0.0, 1.0).sqrt().asin();
                Way::Sine { low: range.low, width, angle, rate: (d / (width * (2.0 * angle).sin().abs())).min(0.3) }
            }
            (low, _) => {
                let (end, sign, closed) =
                    if low { (range.low, 1.0, range.low_closed) } else { (range.high, -1.0, range.high_closed) };
                let size = (sign * (at - end)).max(0.0);
                if !closed {
                    Way::Exponential { end, sign, size, rate: (d / size).min(1.0) }
                } else if size > 0.0 {
                    Way::Square { end, sign, size, root: 1.0, rate: (0.5 * d / size).min(1.0) }
                } else {
                    Way::Square { end, sign, size: d, root: 0.0, rate: 1.0 }
                }
            }
        }
    }

    fn value(&self, t: f64) -> f64 {
        match *self {
            Way::Straight { at, unit } => at + unit * t,
            Way::Square { end, sign, size, root, rate } => end + sign * size * (root + rate * t).powi(2),
            Way::Exponential { end, sign, size, rate } => end + sign * size * (rate * t).exp(),
            Way::Sine { low, width, angle, rate } => low + width * (angle + rate * t).sin().powi(2),
        }
    }
}

/// -l + multipliers' c + penalty/2 |c|^2 with c in standard errors, as a function of t.
struct Augmented<'a> {
    frame: &'a Frame<'a>,
    ways: Vec<Way>,
    units: Vec<f64>,
    multipliers: Vec<f64>,
    penalty: f64,
    /// Lowest cost seen, and where: argmin loses it when a line search fails.
    best: RefCell<(f64, Vec<f64>)>,
}

impl<'a> Augmented<'a> {
    fn new(frame: &'a Frame<'a>, phi: &Vector, d: &Vector, jacobian: &Matrix) -> Self {
        let parameters = frame.likelihood.parameters();
        let ways = (0..frame.n).map(|j| match frame.map {
            None => Way::of(&parameters[j], phi[j], d[j]),
            Some(_) => Way::Straight { at: phi[j], unit: d[j] },
        });
        let ways: Vec<Way> = ways.collect();
        let reach = Vector::from_fn(frame.n, |j, _| {
            (ways[j].value(0.5) - phi[j]).abs().max((ways[j].value(-0.5) - phi[j]).abs())
        });
        let units = weights(jacobian, &reach);
        let multipliers = vec![0.0; units.len()];
        Augmented { frame, ways, units, multipliers, penalty: 10.0, best: RefCell::new((f64::INFINITY, Vec::new())) }
    }

    fn phi(&self, t: &[f64]) -> Vector {
        Vector::from_iterator(t.len(), t.iter().zip(&self.ways).map(|(&t, way)| way.value(t)))
    }

    fn residuals(&self, phi: &Vector) -> Option<Vec<f64>> {
        let sides = sides_at(self.frame, phi)?;
        Some(gaps(&sides).iter().zip(&self.units).map(|(c, u)| c / u).collect())
    }

    fn at(&self, t: &[f64]) -> f64 {
        let phi = self.phi(t);
        let inside = self.frame.contains(&self.frame.theta(&phi));
        let Some(c) = self.residuals(&phi).filter(|_| inside) else { return f64::INFINITY };
        let value = self.frame.value(&phi);
        let held: f64 = c.iter().zip(&self.multipliers).map(|(c, m)| m * c + 0.5 * self.penalty * c * c).sum();
        if value.is_finite() { held - value } else { f64::INFINITY }
    }

    /// Outer iteration from a point `away` standard errors off.
    fn solve(&mut self, away: f64) -> Vec<f64> {
        let n = self.frame.n;
        let start: Vec<f64> = (0..n).map(|j| if j % 2 == 0 { away } else { -0.8 * away }).collect();
        let mut t = start.clone();
        let mut before = f64::INFINITY;
        for _ in 0..OUTER {
            t = self.minimise(t);
            let Some(c) = self.residuals(&self.phi(&t)) else { break };
            let violation = c.iter().fold(0.0, |w: f64, c| w.max(c.abs()));
            if violation < FEASIBLE {
                break;
            }
            if violation > FAR {
                // The penalty is too weak to hold l back: begin again with a stronger one.
                self.penalty *= 30.0;
                self.multipliers.fill(0.0);
                t = start.clone();
                continue;
            }
            for (m, c) in self.multipliers.iter_mut().zip(&c) {
                *m += self.penalty * c;
            }
            if violation > 0.25 * before {
                self.penalty *= 4.0;
            }
            before = violation;
        }
        t
    }

    /// Minimises, beginning afresh where argmin's line search gave up.
    fn minimise(&self, t: Vec<f64>) -> Vec<f64> {
        let mut t = t;
        for _ in 0..AFRESH {
            let (before, better) = (self.at(&t), self.descend(t.clone()));
            t = better;
            if before - self.at(&t) <= 1e-9 {
                break;
            }
        }
        t
    }

    fn descend(&self, t: Vec<f64>) -> Vec<f64> {
        self.best.replace((self.at(&t), t.clone()));
        let search = MoreThuenteLineSearch::new();
        let solver: LBFGS<_, Vec<f64>, Vec<f64>, f64> = LBFGS::new(search, 10);
        // A line search that fails at the end is no fault: the best point seen is kept beside argmin's state.
        let _ended = solver.with_tolerance_grad(1e-9).and_then(|s| s.with_tolerance_cost(1e-15)).and_then(|s| {
            Executor::new(Shared(self), s).configure(|state| state.param(t).max_iters(INNER)).run().map(|_| ())
        });
        self.best.borrow().1.clone()
    }
}

/// The same function handed to argmin, which wants to own its problem.
struct Shared<'a>(&'a Augmented<'a>);

impl CostFunction for Shared<'_> {
    type Param = Vec<f64>;
    type Output = f64;

    fn cost(&self, t: &Vec<f64>) -> Result<f64, Error> {
        let cost = self.0.at(t);
        if cost < self.0.best.borrow().0 {
            self.0.best.replace((cost, t.clone()));
        }
        Ok(cost)
    }
}

impl Gradient for Shared<'_> {
    type Param = Vec<f64>;
    type Gradient = Vec<f64>;

    fn gradient(&self, t: &Vec<f64>) -> Result<Vec<f64>, Error> {
        let mut moved = t.clone();
        Ok((0..t.len())
            .map(|j| {
                moved[j] = t[j] + STEP;
                let above = self.0.at(&moved);
                moved[j] = t[j] - STEP;
                let below = self.0.at(&moved);
                moved[j] = t[j];
                (above - below) / (2.0 * STEP)
            })
            .collect())
    }
}
