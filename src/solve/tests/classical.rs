//! Equality-constrained problems of Hock and Schittkowski, *Test Examples for Nonlinear Programming Codes* (1981), by
//! their numbers there; problems, starts and optimal values recalled from memory. l is minus the objective.

use crate::solve::testing::{Case, Jet, close};
use crate::solve::{Fit, Verdict};

#[track_caller]
fn solved(fit: &Fit, objective: f64) {
    assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum, "{:#?}\n{:#?}", fit.certificate, fit.trace);
    close(-fit.log_likelihood, objective, 1e-8);
}

#[test]
fn problem_6() {
    let fit = Case::new(&[-1.2, 1.0], |x| -(1.0 - &x[0]).sq()).equal("c", 0.0, |x| 10.0 * (&x[1] - x[0].sq())).fit();
    solved(&fit, 0.0);
}

#[test]
fn problem_7() {
    let fit = Case::new(&[2.0, 2.0], |x| -((1.0 + x[0].sq()).ln() - &x[1]))
        .equal("c", 4.0, |x| (1.0 + x[0].sq()).sq() + x[1].sq())
        .fit();
    solved(&fit, -(3.0f64.sqrt()));
}

#[test]
fn problem_8_has_no_free_direction() {
    let fit = Case::new(&[2.0, 1.0], |x| x[0].constant(1.0))
        .equal("circle", 25.0, |x| x[0].sq() + x[1].sq())
        .equal("product", 9.0, |x| &x[0] * &x[1])
        .fit();
    solved(&fit, -1.0);
    assert_eq!(fit.certificate.curvature_min, None);
}

#[test]
fn problem_9() {
    let pi = std::f64::consts::PI;
    let fit = Case::new(&[0.0, 0.0], move |x| -((&x[0] * (pi / 12.0)).sin() * cos(&(&x[1] * (pi / 16.0)))))
        .linear("line", 0.0, |x| 4.0 * &x[0] - 3.0 * &x[1])
        .fit();
    solved(&fit, -0.5);
}

fn cos(x: &Jet) -> Jet {
    (x + std::f64::consts::FRAC_PI_2).sin()
}

#[test]
fn problem_27() {
    let fit = Case::new(&[2.0, 2.0, 2.0], |x| -(0.01 * (&x[0] - 1.0).sq() + (&x[1] - x[0].sq()).sq()))
        .equal("c", -1.0, |x| &x[0] + x[2].sq())
        .fit();
    solved(&fit, 0.04);
}

#[test]
fn problem_28() {
    let fit = Case::new(&[-4.0, 1.0, 1.0], |x| -((&x[0] + &x[1]).sq() + (&x[1] + &x[2]).sq()))
        .linear("c", 1.0, |x| &x[0] + 2.0 * &x[1] + 3.0 * &x[2])
        .fit();
    solved(&fit, 0.0);
    assert!(fit.certificate.iterations <= 3, "{:#?}", fit.trace);
}

#[test]
fn problem_39() {
    let fit = Case::new(&[2.0; 4], |x| x[0].clone())
        .equal("c1", 0.0, |x| &x[1] - x[0].powi(3) - x[2].sq())
        .equal("c2", 0.0, |x| x[0].sq() - &x[1] - x[3].sq())
        .fit();
    solved(&fit, -1.0);
}

#[test]
fn problem_40() {
    let fit = Case::new(&[0.8; 4], |x| &x[0] * &x[1] * &x[2] * &x[3])
        .equal("c1", 1.0, |x| x[0].powi(3) + x[1].sq())
        .equal("c2", 0.0, |x| x[0].sq() * &x[3] - &x[2])
        .equal("c3", 0.0, |x| x[3].sq() - &x[1])
        .fit();
    solved(&fit, -0.25);
}

