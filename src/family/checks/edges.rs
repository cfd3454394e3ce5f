//! Count families on the closed ends of their ranges and outside their supports.

use super::{FAMILIES, Family, at, compile, points};
use crate::family::Support;

fn counts() -> impl Iterator<Item = &'static &'static Family> {
    FAMILIES.iter().filter(|f| f.support.is_count())
}

fn lowest(f: &Family) -> f64 {
    if f.support == Support::CountFromOne { 1.0 } else { 0.0 }
}

/// Points with one row parameter on a closed end, or all of them: with the direction into the range.
fn edges(f: &Family) -> Vec<(Vec<f64>, usize, f64)> {
    let mut out = Vec::new();
    for theta in points(f) {
        for (i, p) in f.parameters.iter().enumerate() {
            let ends = [(p.range.low, p.range.low_closed, 1.0), (p.range.high, p.range.high_closed, -1.0)];
            for (end, _, inward) in ends.into_iter().filter(|e| e.1) {
                let mut t = theta.clone();
                t[i] = end;
                out.push((t.clone(), i, inward));
                // the others at their lower ends as well
                for (j, q) in f.parameters.iter().enumerate() {
                    if j != i && q.range.low_closed {
                        t[j] = q.range.low;
                    }
                }
                out.push((t, i, inward));
            }
        }
    }
    out
}

#[test]
fn slopes_on_edges_are_one_sided() {
    for f in counts() {
        let mut texts = vec![f.log_density];
        texts.extend(f.distribution.iter().flat_map(|d| [d.below, d.above]));
        for (which, text) in texts.into_iter().enumerate() {
            for signs in [true, false] {
                let s = compile(f, text, signs, 2);
                let n = f.parameters.len();
                let mut seen = 0;
                for (theta, i, inward) in edges(f) {
                    for k in 0..5 {
                        let y = lowest(f) + f64::from(k);
                        let exact = at(&s, y, &theta);
                        if exact[0] == f64::NEG_INFINITY {
                            continue;
                        }
                        seen += 1;
                        assert!(
                            exact.iter().all(|x| x.is_finite()),
                            "{} {theta:?} y = {y}: {exact:?} in {text}",
                            f.name
                        );
                        let h = 1e-4;
                        let inside = |steps: f64| {
                            let mut t = theta.clone();
                            t[i] += inward * steps * h;
                            at(&s, y, &t)
                        };
                        let (one, two, three) = (inside(1.0), inside(2.0), inside(3.0));
                        // one-sided differences of third order: good to h^3 times a fourth derivative
                        let slope = |j: usize| {
                            inward * (-11.0 * exact[j] + 18.0 * one[j] - 9.0 * two[j] + 2.0 * three[j]) / (6.0 * h)
                        };
                        let near = |found: f64, want: f64| (found - want).abs() < 1e-5 * (1.0 + want.abs());
                        let first = slope(0);
                        assert!(
                            near(exact[1 + i], first),
                            "{} {theta:?} y = {y} by {i}: {} not {first} in {text}",
                            f.name,
                            exact[1 + i]
                        );
                        for j in 0..n {
                            let (a, b) = (i.min(j), i.max(j));
                            let place = 1 + n + (0..a).map(|k| n - k).sum::<usize>() + b - a;
                            let second = slope(1 + j);
                            assert!(
                                near(exact[place], second),
                                "{} {theta:?} y = {y} by {i} and {j}: {} not {second} in {text}",
                                f.name,
                                exact[place]
                            );
                        }
                    }
                }
                assert!(seen > 0 || edges(f).is_empty() || which == 2, "{}: no edge looked at", f.name);
            }
        }
    }
}

#[test]
fn nothing_lies_below_the_lowest_count() {
    for f in counts() {
        let Some(d) = f.distribution else { continue };
        for (text, want) in [(d.below, f64::NEG_INFINITY), (d.above, 0.0)] {
            let s = compile(f, text, true, 2);
            for theta in points(f) {
                for y in [-1.0, lowest(f) - 1.0] {
                    let found = at(&s, y, &theta);
                    assert_eq!(found[0], want, "{} {theta:?} y = {y} in {text}", f.name);
                    assert!(found[1..].iter().all(|&x| x == 0.0), "{} {theta:?} y = {y}: {found:?}", f.name);
                }
            }
        }
    }
}

#[test]
fn small_dispersions_lead_to_the_limit() {
    for (name, cases) in [
        ("negative_binomial", [(vec![3.0, 0.0], 2.0), (vec![70.0, 0.0], 95.0), (vec![0.01, 0.0], 0.0)]),
        ("beta_binomial", [(vec![0.3, 0.0], 2.0), (vec![0.9, 0.0], 6.0), (vec![0.01, 0.0], 0.0)]),
    ] {
        let f = Family::named(name).unwrap();
        let s = compile(f, f.log_density, true, 2);
        for (theta, y) in cases {
            let limit = at(&s, y, &theta);
            for k in [1e-14, 1e-11, 1e-8, 1e-6] {
                let near = at(&s, y, &[theta[0], k]);
                // what the quadratic leaves is a cubic whose factor, of the order of y^4, is below 1e8
                let want = limit[0] + k * limit[2] + 0.5 * k * k * limit[5];
                assert!((near[0] - want).abs() < 1e-13 * want.abs().max(1.0) + 1e8 * k * k * k, "{name} {theta:?} {k}");
                assert!((near[2] - limit[2] - k * limit[5]).abs() < 1e-12 * limit[2].abs().max(1.0) + 1e8 * k * k);
            }
        }
    }
}
