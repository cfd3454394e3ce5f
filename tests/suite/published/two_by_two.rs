//! Proportions: one, two compared by difference, ratio and odds ratio, and several two-by-two tables.

use super::{estimate, fit, printed, root, same, test};

const Z: f64 = 1.959_963_984_540_054; // upper 2.5 percent of the normal

/// Wilson (1927), Journal of the American Statistical Association 22: at either end of the interval the score test has
/// chi-square z^2. Newcombe (1998), Statistics in Medicine 17, prints the ends (from memory).
#[test]
fn the_score_interval_of_a_proportion() {
    for (x, n, ends) in
        [(81.0, 263.0, [0.2553, 0.3662]), (15.0, 148.0, [0.0624, 0.1605]), (1.0, 29.0, [0.0061, 0.1718])]
    {
        let p: f64 = x / n;
        for (sign, end) in [(-1.0, ends[0]), (1.0, ends[1])] {
            let half = Z * (p * (1.0 - p) / n + Z * Z / (4.0 * n * n)).sqrt();
            let limit = (p + Z * Z / (2.0 * n) + sign * half) / (1.0 + Z * Z / n);
            printed("end", limit, end, 0.0001);
            let study = format!(
                "[model]\nfamily = \"binomial\"\nresponse = \"x\"\ntrials = \"n\"\n[tested]\nend = \"probability = {limit:?}\"\n"
            );
            let fit = fit(&format!("x,n\n{x},{n}\n"), &study, &[]);
            test(&fit, "score", 1.0, Z * Z);
            let ratio = 2.0 * (x * (p / limit).ln() + (n - x) * ((1.0 - p) / (1.0 - limit)).ln());
            test(&fit, "lr", 1.0, ratio);
        }
    }
}

const TWO: &str = "[model]\nfamily = \"binomial\"\nresponse = \"x\"\ntrials = \"n\"\nper = \"group\"\n[tested]\n";

fn two(x: [f64; 2], n: [f64; 2], tested: &str) -> crate::harness::Fit {
    fit(&format!("group,x,n\na,{},{}\nb,{},{}\n", x[0], n[0], x[1], n[1]), &format!("{TWO}{tested}"), &[])
}

/// Miettinen and Nurminen (1985), Statistics in Medicine 4, appendix: with p(a) = p(b) + d held, p(b) is the middle root of a
/// cubic, by an arc cosine; the score test (their chi-square without the factor N / (N - 1)) is the squared difference from d
/// over its variance there. Invented counts.
#[test]
fn a_difference_of_two_proportions() {
    let ([x1, x0], [n1, n0], d): ([f64; 2], [f64; 2], f64) = ([48.0, 31.0], [90.0, 84.0], 0.05);
    let fit = two([x1, x0], [n1, n0], "apart = \"a.probability = b.probability + 0.05\"\n");
    let (n, c) = (n1 + n0, x1 + x0);
    let l3 = n;
    let l2 = (n1 + 2.0 * n0) * d - n - c;
    let l1 = (n0 * d - n - 2.0 * x0) * d + c;
    let l0 = x0 * d * (1.0 - d);
    let q = l2.powi(3) / (3.0 * l3).powi(3) - l1 * l2 / (6.0 * l3 * l3) + l0 / (2.0 * l3);
    let p = q.signum() * (l2 * l2 / (3.0 * l3).powi(2) - l1 / (3.0 * l3)).sqrt();
    let a = (std::f64::consts::PI + (q / p.powi(3)).acos()) / 3.0;
    let low = 2.0 * p * a.cos() - l2 / (3.0 * l3);
    let high = low + d;
    estimate(&fit, "b.probability", low);
    estimate(&fit, "a.probability", high);
    let variance = high * (1.0 - high) / n1 + low * (1.0 - low) / n0;
    test(&fit, "score", 1.0, (x1 / n1 - x0 / n0 - d).powi(2) / variance);
}

/// The same for a ratio, p(a) = r p(b): a quadratic (Miettinen and Nurminen 1985; Farrington and Manning 1990, Statistics in
/// Medicine 9; Koopman 1984, Biometrics 40). Invented counts.
#[test]
fn a_ratio_of_two_proportions() {
    let ([x1, x0], [n1, n0], r): ([f64; 2], [f64; 2], f64) = ([36.0, 16.0], [40.0, 80.0], 3.0);
    let fit = two([x1, x0], [n1, n0], "times = \"a.probability = 3 * b.probability\"\n");
    let (a, b, c) = (r * (n1 + n0), -(r * (n1 + x0) + x1 + n0), x1 + x0);
    let low = (-b - (b * b - 4.0 * a * c).sqrt()) / (2.0 * a);
    let high = r * low;
    estimate(&fit, "b.probability", low);
    let variance = high * (1.0 - high) / n1 + r * r * low * (1.0 - low) / n0;
    test(&fit, "score", 1.0, (x1 / n1 - r * x0 / n0).powi(2) / variance);
    let koopman = (x1 - n1 * high).powi(2) / (n1 * high * (1.0 - high)) * (1.0 + n1 * (r - high) / (n0 * (1.0 - high)));
    same("Koopman", fit.number("/tests/score/chi_square"), koopman);
}

