//! Tests of prepared samples: derivatives against differences, information against closed forms, threads.

use super::model::{Amount, Component, Event, Form, Model, Response, Setting, Terms};
use super::{Information, LogLikelihood, Order, Sample, prepare};
use crate::data::{Column, Table, Values};
use crate::math::{Range, Vector};

fn table(rows: usize) -> Table {
    let number = |name: &str, f: &dyn Fn(usize) -> f64| Column {
        name: name.into(),
        values: Values::Number((0..rows).map(f).collect()),
    };
    let wave = |i: usize, k: usize| ((i * k) % 17) as f64 / 8.0 - 1.0;
    Table {
        file: "made.csv".into(),
        rows,
        columns: vec![
            number("x", &|i| wave(i, 5)),
            number("z", &|i| wave(i, 7)),
            number("y", &|i| wave(i, 3) + 0.5 * wave(i, 5)),
            number("n", &|i| (i % 5) as f64),
            number("area", &|i| 1.0 + (i % 3) as f64),
            number("hit", &|i| ((i * 7) % 3 == 0) as u8 as f64),
            number("t", &|i| 0.1 + ((i * 11) % 13) as f64 / 4.0),
            Column {
                name: "kiln".into(),
                values: Values::Category {
                    codes: (0..rows).map(|i| (i % 3) as u32).collect(),
                    levels: vec!["north".into(), "middle".into(), "south".into()],
                },
            },
        ],
        ..Table::default()
    }
}

fn terms(list: &[&[&str]]) -> Terms {
    Terms {
        terms: list.iter().map(|t| t.iter().map(|s| s.to_string()).collect()).collect(),
        link: None,
        intercept: true,
        full: false,
        offset: None,
    }
}

fn with_terms(name: &str, t: Terms) -> Setting {
    Setting { name: name.into(), form: Form::Terms(t), ..Setting::default() }
}

fn model(family: &str, response: &str) -> Model {
    Model { family: family.into(), response: Response::Column(response.into()), ..Model::default() }
}

fn started(name: &str, x: f64) -> Setting {
    Setting { name: name.into(), start: vec![(None, x)], ..Setting::default() }
}

fn models() -> Vec<(&'static str, Model)> {
    let mut out = vec![("normal", model("normal", "y"))];
    let mut m = model("normal", "y");
    m.parameters =
        vec![with_terms("mean", terms(&[&["x"], &["kiln"], &["kiln", "z"]])), with_terms("sd", terms(&[&["z"]]))];
    out.push(("normal with terms on both", m));
    let mut m = model("poisson", "n");
    m.exposure = Some("area".into());
    m.parameters = vec![with_terms("rate", terms(&[&["x"], &["kiln"]]))];
    out.push(("poisson with terms", m));
    let mut m = model("poisson", "n");
    m.per = Some("kiln".into());
    out.push(("poisson per kiln", m));
    for link in ["logit", "probit", "complementary_log_log"] {
        let mut m = model("binomial", "hit");
        let mut t = terms(&[&["x"], &["z"]]);
        t.link = Some(link.into());
        m.parameters = vec![with_terms("probability", t)];
        out.push((link, m));
    }
    let mut m = model("binomial", "n");
    m.trials = Some(Amount::Number(5.0));
    out.push(("binomial", m));
    let mut m = model("exponential", "t");
    m.event = Some(Event { column: "hit".into(), seen: None });
    m.parameters = vec![with_terms("rate", terms(&[&["x"]]))];
    out.push(("exponential, censored", m));
    let mut m = model("normal", "y");
    m.response = Response::Ends { lower: "y".into(), upper: "t".into() };
    out.push(("normal in intervals", m));
    out.push(("categorical", model("categorical", "kiln")));
    let mut m = model("mixture", "y");
    m.components =
        ["a", "b"].map(|n| Component { name: n.into(), family: "normal".into(), ..Component::default() }).to_vec();
    m.components[0].parameters.push(Setting { name: "sd".into(), known: vec![(None, 0.7)], ..Setting::default() });
    out.push(("mixture", m));
    let mut m = model("normal", "y");
    m.parameters = vec![
        Setting {
            name: "mean".into(),
            form: Form::Curve("a * (1 - exp(-b * t)) + c * x".into()),
            ..Setting::default()
        },
        started("a", 1.0),
        started("b", 0.5),
        Setting { range: vec![(None, Range::ALL)], ..started("c", 0.1) },
    ];
    out.push(("curve", m));
    let mut m = model("custom", "y");
    m.log_density = Some("log(k) - k * t + c * x".into());
    m.lets = vec![("k".into(), "exp(a)".into())];
    m.parameters = vec![started("a", 0.2), started("c", 0.1)];
    out.push(("custom", m));
    out
}

