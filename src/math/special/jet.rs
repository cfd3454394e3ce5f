//! A value with its first and second derivatives in two shapes, carried through arithmetic.

use super::interval::LEGENDRE;
use libm::{exp, log};
use std::ops::{Add, Mul, Neg, Sub};

/// A value and its derivatives in the shapes a and b.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Jet {
    pub v: f64,
    pub a: f64,
    pub b: f64,
    pub aa: f64,
    pub ab: f64,
    pub bb: f64,
}

impl Jet {
    pub const fn constant(v: f64) -> Jet {
        Jet { v, a: 0.0, b: 0.0, aa: 0.0, ab: 0.0, bb: 0.0 }
    }

    /// A function of the first shape alone.
    pub const fn in_a(v: f64, a: f64, aa: f64) -> Jet {
        Jet { v, a, aa, b: 0.0, ab: 0.0, bb: 0.0 }
    }

    /// A function of the second shape alone.
    pub const fn in_b(v: f64, b: f64, bb: f64) -> Jet {
        Jet { v, a: 0.0, aa: 0.0, b, ab: 0.0, bb }
    }

    /// The logarithm of the first shape.
    pub fn log_of_a(a: f64) -> Jet {
        Jet::in_a(log(a), 1.0 / a, -1.0 / (a * a))
    }

    /// The same with the shapes exchanged.
    pub fn swapped(self) -> Jet {
        Jet { v: self.v, a: self.b, b: self.a, aa: self.bb, ab: self.ab, bb: self.aa }
    }

    pub fn scale(self, k: f64) -> Jet {
        self.through(k * self.v, k, 0.0)
    }

    /// f of this, from f, f' and f'' at the value.
    fn through(self, f: f64, first: f64, second: f64) -> Jet {
        Jet {
            v: f,
            a: first * self.a,
            b: first * self.b,
            aa: first * self.aa + second * (self.a * self.a),
            ab: first * self.ab + second * (self.a * self.b),
            bb: first * self.bb + second * (self.b * self.b),
        }
    }

    pub fn reciprocal(self) -> Jet {
        let r = 1.0 / self.v;
        self.through(r, -r * r, 2.0 * r * r * r)
    }

    /// log, without the squares of a value that may be tiny.
    pub fn log(self) -> Jet {
        let r = 1.0 / self.v;
        let (a, b) = (self.a * r, self.b * r);
        Jet { v: log(self.v), a, b, aa: self.aa * r - a * a, ab: self.ab * r - a * b, bb: self.bb * r - b * b }
    }

    pub fn exp(self) -> Jet {
        let e = exp(self.v);
        self.through(e, e, e)
    }

    /// log(1 - this), accurate near zero.
    pub fn log_complement(self) -> Jet {
        let value = libm::log1p(-self.v);
        Jet { v: value, ..(Jet::constant(1.0) - self).log() }
    }

    /// (exp(this) - 1) / this for a value of moderate size: the mean of exp(this u) over u in [0, 1].
    pub fn exp_quotient(self) -> Jet {
        let mut mean = [0.0; 3];
        for (u, w) in unit_nodes() {
            let e = w * exp(self.v * u);
            mean = [mean[0] + e, mean[1] + e * u, mean[2] + e * u * u];
        }
        self.through(mean[0], mean[1], mean[2])
    }

    /// The derivative of order i in a and j in b.
    pub fn order(self, i: usize, j: usize) -> f64 {
        match (i, j) {
            (0, 0) => self.v,
            (1, 0) => self.a,
            (0, 1) => self.b,
            (2, 0) => self.aa,
            (1, 1) => self.ab,
            (0, 2) => self.bb,
            _ => f64::NAN,
        }
    }

    /// Whether a factor so close to one changes nothing any more.
    pub fn is_one(self) -> bool {
        let rest = [self.v - 1.0, self.a, self.b, self.aa, self.ab, self.bb];
        rest.iter().all(|r| r.abs() < 1e-15)
    }
}

/// Nodes and weights of Gauss-Legendre quadrature with 12 points on [0, 1].
pub(super) fn unit_nodes() -> impl Iterator<Item = (f64, f64)> {
    LEGENDRE.into_iter().flat_map(|(x, w)| [(0.5 * (1.0 - x), 0.5 * w), (0.5 * (1.0 + x), 0.5 * w)])
}

impl Add for Jet {
    type Output = Jet;
    fn add(self, o: Jet) -> Jet {
        Jet {
            v: self.v + o.v,
            a: self.a + o.a,
            b: self.b + o.b,
            aa: self.aa + o.aa,
            ab: self.ab + o.ab,
            bb: self.bb + o.bb,
        }
    }
}

impl Neg for Jet {
    type Output = Jet;
    fn neg(self) -> Jet {
        self.scale(-1.0)
    }
}

impl Sub for Jet {
    type Output = Jet;
    fn sub(self, o: Jet) -> Jet {
        self + -o
    }
}

impl Mul for Jet {
    type Output = Jet;
    fn mul(self, o: Jet) -> Jet {
        Jet {
            v: self.v * o.v,
            a: self.a * o.v + self.v * o.a,
            b: self.b * o.v + self.v * o.b,
            aa: self.aa * o.v + 2.0 * self.a * o.a + self.v * o.aa,
            ab: self.ab * o.v + self.a * o.b + self.b * o.a + self.v * o.ab,
            bb: self.bb * o.v + 2.0 * self.b * o.b + self.v * o.bb,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::Jet;

    #[test]
    fn arithmetic_undoes_itself() {
        let x = Jet { v: -0.7, a: 0.3, b: -1.1, aa: 0.25, ab: -0.6, bb: 2.0 };
        let close = |p: Jet, q: Jet| {
            let d = p - q;
            // a handful of roundings of numbers about one
            assert!([d.v, d.a, d.b, d.aa, d.ab, d.bb].iter().all(|r| r.abs() < 1e-14), "{p:?} {q:?}");
        };
        close(x * x.reciprocal(), Jet::constant(1.0));
        close(x.exp().log(), x);
        close(x.exp_quotient() * x, x.exp() - Jet::constant(1.0));
        close(x.exp().log_complement().exp() + x.exp(), Jet::constant(1.0));
        close(x.swapped().swapped(), x);
    }
}
