use super::*;
use crate::likelihood::Coordinates;

/// Darwin (1876), differences in height between cross- and self-fertilised maize, in eighths of an inch; as Fisher, The
/// Design of Experiments (1935), chapter 3, has them. Statistics below are the closed forms in t.
const DARWIN: [f64; 15] = [49.0, -67.0, 8.0, 16.0, 6.0, 23.0, 28.0, 41.0, 14.0, 29.0, 56.0, 24.0, 75.0, 60.0, -48.0];

fn normal(y: &'static [f64]) -> FromFunctions {
    let n = y.len() as f64;
    let sum = move |t: &Vector, k: i32| y.iter().map(|y| (y - t[0]).powi(k)).sum::<f64>();
    let outer = move |t: &Vector| {
        y.iter().fold(Matrix::zeros(2, 2), |m, y| {
            let r = y - t[0];
            let s = Vector::from_vec(vec![r / t[1].powi(2), r * r / t[1].powi(3) - 1.0 / t[1]]);
            m + &s * s.transpose()
        })
    };
    FromFunctions::new(
        vec![parameter("mean", Range::ALL), parameter("sd", Range::POSITIVE)],
        vec![Vector::from_vec(vec![10.0, 30.0])],
        move |t| -0.5 * n * std::f64::consts::TAU.ln() - n * t[1].ln() - sum(t, 2) / (2.0 * t[1] * t[1]),
        move |t| Vector::from_vec(vec![sum(t, 1) / t[1].powi(2), -n / t[1] + sum(t, 2) / t[1].powi(3)]),
        move |t| {
            let (a, b) = (-n / t[1].powi(2), -2.0 * sum(t, 1) / t[1].powi(3));
            Matrix::from_row_slice(2, 2, &[a, b, b, n / t[1].powi(2) - 3.0 * sum(t, 2) / t[1].powi(4)])
        },
    )
    .weight_total(n)
    .information(move |kind, t| match kind {
        Information::Expected => {
            Some(Matrix::from_diagonal(&Vector::from_vec(vec![n / t[1].powi(2), 2.0 * n / t[1].powi(2)])))
        }
        Information::Outer => Some(outer(t)),
        _ => None,
    })
}

fn moments() -> (f64, f64, f64) {
    let n = DARWIN.len() as f64;
    let mean = DARWIN.iter().sum::<f64>() / n;
    let square = DARWIN.iter().map(|y| y * y).sum::<f64>() / n;
    (n, mean, square.sqrt())
}

#[test]
fn mean_zero_in_closed_form() {
    let darwin = normal(&DARWIN);
    let outcome = infer(&darwin, &system(&darwin, &[], &["mean = 0"]), None);
    let (n, mean, s0) = moments();
    let s1 = (s0 * s0 - mean * mean).sqrt();
    let t2 = (n - 1.0) * (mean / s1).powi(2);
    assert_eq!(outcome.information, Information::Expected);
    let score = outcome.score.as_ref().unwrap();
    close(score.chi_square, n * t2 / (n - 1.0 + t2));
    // From the 60-digit solution of the same example.
    close(score.p, 0.053826287173655556);
    close(outcome.lr.as_ref().unwrap().chi_square, n * (1.0 + t2 / (n - 1.0)).ln());
    close(outcome.wald.as_ref().unwrap().chi_square, n * t2 / (n - 1.0));
    let line = &outcome.restricted.multipliers[0];
    close(line.value.unwrap(), n * mean / (s0 * s0));
    close(line.se.unwrap(), n.sqrt() / s0);
    close(line.z.unwrap().powi(2), score.chi_square);
    close(line.p.unwrap(), score.p);
    close(line.gap.unwrap(), mean);
    assert_eq!(line.one_sided().unwrap(), line.p.unwrap() / 2.0);
    // The restricted mean cannot move; the sd has s0 / sqrt(2 n).
    assert_eq!(se(&outcome)[0], 0.0);
    close(se(&outcome)[1], s0 / (2.0 * n).sqrt());
    let free = outcome.unrestricted.as_ref().unwrap();
    close(free.estimates[0].se.unwrap(), s1 / n.sqrt());
    assert_eq!(codes(&outcome), ["few-rows"]);
}

