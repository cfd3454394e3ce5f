//! Published worked examples and published formulas of restricted fits and score tests, through the library families. The
//! answer of each is a closed form (held to 1e-9) whose source stands beside it; figures that a publication prints are
//! checked to the digits printed. Data are published tables (from memory where said) or invented numbers; for the latter the
//! formula's source is the outside check. More examples, with answers at 50 digits, lie in `tests/cases`.

mod counts;
mod lifetimes;
mod normals;
mod overdispersed;
mod regressions;
mod several_columns;
mod tables;
mod two_by_two;

use crate::harness::{Fit, Folder, near};

/// Relative agreement with a closed form: the search stops at a scaled gradient of 1e-7, past which quadratic convergence
/// leaves only rounding, of the sums on both sides.
const EXACT: f64 = 1e-9;

fn fit(data: &str, study: &str, options: &[&str]) -> Fit {
    let folder = Folder::new();
    folder.write("data.csv", data);
    let fit = folder.fit(&format!("[data]\nfile = \"data.csv\"\n{study}"), options);
    assert_eq!(fit.verdict(), "strict maximum", "{}{}", fit.err, fit.warnings());
    fit
}

/// A test's chi-square and degrees of freedom.
#[track_caller]
fn test(fit: &Fit, name: &str, df: f64, want: f64) {
    let got = fit.number(&format!("/tests/{name}/chi_square"));
    assert_eq!(fit.number(&format!("/tests/{name}/df")), Some(df), "{name}: {}", fit.warnings());
    same(name, got, want);
}

#[track_caller]
fn estimate(fit: &Fit, name: &str, want: f64) {
    same(name, fit.estimate("restricted", name, "value"), want);
}

#[track_caller]
fn same(what: &str, got: Option<f64>, want: f64) {
    assert!(got.is_some_and(|g| near(g, want, EXACT, 1e-12)), "{what}: {got:?}, not {want}");
}

/// A figure as printed: within half a unit of its last digit, `unit`.
#[track_caller]
fn printed(what: &str, got: f64, figure: f64, unit: f64) {
    assert!((got - figure).abs() <= 0.5 * unit * (1.0 + 1e-9), "{what}: {got}, printed {figure}");
}

fn mean(x: &[f64]) -> f64 {
    x.iter().sum::<f64>() / x.len() as f64
}

/// Sum of squared deviations from the mean.
fn spread(x: &[f64]) -> f64 {
    x.iter().map(|v| (v - mean(x)).powi(2)).sum()
}

/// Maximum-likelihood variance: divided by n.
fn variance(x: &[f64]) -> f64 {
    spread(x) / x.len() as f64
}

/// The root of a function that changes its sign between two places.
fn root(mut low: f64, mut high: f64, f: impl Fn(f64) -> f64) -> f64 {
    let rising = f(high) > 0.0;
    assert!(rising != (f(low) > 0.0));
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if (f(middle) > 0.0) == rising { high = middle } else { low = middle }
    }
    0.5 * (low + high)
}

/// Samples as rows `group,y`.
fn grouped(samples: &[(&str, &[f64])]) -> String {
    let rows = samples.iter().flat_map(|(name, y)| y.iter().map(move |v| format!("{name},{v}\n")));
    format!("group,y\n{}", rows.collect::<String>())
}
