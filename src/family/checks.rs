//! Tests by a loop over the table of families: mass, information, intervals, starting values.

use super::{FAMILIES, Family, Information, Moments, Support};
use crate::expr::{Graph, Scalars, Scope, Variable, build, parse_expression};

/// Row parameters at which each family is looked at; any point inside the ranges would do.
fn points(f: &Family) -> Vec<Vec<f64>> {
    let pick = |k: usize| -> Vec<f64> {
        f.parameters
            .iter()
            .enumerate()
            .map(|(i, p)| if p.range.high == 1.0 { [0.3, 0.55][k] } else { [0.8, 1.9][k] + 0.25 * i as f64 })
            .collect()
    };
    vec![pick(0), pick(1)]
}

const TRIALS: f64 = 6.0;
const EXPOSURE: f64 = 1.5;

/// A text of the family as a function of (y, lower, upper, row parameters), and its derivatives by the parameters.
fn compile(f: &Family, text: &str, first_only: bool) -> Scalars {
    let mut g = Graph::new();
    let mut s = Scope::new("name");
    for (i, name) in ["y", "lower", "upper", "at"].into_iter().enumerate() {
        let id = g.parameter(i as u32);
        s.insert(name, id);
    }
    for (i, p) in f.parameters.iter().enumerate() {
        let id = g.parameter(4 + i as u32);
        s.insert(p.name, id);
    }
    let (exposure, trials) = (g.constant(EXPOSURE), g.constant(TRIALS));
    s.insert("exposure", exposure);
    s.insert("trials", trials);
    let id = build(&mut g, &parse_expression(text).unwrap(), &s).unwrap();
    let mut out = vec![id];
    if !first_only {
        out.extend((0..f.parameters.len()).map(|i| g.derivative(id, Variable::Parameter(4 + i as u32))));
    }
    Scalars::compile(&g, &out)
}

fn at(s: &Scalars, y: f64, lower: f64, upper: f64, theta: &[f64]) -> Vec<f64> {
    let mut all = vec![y, lower, upper, y];
    all.extend(theta);
    s.evaluate(&all)
}

/// Points and weights that carry all of the family's mass worth a double: a sum for counts, Simpson's rule otherwise.
fn support(f: &Family) -> Vec<(f64, f64)> {
    match f.support {
        Support::Count | Support::CountFromOne => (0..200).map(|k| (f64::from(k), 1.0)).collect(),
        Support::CountOfTrials => (0..=TRIALS as i32).map(|k| (f64::from(k), 1.0)).collect(),
        _ => {
            let (a, b) = if f.support == Support::Real { (-60.0, 60.0) } else { (0.0, 120.0) };
            simpson(a, b)
        }
    }
}

fn simpson(a: f64, b: f64) -> Vec<(f64, f64)> {
    let n = 40_000;
    let h = (b - a) / f64::from(n);
    (0..=n)
        .map(|i| {
            let w = if i == 0 || i == n {
                1.0
            } else if i % 2 == 1 {
                4.0
            } else {
                2.0
            };
            (a + f64::from(i) * h, w * h / 3.0)
        })
        .collect()
}

#[test]
fn densities_sum_or_integrate_to_one() {
    for f in FAMILIES {
        let log = compile(f, f.log_density, true);
        for theta in points(f) {
            let mass: f64 = support(f).iter().map(|&(y, w)| w * at(&log, y, y, y, &theta)[0].exp()).sum();
            // Simpson's rule with 40,000 steps over smooth densities is good to 1e-12
            assert!((mass - 1.0).abs() < 1e-9, "{}: {mass}", f.name);
        }
    }
}

#[test]
fn expected_information_is_the_variance_of_the_scores() {
    for f in FAMILIES {
        let log = compile(f, f.log_density, false);
        for theta in points(f) {
            let n = f.parameters.len();
            let mut j = vec![vec![0.0; n]; n];
            for (y, w) in support(f) {
                let v = at(&log, y, y, y, &theta);
                for a in 0..n {
                    for b in 0..n {
                        j[a][b] += w * v[0].exp() * v[1 + a] * v[1 + b];
                    }
                }
            }
            for (a, row) in j.iter().enumerate() {
                for (b, &found) in row.iter().enumerate() {
                    let (x, y) = (f.parameters[a].name, f.parameters[b].name);
                    let Information::Closed(list) = f.information else { continue };
                    let text = list.iter().find(|e| (e.0, e.1) == (x, y) || (e.1, e.0) == (x, y));
                    let want = text.map_or(0.0, |e| at(&compile(f, e.2, true), 0.0, 0.0, 0.0, &theta)[0]);
                    let size = 1.0 + want.abs();
                    assert!((found - want).abs() < 1e-8 * size, "{} {x} {y}: {} not {want}", f.name, found);
                }
            }
        }
    }
}

#[test]
fn intervals_have_the_probability_of_the_density() {
    for f in FAMILIES {
        let Some(d) = f.distribution else { continue };
        let log = compile(f, f.log_density, true);
        let (above, below) = (compile(f, d.above, true), compile(f, d.below, true));
        let Some(between) = d.between.map(|text| compile(f, text, true)) else { continue };
        for theta in points(f) {
            let (lower, upper) = (0.4, 1.7);
            let p = at(&between, 0.0, lower, upper, &theta)[0].exp();
            let want: f64 = simpson(lower, upper).iter().map(|&(y, w)| w * at(&log, y, y, y, &theta)[0].exp()).sum();
            assert!((p - want).abs() < 1e-10, "{}: between {p} not {want}", f.name);
            let all =
                at(&below, lower, lower, lower, &theta)[0].exp() + p + at(&above, upper, upper, upper, &theta)[0].exp();
            assert!((all - 1.0).abs() < 1e-13, "{}: below, between and above make {all}", f.name);
        }
    }
}

#[test]
fn starts_lie_in_range() {
    for f in FAMILIES {
        let spread = Moments::of([0.0, 0.1, 0.2, 0.6, 0.9, 1.0].into_iter().map(|y| (y, 7.0)));
        let flat = Moments::of([(0.0, 3.0)].into_iter());
        for m in [spread, flat] {
            for (p, x) in f.parameters.iter().zip((f.start)(&m, &vec![None; f.parameters.len()])) {
                assert!(p.range.contains(x), "{} {} starts at {x}", f.name, p.name);
            }
        }
    }
}

#[test]
fn every_family_is_listed_with_its_formula_as_computed() {
    let all = super::listing::all();
    for f in FAMILIES {
        let l = all.iter().find(|l| l.name == f.name).unwrap();
        assert_eq!(l.formula, f.log_density);
        assert!(parse_expression(&l.formula).is_ok());
    }
}