#[test]
fn problem_42() {
    let fit =
        Case::new(&[1.0; 4], |x| -((&x[0] - 1.0).sq() + (&x[1] - 2.0).sq() + (&x[2] - 3.0).sq() + (&x[3] - 4.0).sq()))
            .linear("c1", 2.0, |x| x[0].clone())
            .equal("c2", 2.0, |x| x[2].sq() + x[3].sq())
            .fit();
    solved(&fit, 28.0 - 10.0 * 2.0f64.sqrt());
}

#[test]
fn problem_47_is_flat_or_another_strict_maximum() {
    let fit = Case::new(&[2.0, 2.0f64.sqrt(), -1.0, 2.0 - 2.0f64.sqrt(), 0.5], |x| {
        -((&x[0] - &x[1]).sq() + (&x[1] - &x[2]).powi(3) + (&x[2] - &x[3]).powi(4) + (&x[3] - &x[4]).powi(4))
    })
    .equal("c1", 3.0, |x| &x[0] + x[1].sq() + x[2].powi(3))
    .equal("c2", 1.0, |x| &x[1] - x[2].sq() + &x[3])
    .equal("c3", 1.0, |x| &x[0] * &x[4])
    .fit();
    assert!(
        matches!(fit.certificate.verdict, Verdict::Flat | Verdict::StrictMaximum | Verdict::Unbounded),
        "{:#?}",
        fit.certificate
    );
}

#[test]
fn problem_26_is_flat() {
    let fit = Case::new(&[-2.6, 2.0, 2.0], |x| -((&x[0] - &x[1]).sq() + (&x[1] - &x[2]).powi(4)))
        .equal("c", 3.0, |x| (1.0 + x[1].sq()) * &x[0] + x[2].powi(4))
        .fit();
    assert_eq!(fit.certificate.verdict, Verdict::Flat, "{:#?}\n{:#?}", fit.certificate, fit.trace);
    close(-fit.log_likelihood, 0.0, 1e-8);
}

#[test]
fn problem_49_is_flat() {
    let fit = Case::new(&[10.0, 7.0, 2.0, -3.0, 0.8], |x| {
        -((&x[0] - &x[1]).sq() + (&x[2] - 1.0).sq() + (&x[3] - 1.0).powi(4) + (&x[4] - 1.0).powi(6))
    })
    .linear("c1", 7.0, |x| &x[0] + &x[1] + &x[2] + 4.0 * &x[3])
    .linear("c2", 6.0, |x| &x[2] + 5.0 * &x[4])
    .fit();
    assert_eq!(fit.certificate.verdict, Verdict::Flat, "{:#?}\n{:#?}", fit.certificate, fit.trace);
    close(-fit.log_likelihood, 0.0, 1e-8);
}

#[test]
fn problems_48_and_51() {
    let fit = Case::new(&[3.0, 5.0, -3.0, 2.0, -2.0], |x| {
        -((&x[0] - 1.0).sq() + (&x[1] - &x[2]).sq() + (&x[3] - &x[4]).sq())
    })
    .linear("c1", 5.0, |x| &x[0] + &x[1] + &x[2] + &x[3] + &x[4])
    .linear("c2", -3.0, |x| &x[2] - 2.0 * (&x[3] + &x[4]))
    .fit();
    solved(&fit, 0.0);
    let fit = Case::new(&[2.5, 0.5, 2.0, -1.0, 0.5], |x| {
        -((&x[0] - &x[1]).sq() + (&x[1] + &x[2] - 2.0).sq() + (&x[3] - 1.0).sq() + (&x[4] - 1.0).sq())
    })
    .linear("c1", 4.0, |x| &x[0] + 3.0 * &x[1])
    .linear("c2", 0.0, |x| &x[2] + &x[3] - 2.0 * &x[4])
    .linear("c3", 0.0, |x| &x[1] - &x[4])
    .fit();
    solved(&fit, 0.0);
}

