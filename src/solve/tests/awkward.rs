//! Problems that are no ordinary maximum, and ordinary ones from awkward starts.

use crate::math::Range;
use crate::solve::Verdict;
use crate::solve::testing::{Case, close};

#[test]
fn leaves_a_saddle_and_a_minimum_on_which_it_starts() {
    // l = x^2/2 - x^4/4 - y^2/2: minimum in x at 0, maxima at x = 1 and -1.
    let saddle = Case::new(&[0.0, 0.0], |x| 0.5 * x[0].sq() - 0.25 * x[0].powi(4) - 0.5 * x[1].sq()).fit();
    assert_eq!(saddle.certificate.verdict, Verdict::StrictMaximum);
    close(saddle.theta[0].abs(), 1.0, 1e-12);
    // On the unit circle x^2 - y^2 has a minimum at (0, 1).
    let minimum = Case::new(&[0.0, 1.0], |x| x[0].sq() - x[1].sq()).equal("c", 1.0, |x| x[0].sq() + x[1].sq()).fit();
    assert_eq!(minimum.certificate.verdict, Verdict::StrictMaximum, "{:#?}", minimum.certificate);
    close(minimum.theta[0].abs(), 1.0, 1e-12);
    close(minimum.multipliers[0], 1.0, 1e-12);
}

#[test]
fn a_square_that_must_vanish_is_irregular() {
    for start in [1.0, 0.3, 0.0] {
        let fit = Case::new(&[start, 0.0], |x| -(&x[0] - 1.0).sq() - (&x[1] - 2.0).sq())
            .equal("square", 0.0, |x| x[0].sq())
            .fit();
        assert_eq!(fit.certificate.verdict, Verdict::Irregular, "{start}: {:#?}", fit.certificate);
        assert!(fit.theta[0].abs() < 1e-5);
        assert!(fit.certificate.reason.unwrap().contains("`square`"));
    }
}

#[test]
fn curves_that_touch_are_irregular() {
    let fit = Case::new(&[0.5, 0.5], |x| -(&x[0] - 1.0).sq() - (&x[1] - 1.0).sq())
        .equal("circle", 1.0, |x| x[0].sq() + x[1].sq())
        .linear("tangent", 1.0, |x| x[0].clone())
        .fit();
    assert_eq!(fit.certificate.verdict, Verdict::Irregular, "{:#?}", fit.certificate);
}

#[test]
fn a_cusp_is_irregular() {
    // y^2 = x^3, maximise -x: the tip.
    let fit =
        Case::new(&[1.0, 1.0], |x| -x[0].clone() - x[1].sq()).equal("cusp", 0.0, |x| x[1].sq() - x[0].powi(3)).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Irregular, "{:#?}\n{:#?}", fit.certificate, fit.trace);
}

#[test]
fn contradictory_restrictions_are_named_with_what_is_missed() {
    let fit = Case::new(&[0.0, 0.0], |x| -x[0].sq() - (&x[1] - 1.0).sq())
        .linear("one", 1.0, |x| x[0].clone())
        .linear("two", 2.0, |x| x[0].clone())
        .linear("fine", 3.0, |x| x[1].clone())
        .fit();
    assert_eq!(fit.certificate.verdict, Verdict::Infeasible);
    close(fit.theta[0], 1.5, 1e-9);
    let reason = fit.certificate.reason.unwrap();
    assert!(reason.contains("`one` is missed by 0.5") && reason.contains("`two` is missed by -0.5"), "{reason}");
    assert!(!reason.contains("fine"));
}

#[test]
fn a_restriction_outside_the_ranges_is_infeasible() {
    let fit = Case::new(&[0.5], |x| -x[0].sq()).range(0, Range::UNIT).linear("large", 1.5, |x| x[0].clone()).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Infeasible);
    let fit = Case::new(&[0.5], |x| -x[0].sq()).equal("never", -1.0, |x| x[0].sq()).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Infeasible);
}

