//! Tests of drawn responses: they have the moments of what they were drawn from, row by row the same whatever the threads.

use super::model::{Amount, Component, Form, Model, Response, Setting, Terms, Values};
use super::simulate::{Column as Drawn, simulate};
use super::{LogLikelihood, prepare};
use crate::data::{self, Column, Table};
use crate::math::Vector;

const ROWS: usize = 20_000;

fn numbers(name: &str, f: impl Fn(usize) -> f64) -> Column {
    Column { name: name.into(), values: data::Values::Number((0..ROWS).map(f).collect()) }
}

fn labels(name: &str, levels: &[&str]) -> Column {
    let codes = (0..ROWS).map(|i| (i % levels.len()) as u32).collect();
    let levels = levels.iter().map(|l| (*l).to_string()).collect();
    Column { name: name.into(), values: data::Values::Category { codes, levels } }
}

fn table(columns: Vec<Column>) -> Table {
    Table { file: "made.csv".into(), rows: ROWS, columns, ..Table::default() }
}

fn draw(model: &Model, table: &Table, theta: &[f64]) -> Vec<Drawn> {
    let sample = prepare(model, table).unwrap();
    assert_eq!(sample.parameters().len(), theta.len(), "{:?}", sample.parameters());
    let theta = Vector::from_vec(theta.to_vec());
    let run = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| simulate(model, table, &sample, &theta, 3).unwrap())
    };
    let out = run(1);
    assert_eq!(out, run(3));
    out
}

fn mean(column: &Drawn, f: impl Fn(usize, f64) -> f64) -> f64 {
    match column {
        Drawn::Numbers(_, x) => x.iter().enumerate().map(|(i, &v)| f(i, v)).sum::<f64>() / x.len() as f64,
        Drawn::Labels(..) => panic!("labels"),
    }
}

fn share(column: &Drawn, label: &str) -> f64 {
    match column {
        Drawn::Labels(_, x) => x.iter().filter(|l| *l == label).count() as f64 / x.len() as f64,
        Drawn::Numbers(..) => panic!("numbers"),
    }
}

/// Five standard errors of a mean of 20,000 with this standard deviation.
fn near(found: f64, wanted: f64, sd: f64) {
    assert!((found - wanted).abs() < 5.0 * sd / (ROWS as f64).sqrt(), "{found} not {wanted}");
}

fn model(family: &str, response: &[&str]) -> Model {
    let list: Vec<String> = response.iter().map(|r| (*r).to_string()).collect();
    let response = if list.len() == 1 { Response::Column(list[0].clone()) } else { Response::Several(list) };
    Model { family: family.into(), response, ..Model::default() }
}

fn with_terms(name: &str, column: &str, intercept: bool) -> Setting {
    let terms = Terms { terms: vec![vec![column.into()]], link: None, intercept, full: false, offset: None };
    Setting { name: name.into(), form: Form::Terms(terms), ..Setting::default() }
}

#[test]
fn families_and_mixtures() {
    let t = table(vec![numbers("y", |_| 1.0), numbers("x", |i| (i % 2) as f64)]);
    let mut m = model("poisson", &["y"]);
    m.parameters = vec![with_terms("rate", "x", true)];
    let y = &draw(&m, &t, &[0.5, 1.0])[0];
    // E y = (exp(0.5) + exp(1.5)) / 2, and the slope shows in the products with x
    let (a, b) = (0.5f64.exp(), 1.5f64.exp());
    near(mean(y, |_, v| v), (a + b) / 2.0, 3.0);
    near(mean(y, |i, v| v * (i % 2) as f64), b / 2.0, 3.0);
    let mut m = model("normal", &["y"]);
    m.above = Some(Amount::Number(0.0));
    let y = &draw(&m, &t, &[0.0, 1.0])[0];
    // half normal
    near(mean(y, |_, v| v), (2.0 / std::f64::consts::PI).sqrt(), 0.61);
    let component = |n: &str, f: &str| Component { name: n.into(), family: f.into(), ..Component::default() };
    let mut m = model("mixture", &["y"]);
    m.components = vec![component("a", "normal"), component("b", "exponential")];
    let y = &draw(&m, &t, &[0.25, 0.75, -2.0, 0.5, 2.0])[0];
    near(mean(y, |_, v| v), -0.125, 1.3);
    near(mean(y, |_, v| f64::from(u8::from(v > 0.0))), 0.75, 0.44);
}

#[test]
fn labels_contests_and_several_columns() {
    let grade = labels("grade", &["low", "mid", "high"]);
    let t =
        table(vec![grade, numbers("x", |i| (i % 2) as f64), labels("won", &["p", "q"]), labels("lost", &["q", "p"])]);
    let d = &draw(&model("categorical", &["grade"]), &t, &[0.2, 0.5, 0.3])[0];
    near(share(d, "mid"), 0.5, 0.5);
    let mut m = model("ordered_probit", &["grade"]);
    m.parameters = vec![with_terms("location", "x", true)];
    let d = &draw(&m, &t, &[-0.5, 0.7, 1.0])[0];
    // parameters come plain ones first: cut.low, cut.mid, location.x
    let phi = crate::math::special::normal_cdf;
    near(share(d, "low"), 0.5 * (phi(-0.5) + phi(-1.5)), 0.5);
    near(share(d, "high"), 0.5 * (phi(-0.7) + phi(0.3)), 0.5);
    let d = &draw(&model("paired_comparison", &["won", "lost"]), &t, &[0.4, -0.4])[0];
    near(share(d, "p"), crate::math::special::logistic(0.8), 0.5);
    let t = table(vec![numbers("a", |_| 0.25), numbers("b", |_| 0.75)]);
    let d = draw(&model("dirichlet", &["a", "b"]), &t, &[2.0, 3.0]);
    near(mean(&d[0], |_, v| v), 0.4, 0.2);
    let t = table(vec![numbers("a", |i| (i % 7) as f64), numbers("b", |i| (i % 5) as f64)]);
    let d = draw(&model("multivariate_normal", &["a", "b"]), &t, &[1.0, 2.0, 1.0, 2.0, 0.6]);
    let Drawn::Numbers(_, b) = &d[1] else { panic!("numbers") };
    near(mean(&d[0], |i, v| (v - 1.0) * (b[i] - 2.0)), 1.2, 2.4);
}

#[test]
fn custom_densities() {
    let t = table(vec![numbers("y", |_| 1.0)]);
    let start = |n: &str, x: f64| Setting { name: n.into(), start: vec![(None, x)], ..Setting::default() };
    let custom = |text: &str, values: Values| Model {
        log_density: Some(text.into()),
        parameters: vec![start("a", 1.0)],
        support: vec![("y".into(), values)],
        ..model("custom", &["y"])
    };
    let m = custom("log(a) - a * y", Values::Interval(0.0, f64::INFINITY));
    let d = &draw(&m, &t, &[0.01])[0];
    near(mean(d, |_, v| v), 100.0, 100.0);
    near(mean(d, |_, v| v * v), 20_000.0, 45_000.0);
    let m = custom("y * log(a) - a - lgamma(y + 1)", Values::Whole(0.0, f64::INFINITY));
    near(mean(&draw(&m, &t, &[7.0])[0], |_, v| v), 7.0, 2.65);
    let m = custom("if(y = 1, log(a), log1p(-a))", Values::List(vec![0.0, 1.0]));
    near(mean(&draw(&m, &t, &[0.3])[0], |_, v| v), 0.3, 0.46);
}