#[test]
fn observed_outer_and_robust_follow_the_formulas() {
    let darwin = normal(&DARWIN);
    let tested = system(&darwin, &[], &["mean = 0"]);
    let (n, mean, s0) = moments();
    // Observed information at the restricted fit, by hand: [n, 2 sum y / s; ., 2 n] / s^2.
    let off = 2.0 * mean * n / s0.powi(3);
    let v = 2.0 * n / s0.powi(2) / (2.0 * n * n / s0.powi(4) - off * off);
    let lambda = n * mean / (s0 * s0);
    let observed = infer(&darwin, &tested, Some(Information::Observed));
    close(observed.score.as_ref().unwrap().chi_square, lambda * v * lambda);
    close(observed.restricted.multipliers[0].se.unwrap(), v.sqrt().recip());
    // 7.373390900298139 is the 60-digit solution's.
    close(observed.score.as_ref().unwrap().chi_square, 7.373390900298139);

    let outer = infer(&darwin, &tested, Some(Information::Outer));
    let j = LogLikelihood::information(&darwin, Information::Outer, &outcome_theta(&outer)).unwrap();
    let inverse = j.clone().try_inverse().unwrap();
    close(outer.score.as_ref().unwrap().chi_square, lambda * inverse[(0, 0)] * lambda);

    // Robust: with no maintained restriction C is the inverse of the observed information, H = (1, 0).
    let robust = infer(&darwin, &tested, Some(Information::Robust));
    let i = Matrix::from_row_slice(2, 2, &[n / s0.powi(2), off, off, 2.0 * n / s0.powi(2)]);
    let c = i.try_inverse().unwrap();
    let m = (&c * &j * &c)[(0, 0)];
    close(robust.score.as_ref().unwrap().chi_square, (c[(0, 0)] * lambda).powi(2) / m);
    close(robust.restricted.multipliers[0].se.unwrap(), (m / c[(0, 0)].powi(2)).sqrt());
    // Restricted: only sd is free, C = 1 / I_22 with the full Lagrangian, filling J_22.
    close(se(&robust)[1], j[(1, 1)].sqrt() / (2.0 * n / s0.powi(2)));
    assert!(codes(&robust).contains(&"lr-not-robust"));
}

fn outcome_theta(outcome: &Outcome) -> Vector {
    outcome.restricted.fit.theta.clone()
}

#[test]
fn the_way_a_linear_restriction_is_written_changes_only_its_unit() {
    let darwin = normal(&DARWIN);
    let plain = infer(&darwin, &system(&darwin, &[], &["mean = 5"]), None);
    let scaled = infer(&darwin, &system(&darwin, &[], &["3 * mean + 2 = 17"]), None);
    close(plain.score.as_ref().unwrap().chi_square, scaled.score.as_ref().unwrap().chi_square);
    close(plain.wald.as_ref().unwrap().chi_square, scaled.wald.as_ref().unwrap().chi_square);
    close(plain.restricted.multipliers[0].value.unwrap(), 3.0 * scaled.restricted.multipliers[0].value.unwrap());
}

#[test]
fn a_nonlinear_hypothesis_keeps_score_and_ratio() {
    let darwin = normal(&DARWIN);
    let ratio = infer(&darwin, &system(&darwin, &[], &["mean / sd = 1/4"]), None);
    let product = infer(&darwin, &system(&darwin, &[], &["4 * mean = sd"]), None);
    close(ratio.score.as_ref().unwrap().chi_square, product.score.as_ref().unwrap().chi_square);
    close(ratio.lr.as_ref().unwrap().chi_square, product.lr.as_ref().unwrap().chi_square);
    assert!(codes(&ratio).contains(&"wald-depends-on-writing"));
    assert!(!codes(&product).contains(&"wald-depends-on-writing"));
    let gap = (ratio.wald.as_ref().unwrap().chi_square - product.wald.as_ref().unwrap().chi_square).abs();
    assert!(gap > 1e-6, "the two Wald statistics differ as they should");
}

#[test]
fn working_coordinates_leave_no_trace() {
    // The same likelihood in phi = R theta: every number must be that of theta.
    let r = Matrix::from_row_slice(2, 2, &[2.0, 0.5, 0.0, 1.0]);
    let back = r.clone().try_inverse().unwrap();
    let mut coordinates = Coordinates::identity();
    coordinates.push(0, r.clone());
    let (b1, b2, b3, b4) = (back.clone(), back.clone(), back.clone(), back);
    let turned = FromFunctions::new(
        vec![parameter("mean", Range::ALL), parameter("sd", Range::ALL)],
        vec![Vector::from_vec(vec![10.0, 30.0])],
        move |p| normal(&DARWIN).evaluate(&(&b1 * p), crate::likelihood::Order::Value).value,
        move |p| b2.tr_mul(&normal(&DARWIN).evaluate(&(&b2 * p), crate::likelihood::Order::Gradient).gradient),
        move |p| b3.tr_mul(&normal(&DARWIN).evaluate(&(&b3 * p), crate::likelihood::Order::Hessian).hessian) * &b3,
    )
    .weight_total(15.0)
    .information(move |kind, p| {
        LogLikelihood::information(&normal(&DARWIN), kind, &(&b4 * p)).map(|i| b4.tr_mul(&i) * &b4)
    })
    .coordinates(coordinates);
    let plain = normal(&DARWIN);
    for kind in Information::ALL {
        let a = infer(&plain, &system(&plain, &[], &["4 * mean = sd"]), Some(kind));
        let b = infer(&turned, &system(&turned, &[], &["4 * mean = sd"]), Some(kind));
        close(a.score.as_ref().unwrap().chi_square, b.score.as_ref().unwrap().chi_square);
        close(a.wald.as_ref().unwrap().chi_square, b.wald.as_ref().unwrap().chi_square);
        close(a.restricted.multipliers[0].value.unwrap(), b.restricted.multipliers[0].value.unwrap());
        close(a.restricted.multipliers[0].se.unwrap(), b.restricted.multipliers[0].se.unwrap());
        for j in 0..2 {
            close(se(&a)[j], se(&b)[j]);
        }
    }
}

