use super::*;

const SUM: &[&str] = &["a + b + c + d = 1"];
const NAMES: &[&str] = &["a", "b", "c", "d"];

/// Counts as Rao (1965) and Dempster, Laird and Rubin (1977) use them, from memory.
fn linkage() -> FromFunctions {
    table(NAMES, &[125.0, 18.0, 20.0, 34.0])
}

fn pearson(counts: &[f64], shares: &Vector) -> f64 {
    let total: f64 = counts.iter().sum();
    counts.iter().zip(shares.iter()).map(|(n, p)| (n - total * p).powi(2) / (total * p)).sum()
}

#[test]
fn the_score_of_a_table_is_pearsons() {
    let counts = [125.0, 18.0, 20.0, 34.0];
    let linkage = linkage();
    let outcome = infer(&linkage, &system(&linkage, SUM, &["b = c", "a - d = 1/2"]), None);
    let score = outcome.score.as_ref().unwrap();
    assert_eq!(score.df, 2);
    close(score.chi_square, pearson(&counts, &outcome.restricted.fit.theta));
    // Standard error of the one free parameter t = 4 d (Rao 1965): a quarter of sqrt(2 t (1-t) (2+t) / (n (1+2t))).
    let t = 4.0 * outcome.restricted.fit.theta[3];
    close(se(&outcome)[3], 0.25 * (2.0 * t * (1.0 - t) * (2.0 + t) / (197.0 * (1.0 + 2.0 * t))).sqrt());
    // theta . grad l = n, so the multipliers times the right-hand sides sum to n; the sum's has no standard error.
    let lambda = |i: usize| outcome.restricted.multipliers[i].value.unwrap();
    close(lambda(0) + lambda(2) / 2.0, 197.0);
    assert!(outcome.restricted.multipliers[0].se.is_none());
}

#[test]
fn each_pull_squared_is_the_score_of_releasing_it_alone() {
    let linkage = linkage();
    for kind in [Information::Expected, Information::Observed, Information::Outer] {
        let joint = infer(&linkage, &system(&linkage, SUM, &["b = c", "a - d = 1/2"]), Some(kind));
        for (j, (one, other)) in [("b = c", "a - d = 1/2"), ("a - d = 1/2", "b = c")].into_iter().enumerate() {
            let maintained = [SUM[0], other];
            let alone = infer(&linkage, &system(&linkage, &maintained, &[one]), Some(kind));
            close(alone.score.unwrap().chi_square, joint.restricted.multipliers[1 + j].z.unwrap().powi(2));
        }
    }
}

#[test]
fn a_multiplier_is_the_slope_of_the_maximum() {
    let linkage = linkage();
    let at = |right: f64| infer(&linkage, &system(&linkage, SUM, &["b = c", &format!("a - d = {right:.17}")]), None);
    let d = 1e-4;
    let (low, high) = (at(0.5 - d).restricted.fit.log_likelihood, at(0.5 + d).restricted.fit.log_likelihood);
    let slope = (high - low) / (2.0 * d);
    let lambda = at(0.5).restricted.multipliers[2].value.unwrap();
    // Differences of l (about 1e2, good to 1e-14) over 2e-4 carry 1e-9, their third-order error about d^2.
    assert!((slope - lambda).abs() < 1e-4 * (1.0 + lambda.abs()), "{slope} {lambda}");
}

#[test]
fn a_hypothesis_plus_a_maintained_restriction_is_the_same() {
    let linkage = linkage();
    let plain = infer(&linkage, &system(&linkage, SUM, &["b = c", "a - d = 1/2"]), None);
    let mixed = infer(&linkage, &system(&linkage, SUM, &["b = c", "a - d + 3*(a + b + c + d) = 7/2"]), None);
    close(plain.score.as_ref().unwrap().chi_square, mixed.score.as_ref().unwrap().chi_square);
    close(plain.restricted.multipliers[2].value.unwrap(), mixed.restricted.multipliers[2].value.unwrap());
    close(plain.restricted.multipliers[2].se.unwrap(), mixed.restricted.multipliers[2].se.unwrap());
}

#[test]
fn nonlinear_hypotheses_in_three_forms() {
    // Hardy-Weinberg and independence are the usual ones; here odds a d = b c in forms that mean the same.
    let counts = table(NAMES, &[60.0, 25.0, 30.0, 40.0]);
    let forms = ["a * d = b * c", "a / b = c / d", "log(a) + log(d) = log(b) + log(c)"];
    let all: Vec<Outcome> = forms.iter().map(|f| infer(&counts, &system(&counts, SUM, &[f]), None)).collect();
    // Pearson's X^2 of a two-by-two table: n (ad - bc)^2 / (row and column sums).
    let (a, b, c, d) = (60.0, 25.0, 30.0, 40.0f64);
    let closed = 155.0 * (a * d - b * c).powi(2) / ((a + b) * (c + d) * (a + c) * (b + d));
    for outcome in &all {
        close(outcome.score.as_ref().unwrap().chi_square, closed);
        close(outcome.lr.as_ref().unwrap().chi_square, all[0].lr.as_ref().unwrap().chi_square);
        for j in 0..4 {
            close(se(outcome)[j], se(&all[0])[j]);
        }
    }
}