#[test]
fn problem_52() {
    let fit = Case::new(&[2.0; 5], |x| {
        -((4.0 * &x[0] - &x[1]).sq() + (&x[1] + &x[2] - 2.0).sq() + (&x[3] - 1.0).sq() + (&x[4] - 1.0).sq())
    })
    .linear("c1", 0.0, |x| &x[0] + 3.0 * &x[1])
    .linear("c2", 0.0, |x| &x[2] + &x[3] - 2.0 * &x[4])
    .linear("c3", 0.0, |x| &x[1] - &x[4])
    .fit();
    solved(&fit, 1859.0 / 349.0);
}

#[test]
fn problem_56() {
    let fit = Case::new(
        &[
            1.0,
            1.0,
            1.0,
            (1.0f64 / 4.2).sqrt().asin(),
            (1.0f64 / 4.2).sqrt().asin(),
            (1.0f64 / 4.2).sqrt().asin(),
            (5.0f64 / 7.2).sqrt().asin(),
        ],
        |x| &x[0] * &x[1] * &x[2],
    )
    .equal("c1", 0.0, |x| &x[0] - 4.2 * x[3].sin().sq())
    .equal("c2", 0.0, |x| &x[1] - 4.2 * x[4].sin().sq())
    .equal("c3", 0.0, |x| &x[2] - 4.2 * x[5].sin().sq())
    .equal("c4", 0.0, |x| &x[0] + 2.0 * &x[1] + 2.0 * &x[2] - 7.2 * x[6].sin().sq())
    .fit();
    solved(&fit, -3.456);
}

#[test]
fn problem_61() {
    let fit = Case::new(&[0.0; 3], |x| {
        -(4.0 * x[0].sq() + 2.0 * x[1].sq() + 2.0 * x[2].sq() - 33.0 * &x[0] + 16.0 * &x[1] - 24.0 * &x[2])
    })
    .equal("c1", 7.0, |x| 3.0 * &x[0] - 2.0 * x[1].sq())
    .equal("c2", 11.0, |x| 4.0 * &x[0] - x[2].sq())
    .fit();
    solved(&fit, -143.6461422);
}

#[test]
fn problem_77_and_79() {
    let fit = Case::new(&[2.0; 5], |x| {
        -((&x[0] - 1.0).sq()
            + (&x[0] - &x[1]).sq()
            + (&x[2] - 1.0).sq()
            + (&x[3] - 1.0).powi(4)
            + (&x[4] - 1.0).powi(6))
    })
    .equal("c1", 2.0 * 2.0f64.sqrt(), |x| x[0].sq() * &x[3] + (&x[3] - &x[4]).sin())
    .equal("c2", 8.0 + 2.0f64.sqrt(), |x| &x[1] + x[2].powi(4) * x[3].sq())
    .fit();
    solved(&fit, 0.24150513);
    let fit = Case::new(&[2.0; 5], |x| {
        -((&x[0] - 1.0).sq()
            + (&x[0] - &x[1]).sq()
            + (&x[1] - &x[2]).sq()
            + (&x[2] - &x[3]).powi(4)
            + (&x[3] - &x[4]).powi(4))
    })
    .equal("c1", 2.0 + 3.0 * 2.0f64.sqrt(), |x| &x[0] + x[1].sq() + x[2].powi(3))
    .equal("c2", 2.0 * 2.0f64.sqrt() - 2.0, |x| &x[1] - x[2].sq() + &x[3])
    .equal("c3", 2.0, |x| &x[0] * &x[4])
    .fit();
    solved(&fit, 0.0787768209);
}

#[test]
fn problem_78() {
    let fit = Case::new(&[-2.0, 1.5, 2.0, -1.0, -1.0], |x| -(&x[0] * &x[1] * &x[2] * &x[3] * &x[4]))
        .equal("c1", 10.0, |x| x.iter().skip(1).fold(x[0].sq(), |s, y| s + y.sq()))
        .equal("c2", 0.0, |x| &x[1] * &x[2] - 5.0 * &x[3] * &x[4])
        .equal("c3", -1.0, |x| x[0].powi(3) + x[1].powi(3))
        .fit();
    solved(&fit, -2.91970041);
}