#[test]
fn score_alone_makes_no_unrestricted_fit() {
    let darwin = normal(&DARWIN);
    let tests = Tests { score: true, lr: false, wald: false };
    let outcome = infer_with(&darwin, &system(&darwin, &[], &["mean = 0"]), &Options { tests, ..Options::default() });
    assert!(outcome.score.is_ok());
    assert!(outcome.unrestricted.is_err());
    assert_eq!(outcome.lr.as_ref().unwrap_err(), "not asked for");
    assert!(outcome.restricted.multipliers[0].gap.is_none());
    assert_eq!(codes(&outcome), ["few-rows"]);
}

#[test]
fn nothing_tested_means_no_test() {
    let darwin = normal(&DARWIN);
    let outcome = infer(&darwin, &system(&darwin, &[], &[]), None);
    for test in [&outcome.score, &outcome.lr, &outcome.wald] {
        assert_eq!(test.as_ref().unwrap_err(), "no tested restriction");
    }
    assert_eq!(codes(&outcome), ["few-rows"]);
    let (n, mean, s0) = moments();
    close(outcome.restricted.estimates[0].value, mean);
    close(se(&outcome)[0], ((s0 * s0 - mean * mean) / n).sqrt());
}

#[test]
fn requests_that_cannot_be_met_are_errors() {
    let darwin = normal(&DARWIN);
    let tested = system(&darwin, &[], &["mean = 0"]);
    for confidence in [0.0, 1.0, -0.5, f64::NAN] {
        let options = Options { confidence, ..Options::default() };
        assert!(run(&darwin, &tested, &Quantities::default(), &options).is_err());
    }
    let bare = FromFunctions::new(
        vec![parameter("x", Range::ALL)],
        vec![Vector::from_vec(vec![0.5])],
        |t| -t[0] * t[0],
        |t| t * -2.0,
        |_| Matrix::from_element(1, 1, -2.0),
    );
    let tested = system(&bare, &[], &["x = 1"]);
    for kind in [Information::Expected, Information::Outer, Information::Robust] {
        let options = Options { information: Some(kind), ..Options::default() };
        let error = run(&bare, &tested, &Quantities::default(), &options).unwrap_err();
        assert!(error.to_string().contains("ask for observed"), "{error}");
    }
    // Without a wish the default falls back on observed: s = -2, I = 2, chi-square 2.
    let outcome = infer(&bare, &tested, None);
    assert_eq!(outcome.information, Information::Observed);
    close(outcome.score.unwrap().chi_square, 2.0);
}

#[test]
fn quantities_by_the_delta_method() {
    let darwin = normal(&DARWIN);
    let names = ["mean".to_string(), "sd".to_string()];
    let definition = |name: &str, text: &str| (name.to_string(), text.to_string(), "quantities".to_string());
    let quantities = Quantities::compile(&[definition("variance", "sd^2")], &names, &[]).unwrap();
    let outcome = run(&darwin, &system(&darwin, &[], &["mean = 0"]), &quantities, &Options::default()).unwrap();
    let (n, mean, s0) = moments();
    let quantity = &outcome.restricted.quantities[0];
    close(quantity.value, s0 * s0);
    close(quantity.se.unwrap(), s0 * s0 * (2.0 / n).sqrt());
    close(quantity.upper.unwrap() - quantity.value, 1.959963984540054 * quantity.se.unwrap());
    // A quantity that the restriction fixes has no spread, also where its terms cancel.
    let quantities =
        Quantities::compile(&[definition("fixed", "mean / sd - 7 * log(sd / mean)")], &names, &[]).unwrap();
    let fixed = run(&darwin, &system(&darwin, &[], &["mean / 3 = sd"]), &quantities, &Options::default()).unwrap();
    assert_eq!(fixed.restricted.quantities[0].se, Some(0.0));
    let s2 = s0 * s0 - mean * mean;
    close(outcome.unrestricted.unwrap().quantities[0].se.unwrap(), s2 * (2.0 / n).sqrt());
}
