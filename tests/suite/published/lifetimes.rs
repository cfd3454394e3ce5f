//! Lifetimes and other positive responses: exponential, Weibull, gamma, inverse Gaussian, Pareto, Rayleigh.

use super::{estimate, fit, grouped, mean, printed, test};

/// Remission times in weeks of 42 patients, 1: relapse seen, 0: still in remission (Freireich and others 1963, Blood 21; Gehan
/// 1965, Biometrika 52; from memory: totals 359 and 182 weeks, 9 and 21 relapses as published).
const TREATED: [(f64, f64); 21] = [
    (6.0, 1.0),
    (6.0, 1.0),
    (6.0, 1.0),
    (6.0, 0.0),
    (7.0, 1.0),
    (9.0, 0.0),
    (10.0, 1.0),
    (10.0, 0.0),
    (11.0, 0.0),
    (13.0, 1.0),
    (16.0, 1.0),
    (17.0, 0.0),
    (19.0, 0.0),
    (20.0, 0.0),
    (22.0, 1.0),
    (23.0, 1.0),
    (25.0, 0.0),
    (32.0, 0.0),
    (32.0, 0.0),
    (34.0, 0.0),
    (35.0, 0.0),
];
const OTHERS: [f64; 21] =
    [1.0, 1.0, 2.0, 2.0, 3.0, 4.0, 4.0, 5.0, 5.0, 8.0, 8.0, 8.0, 8.0, 11.0, 11.0, 12.0, 12.0, 15.0, 17.0, 22.0, 23.0];

/// Equal exponential rates with censoring: Cox and Oakes (1984), Analysis of Survival Data, ch. 3, who print a likelihood ratio
/// of 16.49 (from memory). With d events in T weeks the score of a rate is d / rate - T and its observed information d / rate^2.
#[test]
fn equal_exponential_rates() {
    let rows = TREATED.iter().map(|(t, e)| format!("treated,{t},{e}\n"));
    let others = OTHERS.iter().map(|t| format!("others,{t},1\n"));
    let data = format!("group,weeks,relapse\n{}", rows.chain(others).collect::<String>());
    let study = "[model]\nfamily = \"exponential\"\nresponse = \"weeks\"\nevent = \"relapse\"\nper = \"group\"\n\
                 [tested]\nsame = \"equal(*.rate)\"\n";
    let fit = fit(&data, study, &[]);
    let total = TREATED.iter().map(|t| t.0).sum::<f64>();
    assert_eq!((total, OTHERS.iter().sum::<f64>()), (359.0, 182.0));
    let rate: f64 = 30.0 / 541.0;
    estimate(&fit, "treated.rate", rate);
    let groups: [(f64, f64); 2] = [(9.0, 359.0), (21.0, 182.0)];
    test(&fit, "score", 1.0, groups.iter().map(|(d, t)| (d - rate * t).powi(2) / d).sum());
    let ratio = groups.iter().map(|(d, t)| 2.0 * d * (d / t / rate).ln()).sum();
    test(&fit, "lr", 1.0, ratio);
    printed("likelihood ratio", ratio, 16.49, 0.01);
}

/// Weibull shape one with censoring, by the score of the shape at exponential lives and observed information (Cox and Oakes
/// 1984, section 3.7): with z = t / scale, d + sum of log z over events - sum of z log z.
#[test]
fn a_weibull_shape_of_one() {
    let rows = TREATED.iter().map(|(t, e)| format!("{t},{e}\n"));
    let data = format!("weeks,relapse\n{}", rows.collect::<String>());
    let study =
        "[model]\nfamily = \"weibull\"\nresponse = \"weeks\"\nevent = \"relapse\"\n[tested]\none = \"shape = 1\"\n";
    let fit = fit(&data, study, &[]);
    let (d, scale) = (9.0, 359.0 / 9.0);
    estimate(&fit, "scale", scale);
    let sum = |f: &dyn Fn(f64, f64) -> f64| TREATED.iter().map(|&(t, e)| f(t / scale, e)).sum::<f64>();
    let zl = sum(&|z, _| z * z.ln());
    let score = d + sum(&|z, e| e * z.ln()) - zl;
    let information = d + sum(&|z, _| z * z.ln().powi(2)) - zl * zl / d;
    test(&fit, "score", 1.0, score * score / information);
}