/// And for an odds ratio: Cornfield (1956), Proceedings of the Third Berkeley Symposium 4. Smokers among 649 men with
/// carcinoma of the lung and 649 others (Doll and Hill 1950, British Medical Journal 2; from memory): 647 and 622.
#[test]
fn an_odds_ratio() {
    let ([x1, x0], [n1, n0], ratio): ([f64; 2], [f64; 2], f64) = ([647.0, 622.0], [649.0, 649.0], 4.0);
    let fit = two([x1, x0], [n1, n0], "odds = \"logit(a.probability) - logit(b.probability) = log(4)\"\n");
    let m = x1 + x0;
    // fitted count in the first cell, margins as seen
    let x = root(m - n0 + 1e-9, n1, |x| x * (n0 - m + x) - ratio * (n1 - x) * (m - x));
    estimate(&fit, "a.probability", x / n1);
    estimate(&fit, "b.probability", (m - x) / n0);
    let precision = 1.0 / x + 1.0 / (n1 - x) + 1.0 / (m - x) + 1.0 / (n0 - m + x);
    test(&fit, "score", 1.0, (x1 - x).powi(2) * precision);
}

/// Admissions of men and women in six departments (Bickel, Hammel and O'Connell 1975, Science 187; from memory):
/// (men admitted, men, women admitted, women).
pub const ADMISSIONS: [(&str, [f64; 4]); 6] = [
    ("a", [512.0, 825.0, 89.0, 108.0]),
    ("b", [353.0, 560.0, 17.0, 25.0]),
    ("c", [120.0, 325.0, 202.0, 593.0]),
    ("d", [138.0, 417.0, 131.0, 375.0]),
    ("e", [53.0, 191.0, 94.0, 393.0]),
    ("f", [22.0, 373.0, 24.0, 341.0]),
];

fn admissions() -> String {
    let rows = ADMISSIONS.iter().map(|(d, [x, n, y, m])| format!("{d},0,{x},{n}\n{d},1,{y},{m}\n"));
    format!("department,woman,x,n\n{}", rows.collect::<String>())
}

/// Cochran (1954), Biometrics 10: several two-by-two tables, common odds ratio one; the score test of a logistic
/// coefficient with one intercept a table (Day and Byar 1979, Biometrics 35).
#[test]
fn a_common_odds_ratio_of_one() {
    let study = "[model]\nfamily = \"binomial\"\nresponse = \"x\"\ntrials = \"n\"\n[model.probability]\n\
                 terms = [\"department\", \"woman\"]\nlink = \"logit\"\n[tested]\nnone = \"probability.woman = 0\"\n";
    let fit = fit(&admissions(), study, &[]);
    let (mut u, mut v) = (0.0, 0.0);
    for (_, [x, n, y, m]) in ADMISSIONS {
        let p = (x + y) / (n + m);
        u += y - m * p;
        v += n * m / (n + m) * p * (1.0 - p);
    }
    test(&fit, "score", 1.0, u * u / v);
    same("pull", fit.tested("value")[0], u);
}

/// Breslow and Day (1980), Statistical Methods in Cancer Research 1, section 4.4, at the maximum-likelihood common odds
/// ratio: homogeneity of the odds ratios, by fitted counts that solve one quadratic a table.
#[test]
fn homogeneous_odds_ratios() {
    let study = "[model]\nfamily = \"binomial\"\nresponse = \"x\"\ntrials = \"n\"\n[model.probability]\n\
                 terms = [\"department\", \"woman\", [\"department\", \"woman\"]]\nlink = \"logit\"\n[tested]\n\
                 alike = \"probability.department.b:woman = probability.department.c:woman = \
                 probability.department.d:woman = probability.department.e:woman = probability.department.f:woman = 0\"\n";
    let fit = fit(&admissions(), study, &[]);
    // counts of women admitted if the odds ratio is psi in every table
    let fitted = |psi: f64, [x, n, y, m]: [f64; 4]| {
        let t = x + y;
        root((t - n).max(0.0), t.min(m), |a| a * (n - t + a) - psi * (m - a) * (t - a))
    };
    let missed = |log: f64| ADMISSIONS.iter().map(|(_, c)| c[2] - fitted(log.exp(), *c)).sum::<f64>();
    let log = root(-3.0, 3.0, missed);
    estimate(&fit, "probability.woman", log);
    let mut chi_square = 0.0;
    for (_, c @ [x, n, y, m]) in ADMISSIONS {
        let (a, t) = (fitted(log.exp(), c), x + y);
        chi_square += (y - a).powi(2) * (1.0 / a + 1.0 / (m - a) + 1.0 / (t - a) + 1.0 / (n - t + a));
    }
    test(&fit, "score", 5.0, chi_square);
}
