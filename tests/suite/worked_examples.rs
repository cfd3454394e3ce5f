//! The cases of `tests/cases`: seventeen published examples and own ones, each with its sources beside the data and with
//! answers computed at 50 digits by `tests/reference/solve.py`, which shares nothing with the program.
//!
//! Every case runs as a custom density with observed information, and as a library family where one fits.

use std::path::PathBuf;

use serde_json::Value;

use crate::harness::{Fit, Folder, near, root};

/// Estimates and multipliers agree with the reference to these (relative; the absolute part is a hundredth of it times
/// the largest of the vector, for entries that are zero): the solver stops at a scaled gradient of 1e-7, past which its
/// quadratic convergence leaves nothing but rounding, and the statistics divide by it once more.
const ESTIMATES: f64 = 1e-8;
const MULTIPLIERS: f64 = 1e-7;
const ERRORS: f64 = 1e-7;
const STATISTICS: f64 = 1e-7;
const TAILS: f64 = 1e-6;

struct Case {
    name: String,
    json: Value,
}

/// A case as a study of a library family.
struct Family {
    study: String,
    data: String,
    /// Parameter of the case, its name in the family.
    names: Vec<(String, String)>,
    information: String,
}

fn cases() -> Vec<Case> {
    let mut paths: Vec<PathBuf> =
        std::fs::read_dir(root().join("tests/cases")).unwrap().map(|e| e.unwrap().path()).collect();
    paths.sort();
    let read = |p: &PathBuf| serde_json::from_str(&std::fs::read_to_string(p).unwrap()).unwrap();
    paths.iter().map(|p| Case { name: p.file_stem().unwrap().to_string_lossy().into(), json: read(p) }).collect()
}

fn texts(v: &Value) -> Vec<String> {
    v.as_array().unwrap().iter().map(|t| t.as_str().unwrap().to_owned()).collect()
}

impl Case {
    fn parameters(&self) -> Vec<&str> {
        self.json["parameters"].as_array().unwrap().iter().map(|p| p["name"].as_str().unwrap()).collect()
    }

    fn data(&self) -> String {
        let columns = self.json["columns"].as_object().unwrap();
        let cells: Vec<(&str, Vec<String>)> = columns
            .iter()
            .map(|(k, v)| (k.as_str(), v.as_array().unwrap().iter().map(Value::to_string).collect()))
            .collect();
        crate::harness::csv(&cells)
    }

    fn head(&self) -> String {
        let weight = self.json["weight"].as_str().map_or(String::new(), |w| format!("weight = {w:?}\n"));
        format!("[data]\nfile = \"data.csv\"\n{weight}")
    }

    fn restrictions(&self, role: &str, rename: &dyn Fn(&str) -> String, keep: &dyn Fn(&str) -> bool) -> String {
        let kept: Vec<String> = texts(&self.json[role]).into_iter().filter(|t| keep(t)).collect();
        let lines = kept.iter().enumerate().map(|(i, t)| format!("{}{} = {:?}\n", &role[..1], i + 1, rename(t)));
        format!("[{role}]\n{}", lines.collect::<String>())
    }

    fn custom(&self) -> String {
        let mut out = self.head() + "[model]\nfamily = \"custom\"\n";
        out += &format!("log_density = {:?}\n", self.json["log_density"].as_str().unwrap());
        for p in self.json["parameters"].as_array().unwrap() {
            out += &format!("{} = {{ start = {}, range = {} }}\n", p["name"].as_str().unwrap(), p["start"], p["range"]);
        }
        let same = |t: &str| t.to_owned();
        out + &self.restrictions("maintained", &same, &|_| true) + &self.restrictions("tested", &same, &|_| true)
    }

