//! Tests by a loop over the table of families, so that a new room is tested by being listed.

mod edges;
mod mass;
mod quadrature;
mod reference;
mod samples;

use super::{Amounts, FAMILIES, Family, Given, Support};
use crate::expr::{Graph, Scalars, Scope, Sign, Variable, build, parse_expression};

/// Amounts at which the families are looked at.
const AMOUNTS: Amounts = Amounts { exposure: 1.5, trials: 6.0, successes: 5.0, failures: 9.0 };

/// What stands before the row parameters among the inputs of a compiled text.
const NAMES: [&str; 8] = ["y", "lower", "upper", "at", "exposure", "trials", "successes", "failures"];

/// Row parameters at which each family is looked at; any point inside the ranges would do.
fn points(f: &Family) -> Vec<Vec<f64>> {
    let pick = |k: usize| -> Vec<f64> {
        f.parameters
            .iter()
            .enumerate()
            .map(|(i, p)| match (p.range.low, p.range.high) {
                (_, 1.0) => [0.3, 0.55, 0.4][k],
                // a shape that may be negative
                (low, _) if low < 0.0 && low.is_finite() && k == 2 => -0.25,
                _ => [0.8, 1.9, 1.2][k] + 0.25 * i as f64,
            })
            .collect()
    };
    vec![pick(0), pick(1), pick(2)]
}

/// The families that have something to estimate: all but a mass at one value, which is no density.
fn densities() -> impl Iterator<Item = &'static Family> {
    FAMILIES.iter().copied().filter(|f| f.parameters.iter().any(|p| p.given == Given::Estimated))
}

/// A text as a function of [`NAMES`] and the row parameters; with `order` 1 or 2 its derivatives by the row parameters follow (the
/// second ones by rows of the upper triangle). `signs`: whether the graph is told the signs that support and ranges imply,
/// as it is for plain parameters, or none, as for linear predictors. Both must give the same.
fn compile(f: &Family, text: &str, signs: bool, order: usize) -> Scalars {
    let mut g = Graph::new();
    let mut s = Scope::new("name");
    let y = match f.support {
        Support::Positive | Support::Unit | Support::CountFromOne => Sign::Positive,
        Support::Real | Support::Angle | Support::Lump(_) => Sign::Unknown,
        Support::From(name) => {
            let p = f.parameters.iter().find(|p| p.name == name).unwrap();
            Sign::of_low(p.range.low, p.range.low_closed)
        }
        _ => Sign::Nonnegative,
    };
    let mut sign = vec![y, y, y, y, Sign::Positive, Sign::Nonnegative, Sign::Nonnegative, Sign::Nonnegative];
    sign.extend(f.parameters.iter().map(|p| Sign::of_low(p.range.low, p.range.low_closed)));
    for (i, name) in NAMES.into_iter().chain(f.parameters.iter().map(|p| p.name)).enumerate() {
        if signs {
            g.set_parameter_sign(i as u32, sign[i]);
        }
        let id = g.parameter(i as u32);
        s.insert(name, id);
        if name == "at" && i < NAMES.len() {
            // the same by the name that a row parameter called `at` leaves it
            s.insert("q", id);
        }
    }
    let ast = parse_expression(text).unwrap_or_else(|e| panic!("{}: {e:?} in {text}", f.name));
    let id = build(&mut g, &ast, &s).unwrap_or_else(|e| panic!("{}: {e:?} in {text}", f.name));
    let by = |i: usize| Variable::Parameter((NAMES.len() + i) as u32);
    let n = f.parameters.len();
    let mut out = vec![id];
    if order > 0 {
        out.extend((0..n).map(|i| g.derivative(id, by(i))));
    }
    if order > 1 {
        for i in 0..n {
            let first = out[1 + i];
            out.extend((i..n).map(|j| g.derivative(first, by(j))));
        }
    }
    Scalars::compile(&g, &out)
}

/// Inputs of a compiled text: one value in the places of `y` and `at`, or two ends.
fn inputs(y: f64, ends: (f64, f64), theta: &[f64]) -> Vec<f64> {
    let a = AMOUNTS;
    let mut all = vec![y, ends.0, ends.1, y, a.exposure, a.trials, a.successes, a.failures];
    all.extend(theta);
    all
}

/// A compiled text at a value of the response.
fn at(s: &Scalars, y: f64, theta: &[f64]) -> Vec<f64> {
    s.evaluate(&inputs(y, (y, y), theta))
}

#[test]
fn the_table_is_sorted_and_every_family_is_listed_with_its_formula_as_computed() {
    assert!(FAMILIES.windows(2).all(|w| w[0].name < w[1].name));
    let all = super::listing::all();
    for f in FAMILIES {
        let l = all.iter().find(|l| l.name == f.name).unwrap();
        assert_eq!(l.formula, f.log_density);
        assert!(parse_expression(&l.formula).is_ok());
    }
}
