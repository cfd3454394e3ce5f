//! Fisher's noncentral hypergeometric distribution: successes among n draws from s successes and f failures, odds ratio w.

use super::super::{deviance, factorial_remainder, whole};
use super::{Jet, Mass, tail};
use libm::{exp, log};

/// The m-th derivative (0 to 4) in t of log(sum over u of C(s, u) C(f, n - u) exp(t u)); the first is the mean, the second the
/// variance. NaN where s, f, n are no whole numbers with 0 <= n <= s + f.
pub fn hypergeometric_log_sum(m: f64, t: f64, s: f64, f: f64, n: f64) -> f64 {
    let Some(order) = whole(m, 4) else { return f64::NAN };
    let Some(law) = Hypergeometric::new(exp(t), s, f, n) else { return f64::NAN };
    let [_, k2, k3, k4] = law.cumulants;
    match order {
        0 => {
            let u = law.low + law.mode;
            let tilted = if u == 0.0 { 0.0 } else { t * u };
            log_choose(s, u) + log_choose(f, n - u) + tilted + law.log_total
        }
        1 => law.low + law.cumulants[0],
        2 => k2,
        3 => k3,
        _ => k4,
    }
}

/// The m-th derivative (0 to 2) in the odds ratio w >= 0 of the log mass at y; at w = 0 one-sided.
pub fn hypergeometric_log_mass(m: f64, y: f64, w: f64, s: f64, f: f64, n: f64) -> f64 {
    let Some(law) = Hypergeometric::new(w, s, f, n) else { return f64::NAN };
    let u = y - law.low;
    if y != y.floor() {
        return f64::NAN;
    }
    if u < 0.0 || u > law.last() {
        return Jet::constant(f64::NEG_INFINITY).derivative(m, 0.0);
    }
    law.mass_in_odds(u).derivative(m, 0.0)
}

/// The m-th derivative (0 to 2) in the odds ratio w >= 0 of log P(Y <= y) (side 0) or log P(Y > y) (side 1); at w = 0 one-sided.
pub fn hypergeometric_log_tail(side: f64, m: f64, y: f64, w: f64, s: f64, f: f64, n: f64) -> f64 {
    let Some(law) = Hypergeometric::new(w, s, f, n) else { return f64::NAN };
    if !((side == 0.0 || side == 1.0) && y == y.floor()) {
        return f64::NAN;
    }
    let above = side == 1.0;
    let u = y - law.low;
    let inside = u >= 0.0 && u < law.last();
    let out = if inside && !above && u == 0.0 {
        law.mass_in_odds(0.0)
    } else if inside && w == 0.0 {
        // P(Y <= y) lacks the term of w^(u+1) and beyond
        let mut out = Jet::constant(if above { f64::NEG_INFINITY } else { 0.0 });
        if above {
            (out.first[0], out.second[0]) = (f64::INFINITY, f64::NEG_INFINITY);
        } else if u == 1.0 {
            out.second[0] = -law.raw[1];
        }
        out
    } else {
        law.in_odds(tail(&law, above, u))
    };
    out.derivative(m, 0.0)
}

/// log of the binomial coefficient.
fn log_choose(n: f64, k: f64) -> f64 {
    let part = |k: f64| if k == 0.0 { 0.0 } else { k * log(n / k) - factorial_remainder(k) };
    part(k) + part(n - k) + factorial_remainder(n)
}

/// In v = count - lowest count, with the log odds as parameter.
struct Hypergeometric {
    w: f64,
    s: f64,
    f: f64,
    n: f64,
    low: f64,
    high: f64,
    /// A count (less the lowest) of nearly the largest mass, and log of the sum of f/f(mode).
    mode: f64,
    log_total: f64,
    /// The mean less the mode.
    offset: f64,
    /// mean, variance, third and fourth cumulant
    cumulants: [f64; 4],
    /// E[v/w] and E[v (v - 1)/w^2], finite at w = 0
    raw: [f64; 2],
    /// Cells about which deviances are taken, and what their odds ratio lacks of w, on the log scale.
    centre: [f64; 4],
    tilt: f64,
}

impl Hypergeometric {
    fn new(w: f64, s: f64, f: f64, n: f64) -> Option<Hypergeometric> {
        let counts = [s, f, n].iter().all(|&x| x >= 0.0 && x == x.floor() && x < 9e15);
        if !counts || n > s + f || !(0.0..f64::INFINITY).contains(&w) {
            return None;
        }
        let (low, high) = ((n - f).max(0.0), s.min(n));
        // the real u at which u (f - n + u) = w (s - u)(n - u)
        let b = (f - n) + w * (s + n);
        let root = (b * b + 4.0 * (1.0 - w) * w * s * n).max(0.0).sqrt();
        let mut x = if b >= 0.0 { 2.0 * w * s * n / (b + root) } else { (root - b) / (2.0 * (1.0 - w)) };
        if w == 0.0 {
            x = low;
        } else if !x.is_finite() {
            x = high;
        }
        let mut law = Hypergeometric {
            w,
            s,
            f,
            n,
            low,
            high,
            mode: x.clamp(low, high).floor() - low,
            log_total: 0.0,
            offset: 0.0,
            cumulants: [0.0; 4],
            raw: [0.0; 2],
            centre: [0.0; 4],
            tilt: 0.0,
        };
        let middle = x.clamp((low + 0.25).min(high), (high - 0.25).max(low));
        law.centre = law.cells(middle);
        let [a, b, c, d] = law.centre;
        law.tilt = log(w) - log(a / b) - log(d / c);
        law.sum_all();
        Some(law)
    }