#[test]
fn redundant_restrictions_lower_df_and_are_named() {
    let linkage = linkage();
    let plain = infer(&linkage, &system(&linkage, SUM, &["b = c", "a - d = 1/2"]), None);
    for kind in Information::ALL {
        let plain = infer(&linkage, &system(&linkage, SUM, &["b = c", "a - d = 1/2"]), Some(kind));
        let more = infer(&linkage, &system(&linkage, SUM, &["b = c", "a - d = 1/2", "2*a + b + c = 3/2"]), Some(kind));
        let (p, m) = (plain.score.as_ref().unwrap(), more.score.as_ref().unwrap());
        assert_eq!((p.df, m.df), (2, 2));
        close(p.chi_square, m.chi_square);
        close(plain.wald.as_ref().unwrap().chi_square, more.wald.as_ref().unwrap().chi_square);
        let named = more.warnings.iter().find(|w| w.code == "redundant-restriction").unwrap();
        assert!(named.message.starts_with("t3 follows"), "{}", named.message);
        assert!(more.restricted.multipliers[3].value.is_none());
        assert!(more.restricted.multipliers[3].se.is_none());
        close(plain.restricted.multipliers[1].value.unwrap(), more.restricted.multipliers[1].value.unwrap());
        close(plain.restricted.multipliers[1].se.unwrap(), more.restricted.multipliers[1].se.unwrap());
        for j in 0..4 {
            close(se(&plain)[j], se(&more)[j]);
        }
    }
    assert!(!codes(&plain).contains(&"redundant-restriction"));
}

#[test]
fn a_hypothesis_that_follows_from_what_is_maintained_tests_nothing() {
    let linkage = linkage();
    let outcome = infer(&linkage, &system(&linkage, SUM, &["2*a + 2*b + 2*c + 2*d = 2"]), None);
    assert!(outcome.score.as_ref().unwrap_err().contains("nothing to test"));
    assert!(codes(&outcome).contains(&"redundant-restriction"));
}

#[test]
fn no_free_direction_still_has_multipliers_and_a_score() {
    let counts = [315.0, 108.0, 101.0, 32.0];
    // Mendel (1866), seeds by shape and colour, from memory; 9:3:3:1 leaves nothing free.
    let peas = table(NAMES, &counts);
    let outcome = infer(&peas, &system(&peas, SUM, &["a = 9/16", "b = 3/16", "c = 3/16"]), None);
    let shares = Vector::from_vec(vec![9.0, 3.0, 3.0, 1.0]) / 16.0;
    close(outcome.score.as_ref().unwrap().chi_square, pearson(&counts, &shares));
    assert_eq!(outcome.score.as_ref().unwrap().df, 3);
    assert_eq!(se(&outcome), [0.0; 4]);
    assert!(outcome.restricted.multipliers[1].z.is_some());
}

#[test]
fn where_a_maintained_restriction_makes_the_density_only_expected_is_information() {
    // f = a_k^2 with sum a_k^2 = 1: the information on the tangent space is 4 I a row (contract, section 3).
    let n = [30.0, 50.0, 20.0];
    let weights = move |f: fn(f64, f64) -> f64| {
        move |a: &Vector| Vector::from_iterator(3, n.iter().zip(a.iter()).map(|(&n, &a)| f(n, a)))
    };
    let (value, slope, bend) =
        (weights(|n, a| 2.0 * n * a.abs().ln()), weights(|n, a| 2.0 * n / a), weights(|n, a| -2.0 * n / (a * a)));
    let names = ["x", "y", "z"].map(|name| parameter(name, Range::POSITIVE)).to_vec();
    let likelihood = FromFunctions::new(
        names,
        vec![Vector::from_vec(vec![0.5, 0.6, 0.6])],
        move |a| value(a).sum(),
        slope,
        move |a| Matrix::from_diagonal(&bend(a)),
    )
    .weight_total(100.0)
    .information(|kind, _| (kind == Information::Expected).then(|| Matrix::identity(3, 3) * 400.0));
    let restricted = system(&likelihood, &["x^2 + y^2 + z^2 = 1"], &["x = y"]);
    let outcome = infer(&likelihood, &restricted, None);
    // Equal cell probabilities are tested: Pearson again.
    let shares = Vector::from_vec(vec![0.4, 0.4, 0.2]);
    close(outcome.score.as_ref().unwrap().chi_square, pearson(&n, &shares));
    // Free: only the angle between (x, y) and z; the standard error of z is that of sqrt(p), sqrt((1 - p) / (4 n)).
    close(se(&outcome)[2], (0.8f64 / 400.0).sqrt());
    let observed = infer(&likelihood, &restricted, Some(Information::Observed));
    assert!(codes(&observed).contains(&"observed-depends-on-writing"));
    assert!(!codes(&outcome).contains(&"observed-depends-on-writing"));
}
