//! Normal samples: means, standard deviations, both, and coefficients of variation. Invented numbers, published formulas.

use super::{estimate, fit, grouped, mean, root, spread, test, variance};

const NORTH: &[f64] = &[9.7, 10.4, 9.1, 10.9, 9.9, 10.2];
const MIDDLE: &[f64] = &[10.8, 11.9, 10.1, 12.6, 11.3];
const SOUTH: &[f64] = &[12.2, 9.6, 14.1, 11.0, 13.3, 10.3, 12.7];
const KILNS: [(&str, &[f64]); 3] = [("north", NORTH), ("middle", MIDDLE), ("south", SOUTH)];

fn all() -> Vec<f64> {
    KILNS.iter().flat_map(|k| k.1.iter().copied()).collect()
}

fn study(settings: &str, tested: &str) -> String {
    format!("[model]\nfamily = \"normal\"\nresponse = \"y\"\nper = \"group\"\n{settings}[tested]\n{tested}")
}

/// Equal means, one standard deviation: score n R^2, likelihood ratio and Wald by the same ratio of sums of squares (Savin 1976,
/// Econometrica 44; Berndt and Savin 1977, Econometrica 45: Wald >= likelihood ratio >= score).
#[test]
fn equal_means_with_one_sd() {
    let fit = fit(&grouped(&KILNS), &study("[model.sd]\nshared = true\n", "same = \"equal(*.mean)\"\n"), &[]);
    let (n, total, within) = (18.0, spread(&all()), KILNS.iter().map(|k| spread(k.1)).sum::<f64>());
    estimate(&fit, "south.mean", mean(&all()));
    estimate(&fit, "sd", variance(&all()).sqrt());
    test(&fit, "score", 2.0, n * (1.0 - within / total));
    test(&fit, "lr", 2.0, n * (total / within).ln());
    test(&fit, "wald", 2.0, n * (total / within - 1.0));
}

/// Equal standard deviations, means free: the L1 criterion of Neyman and Pearson (1931), Bulletin de l'Academie Polonaise A;
/// its small-sample form is Bartlett's (1937), Proceedings of the Royal Society A 160.
#[test]
fn equal_sds_with_free_means() {
    let fit = fit(&grouped(&KILNS), &study("", "same = \"equal(*.sd)\"\n"), &[]);
    let pooled = KILNS.iter().map(|k| spread(k.1)).sum::<f64>() / 18.0;
    estimate(&fit, "north.sd", pooled.sqrt());
    let each = |f: &dyn Fn(f64) -> f64| KILNS.iter().map(|k| k.1.len() as f64 * f(variance(k.1) / pooled)).sum();
    test(&fit, "lr", 2.0, each(&|r| -r.ln()));
    test(&fit, "score", 2.0, each(&|r| 0.5 * (r - 1.0).powi(2)));
}

/// Equal means and equal standard deviations: the L0 criterion of Neyman and Pearson (1931).
#[test]
fn one_normal_population() {
    let fit = fit(&grouped(&KILNS), &study("", "means = \"equal(*.mean)\"\nsds = \"equal(*.sd)\"\n"), &[]);
    let (m, v) = (mean(&all()), variance(&all()));
    estimate(&fit, "middle.sd", v.sqrt());
    test(&fit, "lr", 4.0, KILNS.iter().map(|k| k.1.len() as f64 * (v / variance(k.1)).ln()).sum());
    let score = KILNS.iter().map(|k| {
        let (n, d) = (k.1.len() as f64, mean(k.1) - m);
        n * d * d / v + 0.5 * n * ((variance(k.1) + d * d) / v - 1.0).powi(2)
    });
    test(&fit, "score", 4.0, score.sum());
}

/// Equal means of two samples with standard deviations of their own (the problem of Behrens and Fisher): the common mean is the
/// root of a cubic (Sugiura and Gupta 1987, Communications in Statistics A 16).
#[test]
fn equal_means_with_two_sds() {
    let two = [KILNS[1], KILNS[2]];
    let fit = fit(&grouped(&two), &study("", "same = \"middle.mean = south.mean\"\n"), &[]);
    let slope = |m: f64| {
        two.iter().map(move |k| k.1.len() as f64 * (mean(k.1) - m) / (variance(k.1) + (mean(k.1) - m).powi(2)))
    };
    let m = root(mean(MIDDLE), mean(SOUTH), |m| slope(m).sum());
    estimate(&fit, "south.mean", m);
    estimate(&fit, "south.sd", (variance(SOUTH) + (mean(SOUTH) - m).powi(2)).sqrt());
    let each = |f: &dyn Fn(f64, f64) -> f64| {
        two.iter().map(|k| k.1.len() as f64 * f((mean(k.1) - m).powi(2), variance(k.1))).sum()
    };
    test(&fit, "score", 1.0, each(&|d, v| d / (v + d)));
    test(&fit, "lr", 1.0, each(&|d, v| (d / v).ln_1p()));
}

/// Equal coefficients of variation: the restricted equations and the score statistic of Gupta and Ma (1996), Communications in
/// Statistics A 25; the likelihood ratio is Lohrding's (1969), Annals of Mathematical Statistics 40.
#[test]
fn equal_coefficients_of_variation() {
    let tested = "same = \"north.sd / north.mean = middle.sd / middle.mean = south.sd / south.mean\"\n";
    let fit = fit(&grouped(&KILNS), &study("", tested), &[]);
    // the mean of a sample under a given coefficient, and the coefficient at which sum n (ybar / mean - 1) = 0
    let at = |c: f64, k: &[f64]| {
        let (y, v) = (mean(k), variance(k));
        ((y * y + 4.0 * c * c * (v + y * y)).sqrt() - y) / (2.0 * c * c)
    };
    let c = root(0.01, 1.0, |c| KILNS.iter().map(|k| k.1.len() as f64 * (mean(k.1) / at(c, k.1) - 1.0)).sum());
    let (mut score, mut ratio) = (0.0, 0.0);
    for (name, k) in KILNS {
        let (n, m) = (k.len() as f64, at(c, k));
        let (s, d) = (c * m, mean(k) - m);
        estimate(&fit, &format!("{name}.mean"), m);
        estimate(&fit, &format!("{name}.sd"), s);
        let r = (variance(k) + d * d) / (s * s);
        score += n * d * d / (s * s) + 0.5 * n * (r - 1.0).powi(2);
        ratio += n * ((s * s / variance(k)).ln() + r - 1.0);
    }
    test(&fit, "score", 2.0, score);
    test(&fit, "lr", 2.0, ratio);
}
