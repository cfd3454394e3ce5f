//! What the figures of `worked_examples` do not show of the project's own cases: what is said when a statistic cannot be
//! given, when a restriction is redundant, when a parameter stands on an edge.

use serde_json::Value;

use crate::harness::{Fit, Folder, near};

fn table(cells: &[(&str, u32)]) -> String {
    cells.iter().fold("cell,n\n".to_owned(), |out, (c, n)| format!("{out}{c},{n}\n"))
}

fn fit(data: &str, study: &str, options: &[&str]) -> Fit {
    let folder = Folder::new();
    folder.write("data.csv", data);
    folder.fit(study, options)
}

const COUNTED: &str =
    "[data]\nfile = \"data.csv\"\nweight = \"n\"\n[model]\nfamily = \"categorical\"\nresponse = \"cell\"\n";

#[test]
fn a_cell_never_seen_leaves_likelihood_ratio_and_no_wald() {
    let data = table(&[("p11", 12), ("p12", 0), ("p21", 7), ("p22", 9)]);
    let study = format!(
        "{COUNTED}[data.category]\ncell = [\"p11\", \"p12\", \"p21\", \"p22\"]\n[tested]\nindependent = \"share.p11 * share.p22 = share.p12 * share.p21\"\n"
    );
    let fit = fit(&data, &study, &["--information", "expected"]);
    // Closed form: twice the sum of observed times log(observed / expected), 0 log 0 = 0; expected counts from margins.
    let expected: [f64; 4] = [12.0 * 19.0 / 28.0, 16.0 * 0.0, 19.0 * 16.0 / 28.0, 9.0 * 16.0 / 28.0];
    assert!(near(expected[2], 10.857_142_857_142_858, 1e-12, 0.0));
    let g2 = 2.0
        * (12.0 * f64::ln(12.0 / (12.0 * 19.0 / 28.0))
            + 7.0 * f64::ln(7.0 / (16.0 * 19.0 / 28.0))
            + 9.0 * f64::ln(9.0 / (16.0 * 9.0 / 28.0)));
    assert!(
        near(fit.number("/tests/lr/chi_square").unwrap(), g2, 1e-9, 0.0),
        "{:?}",
        fit.number("/tests/lr/chi_square")
    );
    // Pearson's statistic, as the score test with expected information is.
    assert!(near(fit.number("/tests/score/chi_square").unwrap(), 9.947_368_421_052_632, 1e-9, 0.0));
    assert!(fit.value["tests"]["wald"].is_null(), "{}", fit.value["tests"]["wald"]);
    assert!(!fit.warnings().is_empty());
    let edge = fit.list("/unrestricted/estimates").iter().find(|e| e["name"] == "share.p12").unwrap()["edge"].clone();
    assert_eq!(edge, Value::from("lower"));
}

#[test]
fn observed_information_that_is_not_positive_definite_gives_no_statistic() {
    let data = "y\n-1.1\n0.3\n0.8\n-0.2\n1.9\n0.1\n";
    let study = "[data]\nfile = \"data.csv\"\n[model]\nfamily = \"custom\"\nlog_density = \"-log(pi) - log(1 + (y - m)^2)\"\n\
                 m = { start = 1, range = \"(-inf, inf)\" }\n[tested]\nfar = \"m = 6\"\n";
    let observed = fit(data, study, &["--information", "observed"]);
    assert!(observed.value["tests"]["score"].is_null());
    let said = observed.warnings();
    assert!(said.contains("outer"), "the kinds that would serve are named: {said}");
    // The restricted fit, its multiplier and the likelihood ratio stand.
    assert_eq!(observed.verdict(), "strict maximum");
    assert!(near(observed.tested("value")[0].unwrap(), -2.091_843_703_829_981, 1e-7, 0.0));
    assert!(near(observed.number("/tests/lr/chi_square").unwrap(), 36.189_314_379_398_624, 1e-7, 0.0));
    let outer = fit(data, study, &["--information", "outer"]);
    // s^2 / sum of squared scores: -2.0918437...^2 over the sum of (2 (y - 6) / (1 + (y - 6)^2))^2, a closed form.
    let scores: Vec<f64> =
        [-1.1, 0.3, 0.8, -0.2, 1.9, 0.1].iter().map(|y: &f64| 2.0 * (y - 6.0) / (1.0 + (y - 6.0).powi(2))).collect();
    let want = scores.iter().sum::<f64>().powi(2) / scores.iter().map(|s| s * s).sum::<f64>();
    assert!(near(outer.number("/tests/score/chi_square").unwrap(), want, 1e-9, 0.0));
}

#[test]
fn an_active_edge_is_told() {
    let data = "y,x,z\n1.0,0,0\n2.1,1,1\n2.9,2,3\n4.2,3,1\n4.8,4,5\n6.1,5,4\n6.6,6,7\n8.2,7,5\n";
    let study = "[data]\nfile = \"data.csv\"\n[model]\nfamily = \"normal\"\nresponse = \"y\"\n[model.mean]\nterms = [\"x\", \"z\"]\n\
                 range = { z = \"[0, inf)\" }\n[tested]\nslope = \"mean.x = 1\"\n";
    let fit = fit(data, study, &[]);
    assert_eq!(fit.verdict(), "strict maximum");
    let z = fit.list("/restricted/estimates").iter().find(|e| e["name"] == "mean.z").unwrap();
    assert_eq!((z["value"].as_f64(), z["edge"].as_str()), (Some(0.0), Some("lower")), "{z}");
    assert!(fit.warned("nuisance-on-edge"), "{}", fit.warnings());
    assert!(!fit.list("/restricted/certificate/edges").is_empty());
}

#[test]
fn redundant_restrictions_lower_the_degrees_of_freedom_and_are_named() {
    let data = table(&[("a", 14), ("b", 25), ("c", 19)]);
    let study = format!(
        "{COUNTED}[tested]\nfirst = \"share.a = share.b\"\nsecond = \"share.b = share.c\"\nthird = \"share.a = share.c\"\n"
    );
    let fit = fit(&data, &study, &["--information", "expected"]);
    assert_eq!(fit.number("/tests/score/df"), Some(2.0));
    // Pearson's statistic against equal shares, 58/3 each.
    let e = 58.0 / 3.0;
    let want = [14.0, 25.0, 19.0].iter().map(|o: &f64| (o - e).powi(2) / e).sum::<f64>();
    assert!(near(fit.number("/tests/score/chi_square").unwrap(), want, 1e-9, 0.0));
    assert!(fit.warnings().contains("third"), "{}", fit.warnings());
}

#[test]
fn nothing_left_free_is_still_an_answer() {
    let data = table(&[("a", 14), ("b", 25), ("c", 19)]);
    let study = format!("{COUNTED}[tested]\nfirst = \"share.a = 0.3\"\nsecond = \"share.b = 0.3\"\n");
    let fit = fit(&data, &study, &["--information", "expected"]);
    assert_eq!(fit.verdict(), "strict maximum");
    assert!(fit.value["restricted"]["certificate"]["curvature_min"].is_null());
    let e = [0.3 * 58.0, 0.3 * 58.0, 0.4 * 58.0];
    let want = [14.0, 25.0, 19.0].iter().zip(e).map(|(o, e): (&f64, f64)| (o - e).powi(2) / e).sum::<f64>();
    assert!(near(fit.number("/tests/score/chi_square").unwrap(), want, 1e-9, 0.0));
    assert!(
        fit.list("/restricted/estimates").iter().all(|e| e["se"] == 0.0),
        "{}",
        fit.value["restricted"]["estimates"]
    );
}
