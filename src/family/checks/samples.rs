//! Samplers against distribution functions, starting values on what samplers draw.

use super::{AMOUNTS, Family, Support, at, compile, densities, points, quadrature};
use crate::expr::Scalars;
use crate::family::{Given, Moments};
use crate::math::Random;

/// Draws in each Kolmogorov test.
const DRAWS: usize = 4_000;
/// sqrt(draws) times the Kolmogorov distance exceeds this with probability 2 exp(-2 * 2.2^2) = 1.3e-4, less for counts. The seed is
/// fixed: a run that passes once passes always.
const FAR: f64 = 2.2;

/// P(Y <= y) at the sorted draws: by the distribution function, else by summing or integrating the density.
fn cumulative(f: &Family, log: &Scalars, theta: &[f64], draws: &[f64]) -> Vec<f64> {
    if let Some(d) = f.distribution {
        let below = compile(f, d.below, true, 0);
        return draws.iter().map(|&y| at(&below, y, theta)[0].exp()).collect();
    }
    let mut nodes = quadrature::support(f, log, theta);
    nodes.sort_by(|a, b| a.0.total_cmp(&b.0));
    let (mut sum, mut next) = (0.0, 0);
    draws
        .iter()
        .map(|&y| {
            while next < nodes.len() && nodes[next].0 <= y {
                let p = nodes[next].1 * at(log, nodes[next].0, theta)[0].exp();
                sum += if p.is_finite() { p } else { 0.0 };
                next += 1;
            }
            sum
        })
        .collect()
}

fn sorted(f: &Family, theta: &[f64], random: &mut Random, count: usize) -> Vec<f64> {
    let mut draws: Vec<f64> = (0..count).map(|_| (f.sample)(theta, &AMOUNTS, random)).collect();
    draws.sort_by(f64::total_cmp);
    draws
}

#[test]
fn samplers_draw_from_the_distribution() {
    for (k, f) in densities().enumerate() {
        let log = compile(f, f.log_density, true, 0);
        for (j, theta) in points(f).into_iter().enumerate() {
            let draws = sorted(f, &theta, &mut Random::new(20, (10 * k + j) as u64), DRAWS);
            assert!(draws.iter().all(|&y| at(&log, y, &theta)[0].is_finite()), "{} draws outside", f.name);
            let p = cumulative(f, &log, &theta, &draws);
            let n = DRAWS as f64;
            let mut worst: f64 = 0.0;
            for (i, &p) in p.iter().enumerate() {
                // among equal values the last says how many lie at or below
                if i + 1 == DRAWS || draws[i + 1] > draws[i] {
                    worst = worst.max(((i + 1) as f64 / n - p).abs());
                }
                if !f.support.is_count() {
                    worst = worst.max((i as f64 / n - p).abs());
                }
            }
            assert!(n.sqrt() * worst < FAR, "{} at {theta:?}: Kolmogorov distance {worst}", f.name);
        }
    }
}

/// Known values where a family needs them.
fn known(f: &Family, theta: &[f64]) -> Vec<Option<f64>> {
    f.parameters.iter().zip(theta).map(|(p, &x)| (p.given != Given::Estimated).then_some(x)).collect()
}

#[test]
fn starts_lie_in_range_with_a_finite_likelihood() {
    for (k, f) in densities().enumerate() {
        let log = compile(f, f.log_density, true, 0);
        for (j, theta) in points(f).into_iter().enumerate() {
            for (s, count) in [5usize, 20, 60, 300].into_iter().cycle().take(40).enumerate() {
                let draws = sorted(f, &theta, &mut Random::new(21, (1000 * k + 100 * j + s) as u64), count);
                let mut m = Moments::of(draws.iter().map(|&y| (y, 1.0)));
                if f.support == Support::CountOfTrials {
                    // moments are per trial
                    m = Moments::of(draws.iter().map(|&y| (y / AMOUNTS.trials, AMOUNTS.trials)));
                    m.trials = AMOUNTS.trials;
                }
                let start = (f.start)(&m, &known(f, &theta));
                for (p, &x) in f.parameters.iter().zip(&start) {
                    assert!(p.range.contains(x), "{} {} starts at {x}", f.name, p.name);
                }
                let total: f64 = draws.iter().map(|&y| at(&log, y, &start)[0]).sum();
                // counts all alike put a start on an edge, where the likelihood is finite too
                assert!(total.is_finite(), "{} at {theta:?}, {count} draws: {total} at the start {start:?}", f.name);
            }
        }
    }
}

#[test]
fn starts_lie_in_range_for_any_response() {
    for f in densities() {
        let spread = Moments::of([0.0, 0.1, 0.2, 0.6, 0.9, 1.0].into_iter().map(|y| (y, 7.0)));
        let flat = Moments::of([(0.0, 3.0)].into_iter());
        let one = Moments::of([(0.5, 1.0)].into_iter());
        for m in [spread, flat, one, Moments::default()] {
            for k in 0..=f.parameters.len() {
                // with none, and with each single one known
                let mut known = vec![None; f.parameters.len()];
                if let Some(p) = f.parameters.get(k) {
                    known[k] = Some(if p.range.high == 1.0 { 0.4 } else { 0.9 });
                }
                for (i, (p, x)) in f.parameters.iter().zip((f.start)(&m, &known)).enumerate() {
                    assert!(p.range.contains(x) || i == k, "{} {} starts at {x}", f.name, p.name);
                }
            }
        }
    }
}
