//! Poisson and binomial laws against wider families that hold them on an edge, and tables given their margins.

use super::two_by_two::ADMISSIONS;
use super::{estimate, fit, mean, printed, test};

/// Poisson against negative binomial: Collings and Margolin (1985), Journal of the American Statistical Association 80; Dean and
/// Lawless (1989), the same, 84. Invented counts.
#[test]
fn a_negative_binomial_dispersion_of_zero() {
    let y = [0.0, 3.0, 1.0, 7.0, 2.0, 0.0, 5.0, 1.0, 4.0, 0.0, 9.0, 2.0];
    let data = y.iter().fold("flaws\n".to_owned(), |out, y| format!("{out}{y}\n"));
    let study = "[model]\nfamily = \"negative_binomial\"\nresponse = \"flaws\"\n[tested]\nnone = \"dispersion = 0\"\n";
    let fit = fit(&data, study, &[]);
    let m = mean(&y);
    estimate(&fit, "mean", m);
    let excess: f64 = y.iter().map(|y| (y - m).powi(2) - y).sum();
    test(&fit, "score", 1.0, excess.powi(2) / (2.0 * 12.0 * m * m));
}

/// Binomial against beta-binomial: Tarone (1979), Biometrika 66. Invented counts.
#[test]
fn a_beta_binomial_overdispersion_of_zero() {
    let rows: [(f64, f64); 8] =
        [(3.0, 10.0), (9.0, 12.0), (1.0, 8.0), (7.0, 10.0), (2.0, 11.0), (6.0, 9.0), (0.0, 7.0), (5.0, 10.0)];
    let data = rows.iter().fold("x,n\n".to_owned(), |out, (x, n)| format!("{out}{x},{n}\n"));
    let study = "[model]\nfamily = \"beta_binomial\"\nresponse = \"x\"\ntrials = \"n\"\n[tested]\nnone = \"overdispersion = 0\"\n";
    let fit = fit(&data, study, &[]);
    let n: f64 = rows.iter().map(|r| r.1).sum();
    let p = rows.iter().map(|r| r.0).sum::<f64>() / n;
    let s: f64 = rows.iter().map(|(x, n)| (x - n * p).powi(2) / (p * (1.0 - p))).sum();
    estimate(&fit, "mean", p);
    test(&fit, "score", 1.0, (s - n).powi(2) / (2.0 * rows.iter().map(|r| r.1 * (r.1 - 1.0)).sum::<f64>()));
}

/// Several two-by-two tables given their margins, odds ratio one: Mantel and Haenszel (1959), Journal of the National Cancer
/// Institute 22, without their correction; 1.52 for these tables (from memory).
#[test]
fn an_odds_ratio_of_one_given_margins() {
    let mut data = "admitted,women,places,refusals\n".to_owned();
    let (mut u, mut v) = (0.0, 0.0);
    for (_, [x, n, y, m]) in ADMISSIONS {
        let (t, all) = (x + y, n + m);
        data += &format!("{y},{m},{t},{}\n", all - t);
        u += y - m * t / all;
        v += n * m * t * (all - t) / (all * all * (all - 1.0));
    }
    let study = "[model]\nfamily = \"hypergeometric\"\nresponse = \"admitted\"\ntrials = \"women\"\nsuccesses = \"places\"\n\
                 failures = \"refusals\"\n[tested]\nnone = \"odds_ratio = 1\"\n";
    let fit = fit(&data, study, &[]);
    test(&fit, "score", 1.0, u * u / v);
    printed("Mantel-Haenszel", u * u / v, 1.52, 0.01);
}
