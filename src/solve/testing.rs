//! For the solver's tests: problems written as one Rust expression, differentiated by second-order jets.

use std::ops::{Add, Div, Mul, Neg, Sub};

use super::equations::Equations;
use super::{Fit, Search, starts};
use crate::likelihood::{FromFunctions, Parameter};
use crate::math::{Matrix, Range, Vector};
use crate::restriction::Sides;

/// A value with its gradient and Hessian.
#[derive(Debug, Clone)]
pub(super) struct Jet {
    pub v: f64,
    pub g: Vector,
    pub h: Matrix,
}

impl Jet {
    fn chain(&self, v: f64, first: f64, second: f64) -> Jet {
        let mut h = &self.h * first;
        h.ger(second, &self.g, &self.g, 1.0);
        Jet { v, g: &self.g * first, h }
    }

    pub fn constant(&self, v: f64) -> Jet {
        Jet { v, g: &self.g * 0.0, h: &self.h * 0.0 }
    }

    pub fn ln(&self) -> Jet {
        self.chain(self.v.ln(), 1.0 / self.v, -1.0 / (self.v * self.v))
    }

    pub fn exp(&self) -> Jet {
        let e = self.v.exp();
        self.chain(e, e, e)
    }

    pub fn powi(&self, k: i32) -> Jet {
        let f = f64::from(k);
        let second = if k == 1 { 0.0 } else { f * (f - 1.0) * self.v.powi(k - 2) };
        self.chain(self.v.powi(k), f * self.v.powi(k - 1), second)
    }

    pub fn sqrt(&self) -> Jet {
        let r = self.v.sqrt();
        self.chain(r, 0.5 / r, -0.25 / (r * self.v))
    }

    pub fn sin(&self) -> Jet {
        self.chain(self.v.sin(), self.v.cos(), -self.v.sin())
    }

    pub fn sq(&self) -> Jet {
        self.powi(2)
    }
}

macro_rules! binary {
    ($trait:ident, $name:ident, $a:ident, $b:ident, $body:expr) => {
        impl $trait for Jet {
            type Output = Jet;
            fn $name(self, other: Jet) -> Jet {
                let ($a, $b) = (&self, &other);
                $body
            }
        }
        impl $trait<&Jet> for &Jet {
            type Output = Jet;
            fn $name(self, other: &Jet) -> Jet {
                let ($a, $b) = (self, other);
                $body
            }
        }
        impl $trait<&Jet> for Jet {
            type Output = Jet;
            fn $name(self, other: &Jet) -> Jet {
                let ($a, $b) = (&self, other);
                $body
            }
        }
        impl $trait<Jet> for &Jet {
            type Output = Jet;
            fn $name(self, other: Jet) -> Jet {
                let ($a, $b) = (self, &other);
                $body
            }
        }
        impl $trait<f64> for Jet {
            type Output = Jet;
            fn $name(self, other: f64) -> Jet {
                let ($a, $b) = (&self, &self.constant(other));
                $body
            }
        }
        impl $trait<f64> for &Jet {
            type Output = Jet;
            fn $name(self, other: f64) -> Jet {
                let ($a, $b) = (self, &self.constant(other));
                $body
            }
        }
        impl $trait<Jet> for f64 {
            type Output = Jet;
            fn $name(self, other: Jet) -> Jet {
                let ($a, $b) = (&other.constant(self), &other);
                $body
            }
        }
        impl $trait<&Jet> for f64 {
            type Output = Jet;
            fn $name(self, other: &Jet) -> Jet {
                let ($a, $b) = (&other.constant(self), other);
                $body
            }
        }
    };
}

binary!(Add, add, a, b, Jet { v: a.v + b.v, g: &a.g + &b.g, h: &a.h + &b.h });
binary!(Sub, sub, a, b, Jet { v: a.v - b.v, g: &a.g - &b.g, h: &a.h - &b.h });
binary!(Mul, mul, a, b, {
    let mut h = &a.h * b.v + &b.h * a.v;
    h.ger(1.0, &a.g, &b.g, 1.0);
    h.ger(1.0, &b.g, &a.g, 1.0);
    Jet { v: a.v * b.v, g: &a.g * b.v + &b.g * a.v, h }
});
binary!(Div, div, a, b, a * b.powi(-1));

impl Neg for Jet {
    type Output = Jet;
    fn neg(self) -> Jet {
        self * -1.0
    }
}

