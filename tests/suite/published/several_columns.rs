//! Several response columns: correlations, mean vectors, variances of pairs, shares. Invented numbers, published formulas.

use super::{estimate, fit, mean, test, variance};

const WIDTH: [f64; 8] = [4.1, 5.0, 3.7, 4.4, 5.6, 4.9, 3.9, 5.2];
const LENGTH: [f64; 8] = [9.9, 11.2, 9.1, 10.8, 11.9, 10.1, 9.6, 12.4];
const WEIGHT: [f64; 8] = [2.0, 2.6, 2.3, 1.9, 2.4, 2.8, 1.7, 2.2];

fn data() -> String {
    let rows = (0..8).map(|i| format!("{},{},{}\n", WIDTH[i], LENGTH[i], WEIGHT[i]));
    format!("width,length,weight\n{}", rows.collect::<String>())
}

fn study(columns: &[&str], tested: &str) -> String {
    format!("[model]\nfamily = \"multivariate_normal\"\nresponse = {columns:?}\n[tested]\n{tested}")
}

fn covariance(x: &[f64], y: &[f64]) -> f64 {
    let (a, b) = (mean(x), mean(y));
    x.iter().zip(y).map(|(x, y)| (x - a) * (y - b)).sum::<f64>() / x.len() as f64
}

fn correlation(x: &[f64], y: &[f64]) -> f64 {
    covariance(x, y) / (variance(x) * variance(y)).sqrt()
}

/// Correlation zero: score n r^2, likelihood ratio -n log(1 - r^2) (Anderson 1958, Introduction to Multivariate Statistical
/// Analysis, ch. 4; Breusch and Pagan 1980, Review of Economic Studies 47).
#[test]
fn no_correlation() {
    let fit = fit(&data(), &study(&["width", "length"], "none = \"corr.width.length = 0\"\n"), &[]);
    let r = correlation(&WIDTH, &LENGTH);
    test(&fit, "score", 1.0, 8.0 * r * r);
    test(&fit, "lr", 1.0, -8.0 * (1.0 - r * r).ln());
    estimate(&fit, "sd.length", variance(&LENGTH).sqrt());
}

/// No correlation in three columns: score n times the sum of squared correlations (Breusch and Pagan 1980), likelihood ratio
/// minus n times the log determinant of the correlations (Wilks 1935, Econometrica 3).
#[test]
fn independent_columns() {
    let tested = "a = \"corr.width.length = 0\"\nb = \"corr.width.weight = 0\"\nc = \"corr.length.weight = 0\"\n";
    let fit = fit(&data(), &study(&["width", "length", "weight"], tested), &[]);
    let [a, b, c] = [correlation(&WIDTH, &LENGTH), correlation(&WIDTH, &WEIGHT), correlation(&LENGTH, &WEIGHT)];
    test(&fit, "score", 3.0, 8.0 * (a * a + b * b + c * c));
    let determinant = 1.0 - a * a - b * b - c * c + 2.0 * a * b * c;
    test(&fit, "lr", 3.0, -8.0 * determinant.ln());
}

/// A mean vector: Hotelling (1931), Annals of Mathematical Statistics 2. With q = d' S^-1 d, S divided by n, the likelihood
/// ratio is n log(1 + q), the score test n q / (1 + q), the Wald test n q.
#[test]
fn a_mean_vector() {
    let fit = fit(&data(), &study(&["width", "length"], "w = \"mean.width = 4.5\"\nl = \"mean.length = 10\"\n"), &[]);
    let (u, v) = (mean(&WIDTH) - 4.5, mean(&LENGTH) - 10.0);
    let (a, b, c) = (variance(&WIDTH), covariance(&WIDTH, &LENGTH), variance(&LENGTH));
    let q = (c * u * u - 2.0 * b * u * v + a * v * v) / (a * c - b * b);
    test(&fit, "score", 2.0, 8.0 * q / (1.0 + q));
    test(&fit, "lr", 2.0, 8.0 * q.ln_1p());
    test(&fit, "wald", 2.0, 8.0 * q);
}

/// Equal variances of paired measurements: sum and difference uncorrelated (Pitman 1939, Morgan 1939, Biometrika 31).
#[test]
fn equal_variances_of_a_pair() {
    let fit = fit(&data(), &study(&["width", "length"], "same = \"sd.width = sd.length\"\n"), &[]);
    let sums: Vec<f64> = (0..8).map(|i| WIDTH[i] + LENGTH[i]).collect();
    let differences: Vec<f64> = (0..8).map(|i| WIDTH[i] - LENGTH[i]).collect();
    let r = correlation(&sums, &differences);
    test(&fit, "score", 1.0, 8.0 * r * r);
    test(&fit, "lr", 1.0, -8.0 * (1.0 - r * r).ln());
    estimate(&fit, "sd.width", (0.5 * (variance(&WIDTH) + variance(&LENGTH))).sqrt());
}

/// Shares spread evenly: Dirichlet with all concentrations one. Score n (psi(3) - psi(1)) + sum of log y, information n times
/// (psi'(1) where equal, less psi'(3)), psi(3) - psi(1) = 3/2, psi'(3) = psi'(1) - 5/4, psi'(1) = pi^2 / 6 (Kotz,
/// Balakrishnan and Johnson, Continuous Multivariate Distributions 1, ch. 49).
#[test]
fn shares_spread_evenly() {
    let rows = [[0.2, 0.5, 0.3], [0.35, 0.4, 0.25], [0.1, 0.65, 0.25], [0.3, 0.3, 0.4], [0.25, 0.6, 0.15]];
    let lines = rows.iter().map(|[a, b, c]| format!("{a},{b},{c}\n"));
    let data = format!("clay,sand,ash\n{}", lines.collect::<String>());
    let study = "[model]\nfamily = \"dirichlet\"\nresponse = [\"clay\", \"sand\", \"ash\"]\n[tested]\n\
                 even = \"alpha.clay = alpha.sand = alpha.ash = 1\"\n";
    let fit = fit(&data, study, &[]);
    let u: Vec<f64> = (0..3).map(|j| 7.5 + rows.iter().map(|r: &[f64; 3]| r[j].ln()).sum::<f64>()).collect();
    // (t I - s 1 1')^-1 = (I + s 1 1' / (t - 3 s)) / t
    let t = std::f64::consts::PI.powi(2) / 6.0;
    let s = t - 1.25;
    let (square, sum) = (u.iter().map(|x| x * x).sum::<f64>(), u.iter().sum::<f64>());
    test(&fit, "score", 3.0, (square + s * sum * sum / (t - 3.0 * s)) / (5.0 * t));
}
