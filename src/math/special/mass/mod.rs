//! Tail probabilities of counts by exact sums over the mass, with their derivatives.
//!
//! A sum starts at the count that is asked for, where the mass is known in closed form, and goes away from the mean by the ratio
//! of neighbours; the scores follow by the derivatives of the ratio. With s the score and h its slope at a count, the derivatives
//! of the logarithm of a sum of f are sum(f s)/sum(f) and sum(f (s s' + h))/sum(f) less the product of the first ones. All is kept
//! in units of the first term, so that a far tail does not underflow. Past some thousands of counts the mass is smooth beside their
//! number, and quadrature goes on.

mod beta_binomial;
mod hypergeometric;
mod logarithmic;
mod negative_binomial;
#[cfg(test)]
mod reference;
mod run;

pub use beta_binomial::{beta_binomial_information, beta_binomial_log_tail};
pub use hypergeometric::{hypergeometric_log_mass, hypergeometric_log_sum, hypergeometric_log_tail};
pub use logarithmic::logarithmic_log_tail;
pub use negative_binomial::{negative_binomial_information, negative_binomial_log_tail};

use super::{log1mexp, log1p_excess, log1p_over};

/// A logarithm and its first and second derivatives in two parameters.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Jet {
    value: f64,
    first: [f64; 2],
    /// by the first twice, by both, by the second twice
    second: [f64; 3],
}

/// The pairs of parameters in [`Jet::second`].
const PAIRS: [(usize, usize); 3] = [(0, 0), (0, 1), (1, 1)];

impl Jet {
    const fn constant(value: f64) -> Jet {
        Jet { value, first: [0.0; 2], second: [0.0; 3] }
    }

    /// The (i, j)-th derivative; NaN where i + j > 2.
    fn derivative(&self, i: f64, j: f64) -> f64 {
        let orders = [(0.0, 0.0), (1.0, 0.0), (0.0, 1.0), (2.0, 0.0), (1.0, 1.0), (0.0, 2.0)];
        let [s, h] = self.first;
        let [a, b, c] = self.second;
        let all = [self.value, s, h, a, b, c];
        orders.iter().position(|&o| o == (i, j)).map_or(f64::NAN, |at| all[at])
    }

    /// log(1 - exp(value)).
    fn complement(&self) -> Jet {
        let value = log1mexp(-self.value);
        let odds = libm::exp(self.value - value);
        let (s, h) = (self.first, self.second);
        let mut second = [0.0; 3];
        for (k, &(i, j)) in PAIRS.iter().enumerate() {
            second[k] = -odds * (h[k] + s[i] * s[j] * (1.0 + odds));
        }
        Jet { value, first: [-odds * s[0], -odds * s[1]], second }
    }

    /// Derivatives in another second parameter u, given dv/du and d2v/du2 of the present one v.
    fn through(&self, slope: f64, bend: f64) -> Jet {
        let (s, h) = (self.first, self.second);
        Jet {
            value: self.value,
            first: [s[0], s[1] * slope],
            second: [h[0], h[1] * slope, h[2] * slope * slope + s[1] * bend],
        }
    }

    fn plus(&self, other: &Jet) -> Jet {
        Jet {
            value: self.value + other.value,
            first: [0, 1].map(|i| self.first[i] + other.first[i]),
            second: [0, 1, 2].map(|k| self.second[k] + other.second[k]),
        }
    }
}

/// log1p(d)/d, (d - log1p(d))/d^2 and the derivative of the latter, from d, 1 + d and log(1 + d): near -1, where few are counted
/// of many expected, d alone says too little of 1 + d.
fn quotients(d: f64, up: f64, log: f64) -> [f64; 3] {
    if d > -0.5 {
        return [log1p_over(0.0, d), log1p_excess(0.0, d), log1p_excess(1.0, d)];
    }
    let e = (d - log) / (d * d);
    [log / d, e, (1.0 / up - 2.0 * e) / d]
}

/// A mass on the whole numbers from 0, in two parameters.
trait Mass {
    /// The largest count, or infinity.
    fn last(&self) -> f64;
    /// Its mean.
    fn mean(&self) -> f64;
    /// log f(u).
    fn at(&self, u: f64) -> Jet;
    /// f(u + 1) / f(u) itself, and the derivatives of its logarithm.
    fn rise(&self, u: f64) -> Jet;
    /// A number that no later ratio in this direction exceeds beside the present one; infinite where nothing is known.
    fn limit(&self, upward: bool) -> f64;
}

/// What a sum may leave out, of its value. Scores grow like the distance, so that less is left out than the value alone needs.
const REST: f64 = 1e-21;

/// log of the sum of f from a count on, upward to the last or downward to 0.
fn sum(mass: &impl Mass, from: f64, upward: bool) -> Jet {
    if from < 0.0 || from > mass.last() {
        return Jet::constant(f64::NEG_INFINITY);
    }
    let start = mass.at(from);
    if !start.value.is_finite() {
        return start;
    }
    let mut sums = Sums::about(start);
    sums.side(mass, &start, from, upward);
    sums.log()
}

/// Sums of f, f s and f (s s' + h) in units of one mass, the scores less those there, so that large ones do not cancel.
struct Sums {
    unit: Jet,
    total: f64,
    first: [f64; 2],
    second: [f64; 3],
}

