//! One pass over a million rows (value, gradient and Hessian) of three models, beside loops written by hand for each,
//! and the whole program on the main demo. Run by `cargo bench`; prints nanoseconds a row a pass.
//!
//! One thread. Rounds of program and hand alternate, so that both meet the same noise; the median round counts.
#![allow(clippy::unwrap_used, clippy::print_stdout)]

mod byhand;

use std::hint::black_box;
use std::time::Instant;

const ROWS: usize = 1_000_000;
const ROUNDS: usize = 9;
/// Passes of one measurement: the clock of processor time ticks every few milliseconds.
const PASSES: usize = 12;

fn main() {
    // `cargo test --benches` calls every bench with --test; only `cargo bench` measures.
    if !std::env::args().any(|a| a == "--bench") {
        return;
    }
    let mut source = Source(1);
    let y: Vec<f64> = (0..ROWS).map(|_| 10.0 + 0.2 * source.normal()).collect();
    println!("normal by hand: {:.2}", median(|| black_box(byhand::normal(black_box(&y), 9.9, 0.25))[0]));
    let x: Vec<Vec<f64>> = (0..byhand::COVARIATES).map(|_| (0..ROWS).map(|_| source.normal()).collect()).collect();
    let beta = [-0.5, 0.4, 0.4, 0.5, 0.3, 0.2, -0.3, 0.25, 0.0, -0.15, 0.1];
    let z: Vec<f64> = (0..ROWS)
        .map(|i| {
            let eta = beta[0] + x.iter().zip(&beta[1..]).map(|(c, b)| c[i] * b).sum::<f64>();
            f64::from(source.uniform() < 1.0 / (1.0 + (-eta).exp()))
        })
        .collect();
    println!("logistic by hand: {:.2}", median(|| black_box(byhand::logistic(black_box(&z), &x, &beta))[0]));
    let f: Vec<Vec<f64>> = [(9.6, 0.2), (10.1, 0.18), (10.6, 0.24)]
        .iter()
        .map(|(m, s): &(f64, f64)| y.iter().map(|y| (-0.5 * ((y - m) / s).powi(2)).exp() / s).collect())
        .collect();
    println!(
        "mixture by hand: {:.2}",
        median(|| black_box(byhand::mixture([&f[0], &f[1], &f[2]], [0.4, 0.3, 0.3]))[0])
    );
}

fn median(mut pass: impl FnMut() -> f64) -> f64 {
    let mut times: Vec<f64> = (0..ROUNDS)
        .map(|_| {
            let begun = clock();
            for _ in 0..PASSES {
                black_box(pass());
            }
            (clock() - begun) / (ROWS * PASSES) as f64
        })
        .collect();
    times.sort_by(f64::total_cmp);
    times[ROUNDS / 2]
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