    fn family(&self) -> Option<Family> {
        let family = self.json.get("family")?;
        if family.get("table").is_some() {
            let names = self.parameters().iter().map(|p| (p.to_string(), format!("share.{p}"))).collect::<Vec<_>>();
            let weight = self.json["weight"].as_str().unwrap();
            // Row r is the cell of parameter r.
            let counts = &self.json["columns"][weight];
            let rows = names.iter().zip(counts.as_array().unwrap()).map(|((p, _), n)| format!("{p},{n}\n"));
            let data = format!("cell,{weight}\n{}", rows.collect::<String>());
            let sum = self.parameters().join(" + ") + " = 1"; // brought by the family
            let study = self.head()
                + "[model]\nfamily = \"categorical\"\nresponse = \"cell\"\n"
                + &self.restrictions("maintained", &|t| renamed(t, &names), &|t| t != sum)
                + &self.restrictions("tested", &|t| renamed(t, &names), &|_| true);
            return Some(Family { study, data, names, information: "expected".into() });
        }
        let given = family["names"].as_object().unwrap();
        let names: Vec<(String, String)> =
            given.iter().map(|(a, b)| (a.clone(), b.as_str().unwrap().to_owned())).collect();
        let mixture = family["study"].as_str().unwrap().contains("\"mixture\"");
        let study = self.head()
            + family["study"].as_str().unwrap()
            + &self.restrictions("maintained", &|t| renamed(t, &names), &|_| !mixture)
            + &self.restrictions("tested", &|t| renamed(t, &names), &|_| true);
        Some(Family { study, data: self.data(), names, information: family["information"].as_str().unwrap().into() })
    }
}

/// An equation with its parameters called by other names.
fn renamed(text: &str, names: &[(String, String)]) -> String {
    let mut out = String::new();
    let mut word = String::new();
    for c in text.chars().chain(std::iter::once(' ')) {
        if c.is_ascii_alphanumeric() || c == '_' {
            word.push(c);
            continue;
        }
        out += names.iter().find(|n| n.0 == word).map_or(word.as_str(), |n| &n.1);
        word.clear();
        out.push(c);
    }
    out.trim_end().to_owned()
}

/// Gathers what differs, so that one run shows everything.
struct Faults {
    place: String,
    found: Vec<String>,
}

impl Faults {
    fn compare(&mut self, what: &str, got: Option<f64>, want: Option<f64>, relative: f64, absolute: f64) {
        let Some(want) = want else { return };
        if !got.is_some_and(|g| near(g, want, relative, absolute)) {
            self.found.push(format!("{}: {what}: {got:?}, not {want}", self.place));
        }
    }

    fn compare_all(&mut self, what: &str, got: &[Option<f64>], want: &Value, relative: f64) {
        let Some(want) = want.as_array() else { return };
        let largest = want.iter().filter_map(Value::as_f64).fold(0.0, |m: f64, v| m.max(v.abs()));
        if got.len() != want.len() {
            self.found.push(format!("{}: {} of {what}, not {}", self.place, got.len(), want.len()));
        }
        for (i, (g, w)) in got.iter().zip(want).enumerate() {
            self.compare(&format!("{what} {i}"), *g, w.as_f64(), relative, relative * largest.max(1e-6));
        }
    }
}

