//! The whole of inference on likelihoods in closed form.

mod edges;
mod kinks;
mod normal;
mod tables;

use super::{Options, Outcome, Tests, run};
use crate::likelihood::{FromFunctions, Information, LogLikelihood, Parameter};
use crate::math::{Matrix, Range, Vector};
use crate::restriction::{Draft, Quantities, Role, System};

fn parameter(name: &str, range: Range) -> Parameter {
    Parameter { name: name.to_string(), range, meaning: String::new() }
}

/// A table of counts: l = sum n log p, shares in [0, 1], 0 log 0 = 0.
fn table(names: &[&str], counts: &[f64]) -> FromFunctions {
    let (n, total) = (counts.to_vec(), counts.iter().sum::<f64>());
    let start = Vector::from_vec(vec![1.0 / n.len() as f64; n.len()]);
    let count = |f: fn(f64, f64) -> f64| {
        let n = n.clone();
        move |p: &Vector| {
            Vector::from_iterator(p.len(), n.iter().zip(p.iter()).map(|(&n, &p)| if n == 0.0 { 0.0 } else { f(n, p) }))
        }
    };
    let (value, slope, bend, square) =
        (count(|n, p| n * p.ln()), count(|n, p| n / p), count(|n, p| -n / (p * p)), count(|n, p| n / (p * p)));
    let parameters = names.iter().map(|name| parameter(name, Range::UNIT)).collect();
    FromFunctions::new(
        parameters,
        vec![start],
        move |p| value(p).sum(),
        slope,
        move |p| Matrix::from_diagonal(&bend(p)),
    )
    .concave()
    .weight_total(total)
    .information(move |kind, p| match kind {
        Information::Expected => Some(Matrix::from_diagonal(&p.map(|p| total / p))),
        Information::Outer => Some(Matrix::from_diagonal(&square(p))),
        _ => None,
    })
}

/// A system of maintained and tested equations, named `m1`, ..., `t1`, ...
fn system(likelihood: &dyn LogLikelihood, maintained: &[&str], tested: &[&str]) -> System {
    let names: Vec<String> = likelihood.parameters().iter().map(|p| p.name.clone()).collect();
    let draft = |role: Role, mark: &str, (i, text): (usize, &&str)| Draft {
        name: Some(format!("{mark}{}", i + 1)),
        role,
        text: (*text).to_string(),
        place: "test".to_string(),
    };
    let mut drafts: Vec<Draft> = maintained.iter().enumerate().map(|x| draft(Role::Maintained, "m", x)).collect();
    drafts.extend(tested.iter().enumerate().map(|x| draft(Role::Tested, "t", x)));
    System::compile(&drafts, &names, &[]).unwrap()
}

fn infer(likelihood: &dyn LogLikelihood, system: &System, kind: Option<Information>) -> Outcome {
    infer_with(likelihood, system, &Options { information: kind, ..Options::default() })
}

fn infer_with(likelihood: &dyn LogLikelihood, system: &System, options: &Options) -> Outcome {
    run(likelihood, system, &Quantities::default(), options).unwrap()
}

fn codes(outcome: &Outcome) -> Vec<&'static str> {
    outcome.warnings.iter().map(|w| w.code).collect()
}

fn se(outcome: &Outcome) -> Vec<f64> {
    outcome.restricted.estimates.iter().map(|e| e.se.unwrap()).collect()
}

/// Relative to 1e-9 of the larger, floor 1: what is compared comes from two short routes to one closed form, and the
/// certificate's stationarity (1e-7, in practice 1e-11) moves statistics in second order only.
#[track_caller]
fn close(a: f64, b: f64) {
    assert!((a - b).abs() <= 1e-9 * a.abs().max(b.abs()).max(1.0), "{a} is not {b}");
}
