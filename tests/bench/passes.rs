//! One pass over a million rows (value, gradient and Hessian) of three models, beside loops written by hand for each,
//! and the whole program on the main demo. Run by `cargo bench`; prints nanoseconds a row a pass.
//!
//! One thread. Rounds of program and hand alternate, so that both meet the same noise; the median round counts.
#![allow(clippy::unwrap_used, clippy::print_stdout)]

mod byhand;

use std::hint::black_box;
use std::process::{Command, Stdio};
use std::time::Instant;

use guyline::data::{Column, Table, Values};
use guyline::likelihood::model::{Component, Form, Response, Setting, Terms};
use guyline::likelihood::{LogLikelihood, Model, Order, Sample, prepare};
use guyline::math::Vector;

const ROWS: usize = 1_000_000;
const ROUNDS: usize = 9;
/// Passes of one measurement: the clock of processor time ticks every few milliseconds.
const PASSES: usize = 12;
/// Three kilns: mean and sd of thickness.
const KILNS: [(f64, f64); 3] = [(9.6, 0.2), (10.1, 0.18), (10.6, 0.24)];

fn main() {
    // `cargo test --benches` calls every bench without --bench; only `cargo bench` measures.
    if !std::env::args().any(|a| a == "--bench") {
        return;
    }
    println!("ns a row a pass (value, gradient, Hessian) at {ROWS} rows, one thread: program, by hand, ratio");
    let pool = rayon::ThreadPoolBuilder::new().num_threads(1).build().unwrap();
    pool.install(|| {
        normal();
        logistic();
        mixture();
    });
    demo();
}

fn normal() {
    let mut source = Source(1);
    let y: Vec<f64> = (0..ROWS).map(|_| 10.0 + 0.2 * source.normal()).collect();
    let sample = prepared("normal", Vec::new(), Vec::new(), &[("y", &y)]);
    let at = [9.9, 0.25];
    compare("normal", &sample, &at, || byhand::normal(black_box(&y), at[0], at[1]));
}

fn logistic() {
    let mut source = Source(2);
    let x: Vec<Vec<f64>> = (0..byhand::COVARIATES).map(|_| (0..ROWS).map(|_| source.normal()).collect()).collect();
    let beta = [-0.5, 0.4, 0.4, 0.5, 0.3, 0.2, -0.3, 0.25, 0.0, -0.15, 0.1];
    let y: Vec<f64> = (0..ROWS)
        .map(|i| {
            let eta = beta[0] + x.iter().zip(&beta[1..]).map(|(c, b)| c[i] * b).sum::<f64>();
            f64::from(source.uniform() < 1.0 / (1.0 + (-eta).exp()))
        })
        .collect();
    let names: Vec<String> = (1..=byhand::COVARIATES).map(|k| format!("x{k}")).collect();
    let terms = Terms {
        terms: names.iter().map(|n| vec![n.clone()]).collect(),
        link: Some("logit".into()),
        intercept: true,
        full: false,
        offset: None,
    };
    let probability = Setting { name: "probability".into(), form: Form::Terms(terms), ..Setting::default() };
    let mut columns: Vec<(&str, &[f64])> = vec![("y", &y)];
    columns.extend(names.iter().map(String::as_str).zip(x.iter().map(Vec::as_slice)));
    let sample = prepared("binomial", vec![probability], Vec::new(), &columns);
    compare("logistic, 10 covariates", &sample, &beta, || byhand::logistic(black_box(&y), &x, &beta));
}

fn mixture() {
    let mut source = Source(3);
    let y: Vec<f64> = (0..ROWS)
        .map(|_| {
            let u = source.uniform();
            let (mean, sd) = KILNS[if u < 0.4 { 0 } else { 1 + usize::from(u > 0.7) }];
            mean + sd * source.normal()
        })
        .collect();
    let known = |name: &str, value| Setting { name: name.into(), known: vec![(None, value)], ..Setting::default() };
    let components = ["north", "middle", "south"].iter().zip(KILNS).map(|(name, (mean, sd))| Component {
        name: (*name).into(),
        family: "normal".into(),
        parameters: vec![known("mean", mean), known("sd", sd)],
        ..Component::default()
    });
    let sample = prepared("mixture", Vec::new(), components.collect(), &[("y", &y)]);
    let density = |(m, s): (f64, f64)| -> Vec<f64> {
        let scale = s * (2.0 * std::f64::consts::PI).sqrt();
        y.iter().map(|y| (-0.5 * ((y - m) / s).powi(2)).exp() / scale).collect()
    };
    let f = KILNS.map(density);
    let shares = [0.4, 0.35, 0.25];
    compare("mixture of 3 known", &sample, &shares, || {
        byhand::mixture([&f[0], &f[1], &f[2]].map(|c| black_box(&c[..])), shares)
    });
}