fn compare(case: &Case, fit: &Fit, kind: &str, names: &[(String, String)], faults: &mut Faults) {
    let want = &case.json["expect"];
    let (figures, redundant) = (&want[kind], case.json.get("dropped").is_some());
    if fit.status != 0 || fit.verdict() != "strict maximum" {
        faults.found.push(format!("{}: status {}, {}\n{}", faults.place, fit.status, fit.verdict(), fit.err));
        return;
    }
    let called = |p: &str| names.iter().find(|n| n.0 == p).map_or(p.to_owned(), |n| n.1.clone());
    let theta = want["restricted"]["theta"].as_object().unwrap();
    let scale = theta.values().filter_map(Value::as_f64).fold(1.0, |m: f64, v| m.max(v.abs()));
    for (i, (p, v)) in theta.iter().enumerate() {
        let get = |figure| fit.estimate("restricted", &called(p), figure);
        faults.compare(p, get("value"), v.as_f64(), ESTIMATES, 0.01 * ESTIMATES * scale);
        let ses = figures["se"].as_array().unwrap();
        let largest = ses.iter().filter_map(Value::as_f64).fold(0.0, |m: f64, v| m.max(v.abs()));
        faults.compare(&format!("se of {p}"), get("se"), ses[i].as_f64(), ERRORS, ERRORS * largest.max(1e-6));
    }
    let l = want["restricted"]["log_likelihood"].as_f64();
    faults.compare("log-likelihood", fit.number("/restricted/log_likelihood"), l, 1e-10, 1e-9);
    if !redundant {
        // A family's sum of shares may stand before or instead of maintained ones; where it does, order is the same.
        let mu = fit.multipliers(|role| role != "tested", "value");
        faults.compare_all("mu", &mu, &want["restricted"]["mu"], MULTIPLIERS);
        faults.compare_all("lambda", &fit.tested("value"), &want["restricted"]["lambda"], MULTIPLIERS);
        faults.compare_all("se of lambda", &fit.tested("se"), &figures["lambda_se"], ERRORS);
        faults.compare_all("z of lambda", &fit.tested("z"), &figures["lambda_z"], STATISTICS);
    }
    let score = |figure: &str| fit.number(&format!("/tests/score/{figure}"));
    if figures["positive_definite"] == true {
        faults.compare("score", score("chi_square"), figures["score"]["chi_square"].as_f64(), STATISTICS, 1e-9);
        faults.compare("score p", score("p"), figures["score"]["p"].as_f64(), TAILS, 0.0);
        faults.compare("df", score("df"), want["df"].as_f64(), 0.0, 0.0);
    } else if !fit.value["tests"]["score"].is_null() {
        faults.found.push(format!("{}: a score test from information that is not positive definite", faults.place));
    }
    for (key, want) in [("lr", &want["lr"]), ("wald", &figures["wald"])] {
        let get = |figure| fit.number(&format!("/tests/{key}/{figure}"));
        faults.compare(key, get("chi_square"), want["chi_square"].as_f64(), STATISTICS, 1e-9);
        faults.compare(&format!("{key} p"), get("p"), want["p"].as_f64(), TAILS, 0.0);
    }
}

fn report(faults: Faults) {
    assert!(faults.found.is_empty(), "{} differences:\n{}", faults.found.len(), faults.found.join("\n"));
}

#[test]
fn custom_densities_with_observed_information() {
    let mut faults = Faults { place: String::new(), found: Vec::new() };
    for case in cases() {
        let folder = Folder::new();
        folder.write("data.csv", case.data());
        faults.place = case.name.clone();
        let fit = folder.fit(&case.custom(), &["--information", "observed"]);
        compare(&case, &fit, "observed", &[], &mut faults);
    }
    report(faults);
}

#[test]
fn library_families() {
    let mut faults = Faults { place: String::new(), found: Vec::new() };
    let mut seen = 0;
    for case in cases() {
        let Some(family) = case.family() else { continue };
        seen += 1;
        let folder = Folder::new();
        folder.write("data.csv", &family.data);
        faults.place = format!("{} as a family", case.name);
        let fit = folder.fit(&family.study, &["--information", &family.information]);
        compare(&case, &fit, &family.information, &family.names, &mut faults);
    }
    assert!(seen >= 18, "{seen} cases have a family");
    report(faults);
}

/// The published figures beside the cases, read from the fit where they are statistics: the reference itself is held
/// to the books by them. Quantities of estimates are recomputed from the reference estimates in `published_tables`.
#[test]
fn the_reference_agrees_with_the_closed_forms() {
    let mut seen = 0;
    for case in cases() {
        for form in case.json.get("closed_form").and_then(Value::as_array).into_iter().flatten() {
            let what = form["what"].as_str().unwrap();
            let expect = &case.json["expect"];
            let got = match what {
                "lr.chi2" => &expect["lr"]["chi_square"],
                "expected.score.chi2" => &expect["expected"]["score"]["chi_square"],
                "observed.score.chi2" => &expect["observed"]["score"]["chi_square"],
                "expected.wald.chi2" => &expect["expected"]["wald"]["chi_square"],
                _ => continue,
            };
            let want: f64 = form["value"].as_str().unwrap().parse().unwrap();
            // Both are doubles printed from many digits.
            assert!(near(got.as_f64().unwrap(), want, 1e-14, 0.0), "{}: {what} {got}, not {want}", case.name);
            seen += 1;
        }
    }
    assert!(seen > 20, "{seen} closed forms");
}
