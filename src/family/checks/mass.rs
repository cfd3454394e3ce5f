//! Densities against one, information against scores, distribution functions against densities.

use super::{Family, Support, at, compile, densities, inputs, points, quadrature};
use crate::family::{Given, Information};

#[test]
fn densities_sum_or_integrate_to_one() {
    for f in densities() {
        let log = compile(f, f.log_density, true, 0);
        for theta in points(f) {
            let parts = quadrature::support(f, &log, &theta).into_iter().map(|(y, w)| w * at(&log, y, &theta)[0].exp());
            let mass: f64 = parts.filter(|p| p.is_finite()).sum();
            // the rules are good to 1e-12; the last digits below 1 of a density infinite there are not seen
            assert!((mass - 1.0).abs() < 1e-9, "{} at {theta:?}: {mass}", f.name);
        }
    }
}

#[test]
fn expected_information_is_the_variance_of_the_scores() {
    for f in densities() {
        let Information::Closed(list) = f.information else { continue };
        let log = compile(f, f.log_density, true, 1);
        for theta in points(f) {
            let n = f.parameters.len();
            let mut j = vec![vec![0.0; n]; n];
            for (y, w) in quadrature::support(f, &log, &theta) {
                let v = at(&log, y, &theta);
                let mass = w * v[0].exp();
                // so little mass that no score makes it count
                if mass < 1e-60 || !mass.is_finite() {
                    continue;
                }
                for a in 0..n {
                    for b in 0..n {
                        j[a][b] += mass * v[1 + a] * v[1 + b];
                    }
                }
            }
            for (a, row) in j.iter().enumerate() {
                for (b, &found) in row.iter().enumerate() {
                    let (x, y) = (f.parameters[a].name, f.parameters[b].name);
                    // row parameters that are never estimated have none
                    if [a, b].iter().any(|&i| f.parameters[i].given != Given::Estimated) {
                        continue;
                    }
                    let text = list.iter().find(|e| (e.0, e.1) == (x, y) || (e.1, e.0) == (x, y));
                    let want = text.map_or(0.0, |e| at(&compile(f, e.2, true, 0), 1.0, &theta)[0]);
                    let size = 1.0 + want.abs();
                    assert!(
                        (found - want).abs() < 1e-8 * size,
                        "{} {x} {y} at {theta:?}: {found}, the text says {want}",
                        f.name
                    );
                }
            }
        }
    }
}

/// Intervals in the middle and in both tails.
fn intervals(f: &Family, theta: &[f64]) -> Vec<(f64, f64)> {
    match f.support {
        Support::Real | Support::Angle => vec![(0.4, 1.7), (-7.0, -6.5), (-0.3, -0.2), (2.5, 6.0), (14.0, 15.0)],
        Support::Unit => vec![(0.2, 0.7), (1e-6, 2e-6), (0.99, 0.9999)],
        Support::From(name) => {
            let low = theta[f.parameters.iter().position(|p| p.name == name).unwrap()];
            vec![(low + 0.4, low + 1.7), (low + 1e-4, low + 2e-4), (low + 2.0, low + 2.5)]
        }
        Support::Nonnegative | Support::Positive => vec![(0.4, 1.7), (0.01, 0.0101), (4.0, 7.0)],
        Support::CountFromOne => vec![(1.0, 4.0), (3.0, 5.0)],
        _ => vec![(0.0, 2.0), (2.0, 5.0)],
    }
}

#[test]
fn intervals_have_the_probability_of_the_density() {
    for f in densities() {
        let Some(d) = f.distribution else { continue };
        let log = compile(f, f.log_density, true, 0);
        let (above, below) = (compile(f, d.above, true, 0), compile(f, d.below, true, 0));
        let between = d.between.map(|text| compile(f, text, true, 0));
        for theta in points(f) {
            for (lower, upper) in intervals(f, &theta) {
                let inside = inputs(upper, (lower, upper), &theta);
                let (b, a) = (at(&below, lower, &theta)[0], at(&above, upper, &theta)[0]);
                let want: f64 = if f.support.is_count() {
                    let count = (lower as i32 + 1)..=(upper as i32);
                    count.map(|k| at(&log, f64::from(k), &theta)[0].exp()).sum()
                } else {
                    quadrature::probability(f, &log, &theta, lower, upper)
                };
                let all = b.exp() + want + a.exp();
                // three parts, each good to some eps
                assert!((all - 1.0).abs() < 1e-11, "{} {theta:?} {lower} {upper}: in all {all}", f.name);
                if let Some(between) = &between {
                    let p = between.evaluate(&inside)[0].exp();
                    // relative, so that it holds in the tails; the quadrature is good to 1e-12
                    let close = (p - want).abs() <= 1e-11 * want;
                    assert!(close, "{} {theta:?} {lower} {upper}: between {p} not {want}", f.name);
                }
            }
        }
    }
}

#[test]
fn derivatives_of_the_distribution_function_agree_with_differences() {
    for f in densities() {
        let Some(d) = f.distribution else { continue };
        for text in [Some(d.below), Some(d.above), d.between].into_iter().flatten() {
            let s = compile(f, text, true, 2);
            let n = f.parameters.len();
            for theta in points(f) {
                for (lower, upper) in intervals(f, &theta) {
                    let exact = s.evaluate(&inputs(upper, (lower, upper), &theta));
                    if !exact[0].is_finite() {
                        continue;
                    }
                    let mut second = 1 + n;
                    for i in 0..n {
                        // those never estimated are never differentiated by
                        if f.parameters[i].given != Given::Estimated {
                            second += n - i;
                            continue;
                        }
                        let h = 1e-5;
                        let moved = |by: f64| {
                            let mut t = theta.clone();
                            t[i] += by;
                            s.evaluate(&inputs(upper, (lower, upper), &t))
                        };
                        let (up, down) = (moved(h), moved(-h));
                        let check = |what: &str, found: f64, k: usize| {
                            let want = (up[k] - down[k]) / (2.0 * h);
                            let size = 1.0 + want.abs() + exact[0].abs();
                            // central differences of step 1e-5 are good to about 1e-10 times third derivatives
                            let close = (found - want).abs() < 1e-6 * size;
                            assert!(
                                close || !want.is_finite(),
                                "{} {what} by {} at {theta:?} ({lower}, {upper}): {found} not {want} in {text}",
                                f.name,
                                f.parameters[i].name
                            );
                        };
                        check("slope", exact[1 + i], 0);
                        for j in i..n {
                            check("curvature", exact[second], 1 + j);
                            second += 1;
                        }
                    }
                }
            }
        }
    }
}
