//! Tests of expected information by sums and integrals, and of the mass of custom densities.

use super::model::{Amount, Component, Model, Response, Setting, Values};
use super::{Information, LogLikelihood, Order, Sample, prepare, prepare_for};
use crate::data::{self, Column, Table};
use crate::math::{Matrix, Vector};

fn table(columns: &[(&str, Vec<f64>)]) -> Table {
    Table {
        file: "made.csv".into(),
        rows: columns[0].1.len(),
        columns: columns
            .iter()
            .map(|(n, x)| Column { name: (*n).into(), values: data::Values::Number(x.clone()) })
            .collect(),
        ..Table::default()
    }
}

fn started(name: &str, x: f64) -> Setting {
    Setting { name: name.into(), start: vec![(None, x)], ..Setting::default() }
}

fn custom(density: &str, parameters: &[(&str, f64)], support: Values) -> Model {
    Model {
        family: "custom".into(),
        response: Response::Column("y".into()),
        log_density: Some(density.into()),
        parameters: parameters.iter().map(|(n, x)| started(n, *x)).collect(),
        support: vec![("y".into(), support)],
        ..Model::default()
    }
}

fn expected(s: &Sample, at: &[f64]) -> Matrix {
    let phi = s.coordinates().phi(&Vector::from_vec(at.to_vec()));
    s.information(Information::Expected, &phi).unwrap()
}

#[test]
fn a_custom_density_has_the_information_of_the_family_it_is() {
    let y: Vec<f64> = (0..40).map(|i| f64::from(i % 7)).collect();
    let x: Vec<f64> = (0..40).map(|i| f64::from(i % 3) - 1.0).collect();
    let t = table(&[("y", y), ("x", x)]);
    let all = Values::Interval(f64::NEG_INFINITY, f64::INFINITY);
    let s = prepare(
        &custom("-log(b) - ((y - a - c * x) / b)^2 / 2 - log(2 * pi) / 2", &[("a", 3.0), ("b", 2.0), ("c", 0.5)], all),
        &t,
    )
    .unwrap();
    let i = expected(&s, &[3.0, 2.0, 0.5]);
    // n / sd^2, 2 n / sd^2 and sum x^2 / sd^2 of the normal; 27 of 40 rows have x^2 = 1, the x sum to -1; integrals keep 1e-9
    for (found, want) in
        [(i[(0, 0)], 10.0), (i[(1, 1)], 20.0), (i[(2, 2)], 27.0 / 4.0), (i[(0, 2)], -0.25), (i[(0, 1)], 0.0)]
    {
        assert!((found - want).abs() < 1e-8, "{found} not {want}");
    }
    let phi = Vector::from_vec(vec![3.0, 2.0, 0.5]);
    assert!(s.mass_error(&phi).unwrap() < 1e-9);
    let s = prepare(&custom("y * log(m) - m - lgamma(y + 1)", &[("m", 3.0)], Values::Whole(0.0, f64::INFINITY)), &t)
        .unwrap();
    assert!((expected(&s, &[2.5])[(0, 0)] - 40.0 / 2.5).abs() < 1e-9);
    assert!(s.mass_error(&Vector::from_element(1, 2.5)).unwrap() < 1e-12);
    // without its constant it is no density
    let s =
        prepare(&custom("y * log(m) - lgamma(y + 1)", &[("m", 3.0)], Values::Whole(0.0, f64::INFINITY)), &t).unwrap();
    assert!((s.mass_error(&Vector::from_element(1, 2.5)).unwrap() - (2.5f64.exp() - 1.0)).abs() < 1e-9);
}

fn minus_hessian_mean(m: &Model, ys: &[f64], weights: &[f64], at: &[f64]) -> (Matrix, Matrix) {
    let mut t = table(&[("y", ys.to_vec())]);
    t.weights = Some(weights.to_vec());
    let s = prepare_for(m, &t, Some(Information::Expected)).unwrap();
    let phi = s.coordinates().phi(&Vector::from_vec(at.to_vec()));
    (s.information(Information::Expected, &phi).unwrap(), -s.evaluate(&phi, Order::Hessian).hessian)
}

#[test]
fn computed_information_is_the_mean_of_the_observed_one() {
    // a normal of which only what is above 0 is recorded: Simpson's rule with steps of 0.005 is good to 1e-10
    let m = Model {
        family: "normal".into(),
        response: Response::Column("y".into()),
        above: Some(Amount::Number(0.0)),
        ..Model::default()
    };
    let normal =
        |y: f64, m: f64, s: f64| (-0.5 * ((y - m) / s).powi(2)).exp() / (s * (2.0 * std::f64::consts::PI).sqrt());
    let ys: Vec<f64> = (0..4001).map(|i| (0.005 * f64::from(i)).max(1e-12)).collect();
    let simpson = |i: usize| {
        if i == 0 || i == 4000 {
            1.0
        } else if i % 2 == 1 {
            4.0
        } else {
            2.0
        }
    };
    let mut p: Vec<f64> = ys.iter().enumerate().map(|(i, &y)| simpson(i) * normal(y, 1.0, 1.5)).collect();
    let total: f64 = p.iter().sum();
    p.iter_mut().for_each(|p| *p /= total);
    let (e, o) = minus_hessian_mean(&m, &ys, &p, &[1.0, 1.5]);
    for (x, y) in e.iter().zip(o.iter()) {
        assert!((x - y).abs() < 1e-8 * o.amax(), "{e} {o}");
    }
    // a mixture of two normals: by a fine trapezium, exact for such smooth functions far into the tails
    let component = |name: &str| Component { name: name.into(), family: "normal".into(), ..Component::default() };
    let m = Model {
        family: "mixture".into(),
        response: Response::Column("y".into()),
        components: vec![component("a"), component("b")],
        ..Model::default()
    };
    let ys: Vec<f64> = (0..4001).map(|i| -20.0 + 0.01 * f64::from(i)).collect();
    let p: Vec<f64> = ys.iter().map(|&y| 0.01 * (0.3 * normal(y, -1.0, 1.0) + 0.7 * normal(y, 2.0, 1.5))).collect();
    let (e, o) = minus_hessian_mean(&m, &ys, &p, &[0.3, 0.7, -1.0, 1.0, 2.0, 1.5]);
    // in the shares too: the second derivative by shares that sum to one is minus the product of the scores
    for (x, y) in e.iter().zip(o.iter()) {
        assert!((x - y).abs() < 1e-7 * o.amax(), "{e} {o}");
    }
}