fn prepared(family: &str, parameters: Vec<Setting>, components: Vec<Component>, columns: &[(&str, &[f64])]) -> Sample {
    let column =
        |(name, values): &(&str, &[f64])| Column { name: (*name).into(), values: Values::Number(values.to_vec()) };
    let table = Table { columns: columns.iter().map(column).collect(), rows: ROWS, ..Table::default() };
    let model = Model {
        family: family.into(),
        response: Response::Column("y".into()),
        parameters,
        components,
        ..Model::default()
    };
    prepare(&model, &table).unwrap()
}

/// Alternates rounds of both, after making sure that they compute the same.
fn compare(name: &str, sample: &Sample, at: &[f64], hand: impl Fn() -> Vec<f64>) {
    let theta = Vector::from_column_slice(at);
    let phi = sample.coordinates().phi(&theta);
    let all = |phi: &Vector| sample.evaluate(phi, Order::Hessian);
    let (ours, theirs) = (all(&phi), hand());
    let n = at.len();
    let mut flat = vec![ours.value];
    flat.extend(ours.gradient.iter());
    flat.extend((0..n).flat_map(|i| (0..=i).map(move |j| (i, j))).map(|(i, j)| ours.hessian[(i, j)]));
    for (a, b) in flat.iter().zip(&theirs) {
        // Sums of a million rows in another order; entries that nearly cancel are held to the size of the sum.
        assert!((a - b).abs() <= 1e-9 * (b.abs() + ROWS as f64), "{name}: {a} and {b}");
    }
    let (mut program, mut written) = (Vec::new(), Vec::new());
    for _ in 0..ROUNDS {
        program.push(once(|| all(black_box(&phi)).value));
        written.push(once(|| hand()[0]));
    }
    let (p, w) = (median(program), median(written));
    println!("{name:26} {p:7.2} {w:7.2} {:6.2}", p / w);
}

/// Nanoseconds a row of one measurement.
fn once(pass: impl Fn() -> f64) -> f64 {
    let begun = clock();
    for _ in 0..PASSES {
        black_box(pass());
    }
    (clock() - begun) / (ROWS * PASSES) as f64
}

fn median(mut times: Vec<f64>) -> f64 {
    times.sort_by(f64::total_cmp);
    times[times.len() / 2]
}

/// The whole program, from starting to ended, on the main demo.
fn demo() {
    let times = (0..21).map(|_| {
        let begun = Instant::now();
        let status = Command::new(env!("CARGO_BIN_EXE_guyline"))
            .args(["fit", "datasets/pallet.toml"])
            .current_dir(env!("CARGO_MANIFEST_DIR"))
            .stdout(Stdio::null())
            .status()
            .unwrap();
        assert!(status.success());
        begun.elapsed().as_secs_f64() * 1e3
    });
    println!("whole program on datasets/pallet.toml: {:.1} ms", median(times.collect()));
}

/// Nanoseconds of processor time of all threads where the system tells (Linux), else of the wall clock: other work on
/// the machine then counts less.
fn clock() -> f64 {
    static BEGUN: std::sync::OnceLock<Instant> = std::sync::OnceLock::new();
    let begun = *BEGUN.get_or_init(Instant::now);
    let ran = |task: std::io::Result<std::fs::DirEntry>| -> Option<f64> {
        let text = std::fs::read_to_string(task.ok()?.path().join("schedstat")).ok()?;
        text.split_whitespace().next()?.parse().ok()
    };
    match std::fs::read_dir("/proc/self/task").ok().and_then(|tasks| tasks.map(ran).sum::<Option<f64>>()) {
        Some(ns) if ns > 0.0 => ns,
        _ => begun.elapsed().as_secs_f64() * 1e9,
    }
}

/// Splitmix64 with normal draws, as in the generator of the demos.
struct Source(u64);

impl Source {
    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64 + f64::EPSILON / 4.0
    }

    fn normal(&mut self) -> f64 {
        let (u, v) = (self.uniform(), self.uniform());
        (-2.0 * u.ln()).sqrt() * (2.0 * std::f64::consts::PI * v).cos()
    }
}