#[test]
fn redundant_restrictions_linear_and_not() {
    // max -(a-3)^2 - (b-1)^2 with a + b = 2: a = 2, b = 0, multiplier 2.
    let base = || Case::new(&[0.4, 0.1], |x| -(&x[0] - 3.0).sq() - (&x[1] - 1.0).sq());
    let linear = base().linear("sum", 2.0, |x| &x[0] + &x[1]).linear("twice", 4.0, |x| 2.0 * &x[0] + 2.0 * &x[1]).fit();
    let power = base().linear("sum", 2.0, |x| &x[0] + &x[1]).equal("cube", 8.0, |x| (&x[0] + &x[1]).powi(3)).fit();
    let times = base()
        .linear("sum", 2.0, |x| &x[0] + &x[1])
        .equal("times", 0.0, |x| (&x[0] + &x[1] - 2.0) * (2.0 + &x[0]))
        .fit();
    for fit in [linear, power, times] {
        assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum, "{:#?}", fit.certificate);
        assert_eq!(fit.redundant, vec![1]);
        assert_eq!(fit.certificate.rank, 1);
        close(fit.theta[0], 2.0, 1e-12);
        close(fit.multipliers[0], 2.0, 1e-11);
        assert_eq!(fit.multipliers[1], 0.0);
    }
}

#[test]
fn more_restrictions_than_parameters_but_consistent() {
    let fit = Case::new(&[0.0, 0.0], |x| -x[0].sq() - x[1].sq())
        .linear("a", 1.0, |x| x[0].clone())
        .linear("b", 2.0, |x| x[1].clone())
        .linear("sum", 3.0, |x| &x[0] + &x[1])
        .equal("product", 2.0, |x| &x[0] * &x[1])
        .fit();
    assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum, "{:#?}", fit.certificate);
    assert_eq!(fit.redundant, vec![2, 3]);
    close(fit.multipliers[0], -2.0, 1e-12);
    close(fit.multipliers[1], -4.0, 1e-12);
}

#[test]
fn only_a_sum_is_identified() {
    let fit = Case::new(&[0.2, 0.5, 0.0], |x| -4.0 * (&x[0] + &x[1] - 3.0).sq() - (&x[2] - 1.0).sq()).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Flat, "{:#?}", fit.certificate);
    let flat = &fit.certificate.flat;
    assert_eq!(flat.len(), 1);
    assert_eq!(flat[0].weights.iter().map(|w| w.0).collect::<Vec<_>>(), vec![0, 1]);
    close(flat[0].weights[0].1, 1.0, 1e-9);
    close(flat[0].weights[1].1, -1.0, 1e-9);
    let known = &fit.certificate.identified;
    assert_eq!(known.len(), 1);
    assert_eq!(known[0].weights, vec![(0, 1.0), (1, 1.0)]);
    close(known[0].value, 3.0, 1e-10);
    close(known[0].se.unwrap(), 8.0f64.sqrt().recip(), 1e-9);
}

#[test]
fn a_parameter_without_effect_is_flat_and_a_restriction_identifies_it() {
    let case = Case::new(&[0.2, 0.5], |x| -(&x[0] - 3.0).sq());
    let fit = case.fit();
    assert_eq!(fit.certificate.verdict, Verdict::Flat);
    assert_eq!(fit.certificate.flat[0].weights, vec![(1, 1.0)]);
    let fit = case.linear("tie", 0.0, |x| &x[0] - &x[1]).fit();
    assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum, "{:#?}", fit.certificate);
    close(fit.theta[1], 3.0, 1e-12);
}