fn binned(t: &mut Table) {
    // upper ends above lower ends, one of them open
    let y = match &t.columns[2].values {
        Values::Number(y) => y.clone(),
        Values::Category { .. } => Vec::new(),
    };
    if let Values::Number(u) = &mut t.columns[6].values {
        u.iter_mut().zip(&y).for_each(|(u, y)| *u += y);
        u[0] = f64::INFINITY;
    }
}

fn sample(name: &str, m: &Model, weights: bool, rows: usize) -> Sample {
    let mut t = table(rows);
    if name == "normal in intervals" {
        binned(&mut t);
    }
    if weights {
        t.weights = Some((0..rows).map(|i| 0.5 + (i % 4) as f64).collect());
    }
    prepare(m, &t).unwrap_or_else(|e| panic!("{name}: {e:?}"))
}

#[test]
fn derivatives_agree_with_differences() {
    for (name, m) in models() {
        for weights in [false, true] {
            let s = sample(name, &m, weights, 700);
            let n = s.parameters().len();
            let phi = s.coordinates().phi(s.start());
            let at = s.evaluate(&phi, Order::Hessian);
            assert!(at.value.is_finite(), "{name} starts at {}: {}", s.start(), at.value);
            assert!((at.value - s.evaluate(&phi, Order::Value).value).abs() < 1e-10 * at.value.abs(), "{name}");
            for i in 0..n {
                let h = 1e-5 * phi[i].abs().max(0.1);
                let mut up = phi.clone();
                up[i] += h;
                let mut down = phi.clone();
                down[i] -= h;
                let (u, d) = (s.evaluate(&up, Order::Gradient), s.evaluate(&down, Order::Gradient));
                let slope = (u.value - d.value) / (2.0 * h);
                let scale = at.value.abs() + at.gradient.amax() + 1.0;
                // central differences with this step keep nine digits of the values they are taken from
                assert!((slope - at.gradient[i]).abs() < 1e-7 * scale, "{name} {i}: {slope} {}", at.gradient[i]);
                for j in 0..n {
                    let bend = (u.gradient[j] - d.gradient[j]) / (2.0 * h);
                    let scale = at.hessian.amax() + 1.0;
                    assert!(
                        (bend - at.hessian[(i, j)]).abs() < 1e-6 * scale,
                        "{name} {i} {j}: {bend} {}",
                        at.hessian[(i, j)]
                    );
                }
            }
        }
    }
}

#[test]
fn expected_information_has_its_closed_form() {
    let s = sample("normal", &model("normal", "y"), false, 700);
    let theta = Vector::from_vec(vec![0.3, 0.8]);
    let i = s.information(Information::Expected, &theta).unwrap();
    // n / sd^2 and 2 n / sd^2
    approx::assert_relative_eq!(i[(0, 0)], 700.0 / 0.64, max_relative = 1e-13);
    approx::assert_relative_eq!(i[(1, 1)], 1400.0 / 0.64, max_relative = 1e-13);
    assert_eq!(i[(0, 1)], 0.0);
    let (name, m) = &models()[4];
    let s = sample(name, m, true, 700);
    let phi = s.coordinates().phi(s.start());
    // under the canonical link, expected and observed information are the same
    let (e, o) = (s.information(Information::Expected, &phi).unwrap(), s.evaluate(&phi, Order::Hessian).hessian);
    approx::assert_relative_eq!(e, -o, max_relative = 1e-10);
}

#[test]
fn threads_do_not_change_a_bit() {
    let (name, m) = &models()[1];
    let s = sample(name, m, true, 70_000);
    let phi = s.coordinates().phi(s.start());
    let run = |threads: usize| {
        rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap()
            .install(|| s.evaluate(&phi, Order::Hessian))
    };
    assert_eq!(run(1), run(3));
}

#[test]
fn a_row_parameter_that_is_not_there_names_the_nearest() {
    let mut m = model("poisson", "n");
    m.parameters = vec![started("rat", 1.0)];
    let e = prepare(&m, &table(10)).unwrap_err();
    assert!(format!("{e:?}").contains("nearest name: rate"), "{e:?}");
}
