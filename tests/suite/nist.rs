//! Certified linear regressions (`tests/data/nist`): badly conditioned on purpose.

use serde_json::Value;

use crate::harness::{Folder, root};

struct Set {
    study: String,
    data: String,
    names: Vec<String>,
}

/// Polynomials make their columns by `[data.derive]`, as a user would.
fn set(name: &str, degree: Option<u64>) -> Set {
    let data = std::fs::read_to_string(root().join(format!("tests/data/nist/{name}.csv"))).unwrap();
    let (mut terms, mut derive) = (Vec::new(), String::from("[data.derive]\n"));
    match degree {
        None => terms.extend(data.lines().next().unwrap().split(',').skip(1).map(str::to_owned)),
        Some(degree) => {
            terms.push("x".to_owned());
            for k in 2..=degree {
                derive += &format!("x{k} = \"x^{k}\"\n");
                terms.push(format!("x{k}"));
            }
        }
    }
    let study = format!(
        "[data]\nfile = \"data.csv\"\n{derive}[model]\nfamily = \"normal\"\nresponse = \"y\"\n[model.mean]\nterms = {terms:?}\n"
    );
    let names = std::iter::once("mean.intercept".to_owned()).chain(terms.iter().map(|t| format!("mean.{t}"))).collect();
    Set { study, data, names }
}

/// Correct significant digits, as NIST counts them: -log10 of the relative error.
fn digits(got: f64, want: f64) -> f64 {
    if got == want { 17.0 } else { -((got - want) / want).abs().log10() }
}

fn check(name: &str) {
    let all: Value =
        serde_json::from_str(&std::fs::read_to_string(root().join("tests/data/nist/certified.json")).unwrap()).unwrap();
    let certified = &all[name];
    let set = set(name, certified["degree"].as_u64());
    let folder = Folder::new();
    folder.write("data.csv", &set.data);
    let fit = folder.fit(&set.study, &[]);
    assert_eq!(fit.verdict(), "strict maximum", "{}", fit.err);
    let number = |v: &Value| v.as_str().unwrap().parse::<f64>().unwrap();
    let wanted = certified["digits"].as_f64().unwrap();
    for (parameter, value) in set.names.iter().zip(certified["coefficients"].as_array().unwrap()) {
        let got = fit.estimate("restricted", parameter, "value").unwrap();
        let correct = digits(got, number(value));
        println!("{name} {parameter} {correct:.1}");
        assert!(correct >= wanted, "{name}: {parameter} {got}, not {value}: {correct:.1} digits");
    }
    // The maximum-likelihood sd divides by n, the certified one by n - p.
    let (n, p) = ((set.data.lines().count() - 1) as f64, set.names.len() as f64);
    let sd = fit.estimate("restricted", "sd", "value").unwrap() * (n / (n - p)).sqrt();
    let correct = digits(sd, number(&certified["residual_sd"]));
    assert!(correct >= 6.0, "{name}: residual sd {sd}: {correct:.1} digits");
}

#[test]
fn longley() {
    check("longley");
}

#[test]
fn norris() {
    check("norris");
}

#[test]
fn pontius() {
    check("pontius");
}

#[test]
fn wampler3() {
    check("wampler3");
}

#[test]
fn filip() {
    check("filip");
}