/// The analysis of reciprocals: equal means of inverse Gaussian samples of one shape (Tweedie 1957, Annals of Mathematical
/// Statistics 28). Invented.
#[test]
fn equal_means_of_inverse_gaussian_samples() {
    let samples: [(&str, &[f64]); 3] = [
        ("north", &[1.9, 2.6, 2.2, 3.4, 1.7]),
        ("middle", &[2.9, 4.4, 3.1, 2.5]),
        ("south", &[2.3, 5.8, 4.1, 3.6, 4.9, 2.8]),
    ];
    let study = "[model]\nfamily = \"inverse_gaussian\"\nresponse = \"y\"\nper = \"group\"\n[model.shape]\nshared = true\n\
                 [tested]\nsame = \"equal(*.mean)\"\n";
    let fit = fit(&grouped(&samples), study, &[]);
    let all: Vec<f64> = samples.iter().flat_map(|s| s.1.iter().copied()).collect();
    let excess = |x: &[f64]| x.iter().map(|v| 1.0 / v - 1.0 / mean(x)).sum::<f64>();
    let (n, within) = (all.len() as f64, samples.iter().map(|s| excess(s.1)).sum::<f64>());
    estimate(&fit, "north.mean", mean(&all));
    estimate(&fit, "shape", n / excess(&all));
    test(&fit, "lr", 2.0, n * (excess(&all) / within).ln());
}

/// A ratio of two Pareto shapes with known minimum: logarithms over the minimum are exponential (Muniruzzaman 1957, Bulletin of
/// the Calcutta Statistical Association 7). Invented.
#[test]
fn a_ratio_of_two_pareto_shapes() {
    let samples: [(&str, &[f64]); 2] =
        [("a", &[2.1, 2.4, 2.2, 3.9, 2.7, 5.1]), ("b", &[2.6, 9.7, 4.4, 3.1, 21.0, 2.3, 6.6])];
    let study = "[model]\nfamily = \"pareto\"\nresponse = \"y\"\nminimum = { known = 2 }\nper = \"group\"\n\
                 [tested]\ndouble = \"a.shape = 2 * b.shape\"\n";
    let fit = fit(&grouped(&samples), study, &[]);
    let sums = samples.map(|s| s.1.iter().map(|y| (y / 2.0).ln()).sum::<f64>());
    let counts = [6.0, 7.0];
    let b = 13.0 / (2.0 * sums[0] + sums[1]);
    estimate(&fit, "b.shape", b);
    let shapes = [2.0 * b, b];
    let score = (0..2).map(|k| (counts[k] - shapes[k] * sums[k]).powi(2) / counts[k]).sum();
    test(&fit, "score", 1.0, score);
    test(&fit, "lr", 1.0, (0..2).map(|k| 2.0 * counts[k] * (counts[k] / sums[k] / shapes[k]).ln()).sum());
}

/// Equal scales of Rayleigh samples: squares are exponential (Siddiqui 1962, Journal of Research of the National Bureau of
/// Standards 66D; the tests are those of equal exponential rates, Sukhatme 1936, Statistical Research Memoirs 1). Invented.
#[test]
fn equal_scales_of_rayleigh_samples() {
    let samples: [(&str, &[f64]); 2] = [("a", &[0.7, 1.9, 1.2, 2.6, 0.4]), ("b", &[2.2, 3.1, 1.4, 4.0, 2.9, 3.3, 1.1])];
    let study =
        "[model]\nfamily = \"rayleigh\"\nresponse = \"y\"\nper = \"group\"\n[tested]\nsame = \"equal(*.scale)\"\n";
    let fit = fit(&grouped(&samples), study, &[]);
    let square = |x: &[f64]| x.iter().map(|v| v * v).sum::<f64>() / (2.0 * x.len() as f64);
    let all: Vec<f64> = samples.iter().flat_map(|s| s.1.iter().copied()).collect();
    estimate(&fit, "a.scale", square(&all).sqrt());
    let each = |f: &dyn Fn(f64) -> f64| samples.iter().map(|s| s.1.len() as f64 * f(square(s.1) / square(&all))).sum();
    test(&fit, "score", 1.0, each(&|r| (r - 1.0).powi(2)));
    test(&fit, "lr", 1.0, each(&|r| -2.0 * r.ln()));
}

/// Exponential against gamma: Moran (1951), Journal of the Royal Statistical Society B 13. Invented.
#[test]
fn a_gamma_shape_of_one() {
    let y = [0.4, 2.9, 1.3, 0.7, 3.8, 2.2, 1.9, 0.9, 2.6, 1.1];
    let data = y.iter().fold("y\n".to_owned(), |out, y| format!("{out}{y}\n"));
    let study = "[model]\nfamily = \"gamma\"\nresponse = \"y\"\n[tested]\none = \"shape = 1\"\n";
    let fit = fit(&data, study, &[]);
    let m = mean(&y);
    estimate(&fit, "scale", m);
    let euler = 0.577_215_664_901_532_9;
    let score = y.iter().map(|y| (y / m).ln()).sum::<f64>() + 10.0 * euler;
    test(&fit, "score", 1.0, score * score / (10.0 * (std::f64::consts::PI.powi(2) / 6.0 - 1.0)));
}