    fn cells(&self, u: f64) -> [f64; 4] {
        [u, self.s - u, self.n - u, (self.f - self.n) + u]
    }

    /// The ratio of neighbours but for w.
    fn ratio(&self, v: f64) -> f64 {
        let [_, b, c, d] = self.cells(self.low + v);
        (b / (self.low + v + 1.0)) * (c / (d + 1.0))
    }

    fn sum_all(&mut self) {
        let last = self.last();
        let (mut total, mut moments, mut raw) = (0.0, [0.0; 4], [0.0; 2]);
        for upward in [true, false] {
            let (mut v, mut term) = (self.mode, 1.0);
            loop {
                if upward || v < self.mode {
                    total += term;
                    let d = v - self.mode;
                    let mut power = term;
                    for m in &mut moments {
                        power *= d;
                        *m += power;
                    }
                    let r = (v + 1.0) * self.ratio(v);
                    raw[0] += term * r;
                    raw[1] += term * r * (v + 2.0) * self.ratio(v + 1.0);
                }
                if v == (if upward { last } else { 0.0 }) {
                    break;
                }
                let ratio = if upward { self.w * self.ratio(v) } else { 1.0 / (self.w * self.ratio(v - 1.0)) };
                term *= ratio;
                if (ratio < 1.0 && term <= super::REST * total * (1.0 - ratio)) || term == 0.0 || term.is_nan() {
                    break;
                }
                v += if upward { 1.0 } else { -1.0 };
            }
        }
        self.log_total = log(total);
        let [m1, m2, m3, m4] = moments.map(|m| m / total);
        let variance = m2 - m1 * m1;
        self.offset = m1;
        self.cumulants = [
            self.mode + m1,
            variance,
            m3 - 3.0 * m1 * m2 + 2.0 * m1 * m1 * m1,
            m4 - 4.0 * m1 * m3 - 3.0 * m2 * m2 + 12.0 * m1 * m1 * m2 - 6.0 * m1 * m1 * m1 * m1,
        ];
        self.raw = raw.map(|r| r / total);
    }

    /// log f(v) but for a constant.
    fn relative(&self, v: f64) -> f64 {
        let cells = self.cells(self.low + v);
        let mut out = (v + self.low - self.centre[0]) * self.tilt;
        for (a, b) in cells.into_iter().zip(self.centre) {
            out -= deviance(a, b) + factorial_remainder(a);
        }
        out
    }

    fn log_mass(&self, v: f64) -> f64 {
        if v == self.mode { -self.log_total } else { self.relative(v) - self.relative(self.mode) - self.log_total }
    }

    /// Derivatives by the odds ratio from those by its logarithm.
    fn in_odds(&self, t: Jet) -> Jet {
        let w = self.w;
        let mut out = Jet::constant(t.value);
        // what does not vary, does not vary at w = 0 either
        if t.first[0] != 0.0 || t.second[0] != 0.0 {
            (out.first[0], out.second[0]) = (t.first[0] / w, (t.second[0] - t.first[0]) / (w * w));
        }
        out
    }

    /// log f(v) in the odds ratio; where few are expected above the lowest count, by the moments that hold at w = 0.
    fn mass_in_odds(&self, v: f64) -> Jet {
        let w = self.w;
        if w == 0.0 && v > 0.0 {
            return Jet {
                value: f64::NEG_INFINITY,
                first: [f64::INFINITY, 0.0],
                second: [f64::NEG_INFINITY, 0.0, 0.0],
            };
        }
        let value = self.log_mass(v);
        if v > 0.0 || self.cumulants[0] >= 1.0 {
            return self.in_odds(Jet {
                value,
                first: [(v - self.mode) - self.offset, 0.0],
                second: [-self.cumulants[1], 0.0, 0.0],
            });
        }
        let [a, b] = self.raw;
        Jet { value, first: [-a, 0.0], second: [a * a - b, 0.0, 0.0] }
    }
}

impl Mass for Hypergeometric {
    fn last(&self) -> f64 {
        self.high - self.low
    }

    fn mean(&self) -> f64 {
        self.cumulants[0]
    }

    fn at(&self, v: f64) -> Jet {
        Jet {
            value: self.log_mass(v),
            first: [(v - self.mode) - self.offset, 0.0],
            second: [-self.cumulants[1], 0.0, 0.0],
        }
    }

    fn rise(&self, v: f64) -> Jet {
        Jet { value: self.w * self.ratio(v), first: [1.0, 0.0], second: [0.0; 3] }
    }

    fn limit(&self, _: bool) -> f64 {
        0.0
    }
}
