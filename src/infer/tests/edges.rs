use super::*;

const SUM: &[&str] = &["a + b + c + d = 1"];
const NAMES: &[&str] = &["a", "b", "c", "d"];

#[test]
fn an_unrestricted_estimate_on_an_edge_keeps_score_and_ratio() {
    let counts = table(NAMES, &[0.0, 12.0, 20.0, 30.0]);
    let outcome = infer(&counts, &system(&counts, SUM, &["a = b", "c = d"]), None);
    // Shares 6/62 and 25/62 each: Pearson's by hand.
    let score = outcome.score.as_ref().unwrap();
    close(score.chi_square, 2.0 * 36.0 / 6.0 + 2.0 * 25.0 / 25.0);
    let ratio = 2.0 * (12.0 * 2f64.ln() + 20.0 * (20.0f64 / 25.0).ln() + 30.0 * (30.0f64 / 25.0).ln());
    close(outcome.lr.as_ref().unwrap().chi_square, ratio);
    assert!(outcome.wald.as_ref().unwrap_err().contains("on an edge"));
    assert_eq!(codes(&outcome), ["test-not-available"]);
    let free = outcome.unrestricted.as_ref().unwrap();
    assert_eq!(free.estimates[0].edge, Some(crate::solve::End::Lower));
    assert_eq!(free.estimates[0].value, 0.0);
}

#[test]
fn a_nuisance_on_an_edge_joins_the_maintained_restrictions() {
    // d has no row and is in no hypothesis: the answer is that of the table without it.
    let four = table(NAMES, &[10.0, 20.0, 33.0, 0.0]);
    let outcome = infer(&four, &system(&four, SUM, &["a = b"]), None);
    let three = table(&NAMES[..3], &[10.0, 20.0, 33.0]);
    let without = infer(&three, &system(&three, &["a + b + c = 1"], &["a = b"]), None);
    close(outcome.score.as_ref().unwrap().chi_square, without.score.as_ref().unwrap().chi_square);
    close(outcome.lr.as_ref().unwrap().chi_square, without.lr.as_ref().unwrap().chi_square);
    for j in 0..3 {
        close(se(&outcome)[j], se(&without)[j]);
    }
    assert!(codes(&outcome).contains(&"nuisance-on-edge"));
    let d = &outcome.restricted.estimates[3];
    assert_eq!((d.value, d.edge), (0.0, Some(crate::solve::End::Lower)));
}

#[test]
fn infinite_information_of_a_tested_edge_gives_no_statistic() {
    let counts = table(NAMES, &[0.0, 12.0, 20.0, 30.0]);
    let outcome = infer(&counts, &system(&counts, SUM, &["a = 0"]), None);
    assert!(codes(&outcome).contains(&"tested-on-edge"), "{:?}", outcome.warnings);
    assert!(outcome.score.as_ref().unwrap_err().contains("not finite at 0"));
    // The whole slope belongs to the hypothesis: without it the sum's multiplier is the number of rows.
    close(outcome.restricted.multipliers[1].value.unwrap(), -62.0);
    assert_eq!(outcome.restricted.estimates[0].edge, Some(crate::solve::End::Lower));
    // Pinned by the hypothesis, it takes its infinite information out of the restricted covariance: binomial shares.
    close(se(&outcome)[1], ((12.0 / 62.0) * (50.0 / 62.0) / 62.0f64).sqrt());
    assert!(outcome.lr.is_err(), "both the tested point and the unrestricted estimate are on the edge");
}

#[test]
fn observed_information_that_is_not_positive_definite_gives_no_statistic() {
    // Cauchy-like tails: l = -sum log(1 + (y - m)^2), rows far from the tested value bend upwards.
    let y = [-8.0, -7.0, 9.0, 10.0];
    let l = move |t: &Vector| -y.iter().map(|y| (1.0 + (y - t[0]).powi(2)).ln()).sum::<f64>();
    let g = move |t: &Vector| {
        Vector::from_vec(vec![y.iter().map(|y| 2.0 * (y - t[0]) / (1.0 + (y - t[0]).powi(2))).sum::<f64>()])
    };
    let h = move |t: &Vector| {
        let bend = |y: &f64| {
            let r = (y - t[0]).powi(2);
            (2.0 * r - 2.0) / (1.0 + r).powi(2)
        };
        Matrix::from_element(1, 1, y.iter().map(bend).sum::<f64>())
    };
    let outer =
        move |t: &Vector| y.iter().map(|y| (2.0 * (y - t[0]) / (1.0 + (y - t[0]).powi(2))).powi(2)).sum::<f64>();
    let likelihood = FromFunctions::new(vec![parameter("m", Range::ALL)], vec![Vector::from_vec(vec![1.0])], l, g, h)
        .weight_total(4.0)
        .information(move |kind, t| match kind {
            Information::Expected => Some(Matrix::from_element(1, 1, 2.0)),
            Information::Outer => Some(Matrix::from_element(1, 1, outer(t))),
            _ => None,
        });
    let tested = system(&likelihood, &[], &["m = 0"]);
    let observed = infer(&likelihood, &tested, Some(Information::Observed));
    let reason = observed.score.as_ref().unwrap_err();
    assert!(reason.contains("not positive definite"), "{reason}");
    assert!(reason.contains("expected or outer information would serve"), "{reason}");
    let line = &observed.restricted.multipliers[0];
    assert!(line.value.is_some() && line.se.is_none() && line.p.is_none());
    assert!(codes(&observed).contains(&"test-not-available"));
    // No direction is free, so the restricted standard error is 0 with any kind.
    assert_eq!(se(&observed), [0.0]);
    let expected = infer(&likelihood, &tested, None);
    assert!(expected.score.is_ok());
    assert!(codes(&expected).contains(&"several-maxima"), "{:?}", expected.warnings);
}

#[test]
fn no_trustworthy_maximum_means_nothing_is_inferred() {
    // l depends on x + y only.
    let l = FromFunctions::new(
        vec![parameter("x", Range::ALL), parameter("y", Range::ALL)],
        vec![Vector::from_vec(vec![0.3, 0.1])],
        |t| -(t[0] + t[1] - 1.0).powi(2),
        |t| Vector::from_element(2, -2.0 * (t[0] + t[1] - 1.0)),
        |_| Matrix::from_element(2, 2, -2.0),
    );
    let outcome = infer(&l, &system(&l, &[], &["x + y = 2"]), None);
    assert_eq!(outcome.restricted.fit.certificate.verdict, crate::solve::Verdict::Flat);
    assert!(outcome.restricted.estimates.is_empty());
    assert!(outcome.restricted.multipliers.iter().all(|m| m.value.is_none() && m.reason.is_some()));
    assert!(outcome.score.is_err() && outcome.unrestricted.is_err());
    // Identified by the hypothesis alone: a maximum, but no unrestricted one, and no information to test with.
    let identified = infer(&l, &system(&l, &[], &["x + y = 2", "x = 0"]), None);
    assert_eq!(identified.restricted.fit.certificate.verdict, crate::solve::Verdict::StrictMaximum);
    assert!(codes(&identified).contains(&"unrestricted-failed"));
    assert!(identified.score.as_ref().unwrap_err().contains("no other kind serves"));
    assert!(identified.unrestricted.as_ref().unwrap().estimates.is_empty());
}