impl Sums {
    fn about(unit: Jet) -> Sums {
        Sums { unit, total: 0.0, first: [0.0; 2], second: [0.0; 3] }
    }

    fn add(&mut self, term: f64, s: [f64; 2], h: [f64; 3]) {
        self.total += term;
        for (sum, s) in self.first.iter_mut().zip(s) {
            *sum += term * s;
        }
        for ((sum, (i, j)), h) in self.second.iter_mut().zip(PAIRS).zip(h) {
            *sum += term * (s[i] * s[j] + h);
        }
    }

    /// Adds all from a count on, whose mass is `start`, upward to the last or downward to 0.
    fn side(&mut self, mass: &impl Mass, start: &Jet, from: f64, upward: bool) {
        let end = if upward { mass.last() } else { 0.0 };
        let steps = (end - from).abs();
        let long = steps > 3.0 * run::SINGLE;
        let singly = if long { run::SINGLE - 1.0 } else { steps };
        if !self.walk(mass, start, from, singly, upward, mass.limit(upward)) && long {
            run::rest(mass, from, end, upward, self);
        }
    }

    /// Adds a mass in closed form, times a weight.
    fn add_jet(&mut self, weight: f64, jet: &Jet) {
        let s = [0, 1].map(|i| jet.first[i] - self.unit.first[i]);
        self.add(weight * libm::exp(jet.value - self.unit.value), s, jet.second);
    }

    /// Adds a mass and those of so many further counts one by one. Whether the rest is negligible, going by a bound on all later
    /// ratios beside the present one.
    fn walk(&mut self, mass: &impl Mass, start: &Jet, from: f64, steps: f64, upward: bool, limit: f64) -> bool {
        let (mut u, mut left) = (from, steps);
        let mut term = libm::exp(start.value - self.unit.value);
        let mut s = [0, 1].map(|i| start.first[i] - self.unit.first[i]);
        let mut h = start.second;
        loop {
            self.add(term, s, h);
            if left == 0.0 {
                return false;
            }
            let (rise, sign) = if upward { (mass.rise(u), 1.0) } else { (mass.rise(u - 1.0), -1.0) };
            let ratio = if upward { rise.value } else { 1.0 / rise.value };
            let bound = ratio.max(limit);
            term *= ratio;
            if (bound < 1.0 && term <= REST * self.total * (1.0 - bound)) || term == 0.0 || term.is_nan() {
                return true;
            }
            u += sign;
            left -= 1.0;
            s = [0, 1].map(|i| s[i] + sign * rise.first[i]);
            h = [0, 1, 2].map(|k| h[k] + sign * rise.second[k]);
        }
    }

    fn log(&self) -> Jet {
        let first = self.first.map(|x| x / self.total);
        let mut out = Jet {
            value: self.unit.value + libm::log(self.total),
            first: [0, 1].map(|i| self.unit.first[i] + first[i]),
            second: [0.0; 3],
        };
        for (k, &(i, j)) in PAIRS.iter().enumerate() {
            out.second[k] = self.second[k] / self.total - first[i] * first[j];
        }
        out
    }
}

/// A mass of which only the scores are looked at, so that [`Sums`] gathers f s s'.
struct Scores<'a, M>(&'a M);

impl<M: Mass> Mass for Scores<'_, M> {
    fn last(&self) -> f64 {
        self.0.last()
    }

    fn mean(&self) -> f64 {
        self.0.mean()
    }

    fn at(&self, u: f64) -> Jet {
        Jet { second: [0.0; 3], ..self.0.at(u) }
    }

    fn rise(&self, u: f64) -> Jet {
        Jet { second: [0.0; 3], ..self.0.rise(u) }
    }

    fn limit(&self, upward: bool) -> f64 {
        self.0.limit(upward)
    }
}

/// E[s_i s_j] of the scores by the two parameters, summed over all counts outward from the mean.
fn information(mass: &impl Mass) -> [f64; 3] {
    let mass = Scores(mass);
    let from = mass.mean().floor().clamp(0.0, mass.last());
    let unit = mass.at(from);
    let mut sums = Sums::about(unit);
    sums.side(&mass, &unit, from, true);
    if from > 0.0 {
        sums.side(&mass, &mass.at(from - 1.0), from - 1.0, false);
    }
    // the scores were taken less those of the unit, and their mean is zero
    let u = unit.first;
    let mut out = [0.0; 3];
    for (k, &(i, j)) in PAIRS.iter().enumerate() {
        out[k] = sums.second[k] / sums.total - u[i] * u[j];
    }
    out
}

/// log P(Y <= y), or log P(Y > y) where `above`, at a whole number y. The side away from the mean is summed, unless it holds more
/// than half of the mass; the other is its complement.
fn tail(mass: &impl Mass, above: bool, y: f64) -> Jet {
    if y < 0.0 || y >= mass.last() {
        let certain = above == (y < 0.0);
        return Jet::constant(if certain { 0.0 } else { f64::NEG_INFINITY });
    }
    let side = |above: bool| if above { sum(mass, y + 1.0, true) } else { sum(mass, y, false) };
    let far = y >= mass.mean();
    let one = side(far);
    if one.value > -std::f64::consts::LN_2 || one.value == f64::NEG_INFINITY {
        return if above == far { one } else { side(above) };
    }
    if above == far { one } else { one.complement() }
}