/// The parameters as jets.
pub(super) fn jets(x: &Vector) -> Vec<Jet> {
    let n = x.len();
    (0..n)
        .map(|j| {
            let mut g = Vector::zeros(n);
            g[j] = 1.0;
            Jet { v: x[j], g, h: Matrix::zeros(n, n) }
        })
        .collect()
}

type Function = std::sync::Arc<dyn Fn(&[Jet]) -> Jet + Send + Sync>;

/// A problem under construction.
#[derive(Clone)]
pub(super) struct Case {
    parameters: Vec<Parameter>,
    starts: Vec<Vector>,
    value: Function,
    rows: Rows,
    concave: bool,
}

/// Restrictions left = right as functions; a test double of a system.
#[derive(Clone, Default)]
pub(super) struct Rows {
    names: Vec<String>,
    sides: Vec<(Function, f64)>,
    linear: bool,
}

impl Equations for Rows {
    fn len(&self) -> usize {
        self.names.len()
    }

    fn name(&self, i: usize) -> &str {
        &self.names[i]
    }

    fn linear(&self) -> bool {
        self.linear
    }

    fn sides(&self, theta: &Vector) -> Vec<Sides> {
        let x = jets(theta);
        self.sides.iter().map(|(f, right)| Sides { left: f(&x).v, right: *right }).collect()
    }

    fn jacobian(&self, theta: &Vector) -> Matrix {
        let x = jets(theta);
        let mut j = Matrix::zeros(self.len(), theta.len());
        for (i, (f, _)) in self.sides.iter().enumerate() {
            j.row_mut(i).copy_from(&f(&x).g.transpose());
        }
        j
    }

    fn curvature(&self, theta: &Vector, multipliers: &Vector) -> Matrix {
        let x = jets(theta);
        let zero = Matrix::zeros(theta.len(), theta.len());
        self.sides.iter().zip(multipliers.iter()).fold(zero, |sum, ((f, _), m)| sum + f(&x).h * *m)
    }
}

impl Case {
    /// l, to be maximised, from a start.
    pub fn new(start: &[f64], value: impl Fn(&[Jet]) -> Jet + Send + Sync + 'static) -> Case {
        let name = |j: usize| Parameter { name: format!("x{}", j + 1), range: Range::ALL, meaning: String::new() };
        Case {
            parameters: (0..start.len()).map(name).collect(),
            starts: vec![Vector::from_column_slice(start)],
            value: std::sync::Arc::new(value),
            rows: Rows { linear: true, ..Rows::default() },
            concave: false,
        }
    }

    pub fn range(mut self, j: usize, range: Range) -> Case {
        self.parameters[j].range = range;
        self
    }

    pub fn concave(mut self) -> Case {
        self.concave = true;
        self
    }

    /// A linear restriction.
    pub fn linear(mut self, name: &str, right: f64, left: impl Fn(&[Jet]) -> Jet + Send + Sync + 'static) -> Case {
        self.rows.names.push(name.into());
        self.rows.sides.push((std::sync::Arc::new(left), right));
        self
    }

    /// A restriction of any form.
    pub fn equal(self, name: &str, right: f64, left: impl Fn(&[Jet]) -> Jet + Send + Sync + 'static) -> Case {
        let mut case = self.linear(name, right, left);
        case.rows.linear = false;
        case
    }

    pub fn likelihood(&self) -> FromFunctions {
        let (a, b, c) = (self.value.clone(), self.value.clone(), self.value.clone());
        let l = FromFunctions::new(
            self.parameters.clone(),
            self.starts.clone(),
            move |x| a(&jets(x)).v,
            move |x| b(&jets(x)).g,
            move |x| c(&jets(x)).h,
        );
        if self.concave { l.concave() } else { l }
    }

    /// The fit from the starts given only, with a second opinion.
    pub fn fit(&self) -> Fit {
        self.search(&Search { starts: Some(self.starts.len()), second_opinion: true, ..Search::default() })
    }

    pub fn search(&self, search: &Search) -> Fit {
        starts::maximise(&self.likelihood(), &self.rows, search, &[]).unwrap()
    }
}

/// Asserts closeness relative to 1 + |wanted|.
#[track_caller]
pub(super) fn close(got: f64, wanted: f64, tolerance: f64) {
    assert!((got - wanted).abs() <= tolerance * (1.0 + wanted.abs()), "got {got}, wanted {wanted}");
}
