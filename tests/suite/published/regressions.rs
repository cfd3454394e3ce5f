//! Regressions: a slope of one, and a standard deviation that follows a covariate.

use super::{fit, same, test};
use crate::harness::root;

/// Norris (Statistical Reference Datasets, National Institute of Standards and Technology): certified slope, its standard
/// deviation, 36 observations. By Savin (1976), Econometrica 44, all three tests of a linear restriction are functions of t.
#[test]
fn a_slope_of_one_by_certified_values() {
    let data = std::fs::read_to_string(root().join("tests/data/nist/norris.csv")).unwrap();
    let study = "[model]\nfamily = \"normal\"\nresponse = \"y\"\n[model.mean]\nterms = [\"x\"]\n[tested]\none = \"mean.x = 1\"\n";
    let fit = fit(&data, study, &[]);
    let t = (1.002_116_818_020_45 - 1.0) / 0.429_796_848_199_937e-3;
    let w = t * t / 34.0;
    test(&fit, "wald", 1.0, 36.0 * w);
    test(&fit, "lr", 1.0, 36.0 * f64::ln_1p(w));
    test(&fit, "score", 1.0, 36.0 * w / (1.0 + w));
}

/// Breusch and Pagan (1979), Econometrica 47: half the explained sum of squares of e^2 / sd^2 on the covariates of the
/// standard deviation, whose logarithm is linear in them (Cook and Weisberg 1983, Biometrika 70). Invented.
#[test]
fn a_constant_sd() {
    let x = [1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0, 10.0];
    let y = [2.1, 3.8, 6.3, 7.6, 10.9, 11.2, 15.1, 14.6, 20.3, 17.9];
    let rows = x.iter().zip(y).map(|(x, y)| format!("{x},{y}\n"));
    let data = format!("x,y\n{}", rows.collect::<String>());
    let study = "[model]\nfamily = \"normal\"\nresponse = \"y\"\n[model.mean]\nterms = [\"x\"]\n[model.sd]\nterms = [\"x\"]\n\
                 [tested]\nconstant = \"sd.x = 0\"\n";
    let fit = fit(&data, study, &[]);
    let mx = super::mean(&x);
    let my = super::mean(&y);
    let sxx = super::spread(&x);
    let slope = x.iter().zip(y).map(|(x, y)| (x - mx) * (y - my)).sum::<f64>() / sxx;
    let e: Vec<f64> = x.iter().zip(y).map(|(x, y)| (y - my - slope * (x - mx)).powi(2)).collect();
    let v = super::mean(&e);
    let along = x.iter().zip(&e).map(|(x, e)| (x - mx) * e / v).sum::<f64>();
    test(&fit, "score", 1.0, 0.5 * along * along / sxx);
    same("sd", fit.estimate("restricted", "sd.intercept", "value"), 0.5 * v.ln());
    same("pull", fit.tested("value")[0], along);
}
