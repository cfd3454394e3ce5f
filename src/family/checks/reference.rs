//! Log densities, distribution functions and derivatives against values worked out in 30 and more digits by
//! `tests/reference/families.py` and `counts.py`.

use std::collections::HashMap;
use std::path::Path;

use super::{AMOUNTS, FAMILIES, Family, NAMES, compile, densities};
use crate::expr::Scalars;

/// One line: family, what, arguments by name, value.
struct Line {
    family: String,
    what: String,
    arguments: Vec<(String, f64)>,
    value: f64,
}

fn lines() -> Vec<Line> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference");
    let mut out = Vec::new();
    for file in ["families.tsv", "counts.tsv"] {
        let Ok(text) = std::fs::read_to_string(folder.join(file)) else { continue };
        for line in text.lines().filter(|l| !l.starts_with('#')) {
            let cells: Vec<&str> = line.split('\t').collect();
            let [family, what, arguments, value] = cells[..] else { panic!("{file}: {line}") };
            let number = |t: &str| t.parse::<f64>().unwrap_or_else(|e| panic!("{file}: {e}: {line}"));
            let arguments = arguments.split(' ').map(|a| {
                let (name, x) = a.split_once('=').unwrap_or_else(|| panic!("{file}: {line}"));
                (name.to_string(), number(x))
            });
            out.push(Line {
                family: family.into(),
                what: what.into(),
                arguments: arguments.collect(),
                value: number(value),
            });
        }
    }
    out
}

/// The inputs of a compiled text from the arguments of a line.
fn inputs(f: &Family, line: &Line) -> Vec<f64> {
    let a = AMOUNTS;
    let mut all = vec![f64::NAN, f64::NAN, f64::NAN, f64::NAN, a.exposure, a.trials, a.successes, a.failures];
    all.extend(f.parameters.iter().map(|_| f64::NAN));
    let names: Vec<&str> = NAMES.into_iter().chain(f.parameters.iter().map(|p| p.name)).collect();
    for (name, x) in &line.arguments {
        let i = names.iter().position(|n| n == name).unwrap_or_else(|| panic!("{}: no {name}", f.name));
        all[i] = *x;
        if name == "y" {
            all[3] = *x;
        }
    }
    all
}

/// Text, output among value and derivatives, and tolerance of what a line asks for.
fn target<'a>(f: &'a Family, what: &str) -> (&'a str, usize, f64) {
    let n = f.parameters.len();
    let place = |name: &str| f.parameters.iter().position(|p| p.name == name).unwrap_or_else(|| panic!("{what}"));
    let parts: Vec<&str> = what.split(':').collect();
    match parts[..] {
        ["log_density"] => (f.log_density, 0, 1e-12),
        // 1e-11 of the probability
        ["below"] => (f.distribution.unwrap().below, 0, 1e-11),
        ["above"] => (f.distribution.unwrap().above, 0, 1e-11),
        ["d", a] => (f.log_density, 1 + place(a), 1e-9),
        ["d2", a, b] => {
            let (i, j) = (place(a).min(place(b)), place(a).max(place(b)));
            (f.log_density, 1 + n + (0..i).map(|k| n - k).sum::<usize>() + j - i, 1e-9)
        }
        _ => panic!("{}: what is {what}?", f.name),
    }
}

#[test]
fn every_family_agrees_with_its_reference() {
    let lines = lines();
    let mut faults = Vec::new();
    for f in densities() {
        let own: Vec<&Line> = lines.iter().filter(|l| l.family == f.name).collect();
        for signs in [true, false] {
            let mut compiled: HashMap<&str, Scalars> = HashMap::new();
            for line in &own {
                let (text, output, tolerance) = target(f, &line.what);
                let order = if text == f.log_density { 2 } else { 0 };
                let s = compiled.entry(text).or_insert_with(|| compile(f, text, signs, order));
                let found = s.evaluate(&inputs(f, line))[output];
                let size = if text == f.log_density { line.value.abs().max(1.0) } else { 1.0 };
                let same = found == line.value || (found - line.value).abs() <= tolerance * size;
                if !same {
                    faults
                        .push(format!("{} {} {:?}: {found:e} not {:e}", f.name, line.what, line.arguments, line.value));
                }
            }
        }
    }
    assert!(faults.is_empty(), "{} values differ:\n{}", faults.len(), faults.join("\n"));
}

#[test]
fn every_family_has_enough_references() {
    let lines = lines();
    for f in densities() {
        let count = |what: &str| lines.iter().filter(|l| l.family == f.name && l.what == what).count();
        assert!(count("log_density") >= 25, "{} has {} reference values", f.name, count("log_density"));
        if f.distribution.is_some() {
            assert!(count("below") >= 5 && count("above") >= 5, "{}: distribution function", f.name);
        }
        for p in f.parameters.iter().filter(|p| p.given == crate::family::Given::Estimated) {
            assert!(count(&format!("d:{}", p.name)) >= 5, "{}: derivatives by {}", f.name, p.name);
        }
    }
    // a family renamed must not leave its values behind
    for l in &lines {
        assert!(FAMILIES.iter().any(|f| f.name == l.family), "no family is called {}", l.family);
    }
}