#[test]
fn units_from_1e_minus_8_to_1e8_in_one_problem() {
    let solve = |s: [f64; 3]| {
        Case::new(&[2.0 * s[0], 2.0 * s[1], 2.0 * s[2]], move |x| {
            let (a, b, c) = (&x[0] / s[0], &x[1] / s[1], &x[2] / s[2]);
            a.ln() * 3.0 - &a + b.ln() * 5.0 - 2.0 * &b - (&c - &a).sq() * 4.0
        })
        .range(0, Range::POSITIVE)
        .range(1, Range::POSITIVE)
        .equal("product", 6.0 * s[0] * s[1], |x| &x[0] * &x[1])
        .equal("ratio", 1.3 * s[2] / s[1], |x| &x[2] / &x[1])
        .fit()
    };
    let one = solve([1.0; 3]);
    assert_eq!(one.certificate.verdict, Verdict::StrictMaximum);
    for s in [[1e-8, 1e8, 1.0], [1e8, 1e-8, 1e4], [1e-4, 1e-8, 1e8]] {
        let other = solve(s);
        assert_eq!(other.certificate.verdict, Verdict::StrictMaximum, "{:#?}\n{:#?}", other.certificate, other.trace);
        for (j, unit) in s.iter().enumerate() {
            close(other.theta[j] / unit, one.theta[j], 1e-10);
        }
        close(other.multipliers[0] * s[0] * s[1], one.multipliers[0], 1e-8);
    }
}

#[test]
fn grows_without_bound() {
    let line = Case::new(&[0.0], |x| x[0].clone()).fit();
    assert_eq!(line.certificate.verdict, Verdict::Unbounded, "{:#?}", line.certificate);
    let log = Case::new(&[1.0], |x| x[0].ln()).range(0, Range::POSITIVE).fit();
    assert_eq!(log.certificate.verdict, Verdict::Unbounded);
    let asymptote = Case::new(&[1.0], |x| -1.0 * x[0].powi(-1)).range(0, Range::POSITIVE).fit();
    assert_eq!(asymptote.certificate.verdict, Verdict::Unbounded, "{:#?}", asymptote.certificate);
    let along = Case::new(&[0.0, 0.0], |x| &x[0] + &x[1]).linear("tie", 0.0, |x| &x[0] - &x[1]).fit();
    assert_eq!(along.certificate.verdict, Verdict::Unbounded);
}

#[test]
fn an_undefined_start_is_repaired() {
    let fit = Case::new(&[-3.0, -2.0], |x| x[0].ln() - &x[0] + x[1].ln() * 2.0 - &x[1]).fit();
    assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum, "{:#?}", fit.certificate);
    close(fit.theta[1], 2.0, 1e-12);
    let outside = Case::new(&[-3.0], |x| x[0].ln() - &x[0]).range(0, Range::POSITIVE).fit();
    close(outside.theta[0], 1.0, 1e-12);
    let never = Case::new(&[-3.0], |x| (x[0].sq() * -1.0 - 1.0).ln()).fit();
    assert_eq!(never.certificate.verdict, Verdict::Stopped);
    assert!(never.certificate.reason.unwrap().contains("undefined"));
}

#[test]
fn quartic_maximum_is_flat() {
    let fit = Case::new(&[1.0], |x| -x[0].powi(4)).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Flat, "{:#?}\n{:#?}", fit.certificate, fit.trace);
}

#[test]
fn edges_are_hit_and_released() {
    // Starts on the lower edge though the maximum is inside; ends on the upper edge of the other.
    let fit = Case::new(&[0.0, 0.2], |x| -(&x[0] - 0.4).sq() - (&x[1] - 3.0).sq())
        .range(0, Range::UNIT)
        .range(1, Range::UNIT)
        .fit();
    assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum);
    close(fit.theta[0], 0.4, 1e-12);
    assert_eq!(fit.theta[1], 1.0);
    close(fit.edges[0].multiplier, 4.0, 1e-12);
    assert!(fit.edges[0].multiplier > 0.0);
}

#[test]
fn slope_infinite_at_an_edge_does_not_crash() {
    // sqrt has an infinite slope at 0, where the search starts.
    let fit = Case::new(&[0.0], |x| x[0].sqrt() - &x[0]).range(0, Range::NONNEGATIVE).fit();
    assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum, "{:#?}", fit.certificate);
    close(fit.theta[0], 0.25, 1e-12);
}

#[test]
fn nothing_to_estimate() {
    let fit = crate::solve::testing::Case::new(&[1.0], |x| -x[0].sq()).linear("known", 2.0, |x| x[0].clone()).fit();
    assert_eq!(fit.certificate.verdict, Verdict::StrictMaximum);
    close(fit.multipliers[0], -4.0, 1e-14);
    assert_eq!(fit.certificate.curvature_max, None);
}
