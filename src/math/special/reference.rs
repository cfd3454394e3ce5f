//! The special functions and tails against high-precision reference values.

use super::*;
use crate::math::tail;

/// Written by `tests/reference/special.py` with mpmath.
const TABLE: &str = include_str!("../../../tests/reference/special.tsv");

/// How an error is measured.
#[derive(Clone, Copy)]
enum Scale {
    /// Beside the value itself.
    Relative,
    /// Beside max(1, |value|).
    Mixed,
}
use Scale::{Mixed, Relative};

type Evaluate = fn(&[f64]) -> f64;

/// Function, evaluation, measure of error, tolerance. Functions of one libm call keep its one or two units in the last place;
/// compositions add one rounding a step; where more is allowed the reason stands beside it.
const FUNCTIONS: &[(&str, Evaluate, Scale, f64)] = &[
    // libm, reflection below zero; next to the zeros at 1 and 2 the relative error holds as well.
    ("lgamma", |a| lgamma(a[0]), Mixed, 1e-15),
    // Up to ten reciprocals summed.
    ("digamma", |a| digamma(a[0]), Mixed, 2e-15),
    // The engine's promise; powers of high order magnify the rounding of x + k by the order.
    ("polygamma", |a| polygamma(a[0] as u32, a[1]), Mixed, 1e-13),
    ("erf", |a| erf(a[0]), Relative, 1e-15),
    ("erfc", |a| erfc(a[0]), Relative, 1e-15),
    ("normal_cdf", |a| normal_cdf(a[0]), Relative, 2e-15),
    ("normal_log_cdf", |a| normal_log_cdf(a[0]), Relative, 2e-15),
    ("inverse_mills", |a| inverse_mills(a[0]), Relative, 3e-15),
    // x + m loses a factor x^2, 625 where the series takes over.
    ("inverse_mills_slope", |a| inverse_mills_slope(a[0]), Relative, 2e-13),
    ("normal_quantile", |a| normal_quantile(a[0]), Relative, 2e-15),
    ("normal_log_interval", |a| normal_log_interval(a[0], a[1]), Relative, 4e-15),
    ("log_logistic", |a| log_logistic(a[0]), Relative, 1e-15),
    ("logistic", |a| logistic(a[0]), Relative, 1e-15),
    ("logit", |a| logit(a[0]), Relative, 1e-15),
    ("log1mexp", |a| log1mexp(a[0]), Relative, 1e-15),
    // The sum may be near one, and its logarithm near zero.
    ("log_sum_exp", log_sum_exp, Mixed, 1e-15),
    ("log_mix", log_mix, Mixed, 1e-15),
    // At twice the mean three terms cancel to a fifth of their size.
    ("deviance", |a| deviance(a[0], a[1]), Relative, 2e-15),
    // Below 9 terms up to 17, above a difference of nothing.
    ("factorial_remainder", |a| factorial_remainder(a[0]), Mixed, 4e-15),
    // Chains of three derivatives; around c = 2 the third one cancels to a hundredth of its terms.
    ("stirling_inverse", |a| stirling_inverse(a[0], a[1]), Relative, 1e-13),
    // Beyond the series each recurrence to the next order costs a factor of up to five: 600 eps at order 4.
    ("log1p_over", |a| log1p_over(a[0], a[1]), Relative, 1e-13),
    ("log1p_excess", |a| log1p_excess(a[0], a[1]), Relative, 1e-13),
    // As promised up to order 1000: exponents up to some hundred carry eps each.
    ("bessel_i", |a| bessel_i(a[0], a[1]), Relative, 1e-12),
    // Sums of positive terms; the worst are continued fractions of some hundred steps and moments of 32 points.
    ("gamma_log_cdf", |a| gamma_log_cdf(a[0], a[1], a[2]), Mixed, 1e-13),
    ("gamma_log_survival", |a| gamma_log_survival(a[0], a[1], a[2]), Mixed, 1e-13),
    ("beta_log_cdf", |a| beta_log_cdf(a[0], a[1], a[2], a[3], a[4], a[5]), Mixed, 1e-12),
    ("log_bessel_i0", |a| log_bessel_i0(a[0]), Relative, 2e-15),
    // below 40 the difference from x is taken
    ("log_bessel_i0_scaled", |a| log_bessel_i0_scaled(a[0]), Mixed, 2e-14),
    ("bessel_ratio", |a| bessel_ratio(a[0]), Relative, 2e-15),
    // Near x = 20 the two parts of the slope are about forty times their sum.
    ("bessel_ratio_slope", |a| bessel_ratio_slope(a[0]), Relative, 2e-14),
    // Over 200 degrees of freedom the exponent, up to 700, carries eps; below, powers and sums of up to 10 sqrt(df) terms.
    ("chi_square_upper", |a| tail::chi_square_upper(a[0], a[1]), Relative, 2e-13),
    ("chi_square_log10_upper", |a| tail::chi_square_log10_upper(a[0], a[1]), Relative, 2e-13),
    ("normal_two_sided", |a| tail::normal_two_sided(a[0]), Relative, 2e-15),
];

/// Function, arguments, value of one line.
fn parsed(line: &str) -> (&str, Vec<f64>, f64) {
    let mut cells = line.split('\t');
    let mut cell = || cells.next().unwrap_or_else(|| panic!("short line: {line}"));
    let number = |text: &str| text.parse::<f64>().unwrap_or_else(|e| panic!("{e}: {line}"));
    let name = cell();
    let arguments = cell().split(' ').map(number).collect();
    (name, arguments, number(cell()))
}

#[test]
fn every_function_agrees_with_its_reference() {
    let mut faults = Vec::new();
    for &(name, evaluate, scale, tolerance) in FUNCTIONS {
        let mut worst = (0.0, Vec::new(), 0.0, 0.0);
        let mut count = 0;
        for (_, arguments, wanted) in TABLE.lines().map(parsed).filter(|l| l.0 == name) {
            count += 1;
            let found = evaluate(&arguments);
            let size = match scale {
                Relative => wanted.abs().max(f64::MIN_POSITIVE),
                Mixed => wanted.abs().max(1.0),
            };
            let error = if found == wanted { 0.0 } else { (found - wanted).abs() / size };
            if error > worst.0 || error.is_nan() {
                worst = (error, arguments, found, wanted);
            }
        }
        assert!(count > 3, "no reference values for {name}");
        if worst.0 > tolerance || worst.0.is_nan() {
            faults.push(format!(
                "{name}{:?}: found {:e}, wanted {:e}, error {:.1e} over {tolerance:.0e}",
                worst.1, worst.2, worst.3, worst.0
            ));
        }
    }
    assert!(faults.is_empty(), "\n{}", faults.join("\n"));
}

#[test]
fn every_line_is_looked_at() {
    for line in TABLE.lines() {
        let (name, ..) = parsed(line);
        assert!(FUNCTIONS.iter().any(|f| f.0 == name), "nobody checks {name}");
    }
}

#[test]
fn outside_the_domain_is_not_a_number() {
    let nan = f64::NAN;
    for (name, found) in [
        ("lgamma(-inf)", lgamma(f64::NEG_INFINITY)),
        ("digamma(0)", digamma(0.0)),
        ("digamma(-3)", digamma(-3.0)),
        ("digamma(-inf)", digamma(f64::NEG_INFINITY)),
        ("polygamma(1, 0)", polygamma(1, 0.0)),
        ("polygamma(2, -7)", polygamma(2, -7.0)),
        ("polygamma(2, -inf)", polygamma(2, f64::NEG_INFINITY)),
        ("logit(-0.1)", logit(-0.1)),
        ("logit(1.1)", logit(1.1)),
        ("log1mexp(-1)", log1mexp(-1.0)),
        ("log_sum_exp", log_sum_exp(&[1.0, nan])),
        ("log_mix of three", log_mix(&[1.0, 2.0, 3.0])),
        ("log_mix of a negative weight", log_mix(&[-1.0, 2.0])),
        ("normal_quantile(-0.1)", normal_quantile(-0.1)),
        ("normal_quantile(2)", normal_quantile(2.0)),
        ("normal_log_interval(1, 0)", normal_log_interval(1.0, 0.0)),
        ("deviance(-1, 1)", deviance(-1.0, 1.0)),
        ("deviance(1, -1)", deviance(1.0, -1.0)),
        ("deviance(NaN, 1)", deviance(nan, 1.0)),
        ("factorial_remainder(-1)", factorial_remainder(-1.0)),
        ("stirling_inverse(4, 1)", stirling_inverse(4.0, 1.0)),
        ("stirling_inverse(0.5, 1)", stirling_inverse(0.5, 1.0)),
        ("stirling_inverse(0, -1)", stirling_inverse(0.0, -1.0)),
        ("log1p_over(0, -2)", log1p_over(0.0, -2.0)),
        ("log1p_excess(5, 1)", log1p_excess(5.0, 1.0)),
        ("gamma_log_cdf(3, 1, 1)", gamma_log_cdf(3.0, 1.0, 1.0)),
        ("gamma_log_cdf(0, 0, 1)", gamma_log_cdf(0.0, 0.0, 1.0)),
        ("gamma_log_survival(0, 1, -1)", gamma_log_survival(0.0, 1.0, -1.0)),
        ("gamma_log_survival(0, inf, 1)", gamma_log_survival(0.0, f64::INFINITY, 1.0)),
        ("beta_log_cdf(1, 2, 1, 1, 0.5, 0.5)", beta_log_cdf(1.0, 2.0, 1.0, 1.0, 0.5, 0.5)),
        ("beta_log_cdf(0, 0, -1, 1, 0.5, 0.5)", beta_log_cdf(0.0, 0.0, -1.0, 1.0, 0.5, 0.5)),
        ("beta_log_cdf(0, 0, 1, 1, 1.5, -0.5)", beta_log_cdf(0.0, 0.0, 1.0, 1.0, 1.5, -0.5)),
        ("bessel_ratio(NaN)", bessel_ratio(nan)),
        ("bessel_i(0.5, -1)", bessel_i(0.5, -1.0)),
        ("bessel_i(-0.5, 1)", bessel_i(-0.5, 1.0)),
        ("bessel_i(inf, 1)", bessel_i(f64::INFINITY, 1.0)),
    ] {
        assert!(found.is_nan(), "{name} = {found}");
    }
    let one: [fn(f64) -> f64; 18] = [
        lgamma,
        digamma,
        erf,
        erfc,
        normal_cdf,
        normal_log_cdf,
        inverse_mills,
        inverse_mills_slope,
        normal_quantile,
        normal_log_density,
        logistic,
        log_logistic,
        logit,
        log1mexp,
        log_bessel_i0,
        bessel_ratio,
        bessel_ratio_slope,
        |x| polygamma(3, x),
    ];
    for (i, f) in one.iter().enumerate() {
        assert!(f(nan).is_nan(), "function {i} of NaN");
        // None may panic or hang, whatever it is given.
        for x in
            [0.0, -0.0, 5e-324, -5e-324, 1e308, -1e308, f64::INFINITY, f64::NEG_INFINITY, -1e17, -4503599627370497.5]
        {
            let _ = f(x);
        }
    }
    for (a, b) in [(nan, 1.0), (1.0, nan)] {
        assert!(normal_log_interval(a, b).is_nan() && bessel_i(a, b).is_nan());
    }
}

#[test]
fn limits() {
    let (inf, low) = (f64::INFINITY, f64::NEG_INFINITY);
    for (name, found, wanted) in [
        ("lgamma(0)", lgamma(0.0), inf),
        ("lgamma(-2)", lgamma(-2.0), inf),
        ("lgamma(inf)", lgamma(inf), inf),
        ("digamma(inf)", digamma(inf), inf),
        ("polygamma(2, inf)", polygamma(2, inf), 0.0),
        ("polygamma(0, 1)", polygamma(0, 1.0), digamma(1.0)),
        ("logistic(-inf)", logistic(low), 0.0),
        ("logistic(inf)", logistic(inf), 1.0),
        ("log_logistic(-inf)", log_logistic(low), low),
        ("log_logistic(inf)", log_logistic(inf), 0.0),
        ("logit(0)", logit(0.0), low),
        ("logit(1)", logit(1.0), inf),
        ("log1mexp(0)", log1mexp(0.0), low),
        ("log1mexp(inf)", log1mexp(inf), 0.0),
        ("log_sum_exp()", log_sum_exp(&[]), low),
        ("log_sum_exp(-inf, -inf)", log_sum_exp(&[low, low]), low),
        ("log_sum_exp(inf, 1)", log_sum_exp(&[inf, 1.0]), inf),
        ("log_mix(0, inf, 1, 2)", log_mix(&[0.0, inf, 1.0, 2.0]), 2.0),
        ("log_mix(0, 1)", log_mix(&[0.0, 1.0]), low),
        ("log_mix(1, -inf)", log_mix(&[1.0, low]), low),
        ("normal_cdf(-inf)", normal_cdf(low), 0.0),
        ("normal_cdf(inf)", normal_cdf(inf), 1.0),
        ("normal_log_cdf(-inf)", normal_log_cdf(low), low),
        ("normal_log_cdf(inf)", normal_log_cdf(inf), 0.0),
        ("inverse_mills(-inf)", inverse_mills(low), inf),
        ("inverse_mills(inf)", inverse_mills(inf), 0.0),
        ("inverse_mills_slope(-inf)", inverse_mills_slope(low), -1.0),
        ("inverse_mills_slope(inf)", inverse_mills_slope(inf), 0.0),
        ("normal_quantile(0)", normal_quantile(0.0), low),
        ("normal_quantile(1)", normal_quantile(1.0), inf),
        ("normal_log_interval(-inf, inf)", normal_log_interval(low, inf), 0.0),
        ("normal_log_interval(2, 2)", normal_log_interval(2.0, 2.0), low),
        ("deviance(0, 0)", deviance(0.0, 0.0), 0.0),
        ("deviance(0, inf)", deviance(0.0, inf), inf),
        ("deviance(2, 0)", deviance(2.0, 0.0), inf),
        ("deviance(inf, 2)", deviance(inf, 2.0), inf),
        ("factorial_remainder(0)", factorial_remainder(0.0), 0.0),
        ("factorial_remainder(inf)", factorial_remainder(inf), inf),
        ("stirling_inverse(0, 0)", stirling_inverse(0.0, 0.0), 0.0),
        ("stirling_inverse(1, 0)", stirling_inverse(1.0, 0.0), 1.0 / 12.0),
        ("stirling_inverse(3, 0)", stirling_inverse(3.0, 0.0), -1.0 / 60.0),
        ("log1p_over(0, -1)", log1p_over(0.0, -1.0), inf),
        ("log1p_over(1, -1)", log1p_over(1.0, -1.0), low),
        ("log1p_over(0, inf)", log1p_over(0.0, inf), 0.0),
        ("log1p_over(1, 0)", log1p_over(1.0, 0.0), -0.5),
        ("log1p_excess(0, 0)", log1p_excess(0.0, 0.0), 0.5),
        ("bessel_i(0, 0)", bessel_i(0.0, 0.0), 1.0),
        ("bessel_i(0.5, 0)", bessel_i(0.5, 0.0), 0.0),
        ("bessel_i(50, 0)", bessel_i(50.0, 0.0), 0.0),
        ("bessel_i(0, inf)", bessel_i(0.0, inf), inf),
        ("log_bessel_i0(0)", log_bessel_i0(0.0), 0.0),
        ("log_bessel_i0(-inf)", log_bessel_i0(low), inf),
        ("bessel_ratio(0)", bessel_ratio(0.0), 0.0),
        ("bessel_ratio(-inf)", bessel_ratio(low), -1.0),
        ("bessel_ratio_slope(0)", bessel_ratio_slope(0.0), 0.5),
        ("bessel_ratio_slope(inf)", bessel_ratio_slope(inf), 0.0),
        ("gamma_log_cdf(0, 2, 0)", gamma_log_cdf(0.0, 2.0, 0.0), low),
        ("gamma_log_cdf(0, 2, inf)", gamma_log_cdf(0.0, 2.0, inf), 0.0),
        ("gamma_log_survival(0, 2, 0)", gamma_log_survival(0.0, 2.0, 0.0), 0.0),
        ("gamma_log_survival(0, 2, inf)", gamma_log_survival(0.0, 2.0, inf), low),
        ("gamma_log_survival(0, 1, 1e308)", gamma_log_survival(0.0, 1.0, 1e308), -1e308),
        ("beta_log_cdf(0, 0, 2, 3, 0, 1)", beta_log_cdf(0.0, 0.0, 2.0, 3.0, 0.0, 1.0), low),
        ("beta_log_cdf(0, 0, 2, 3, 1, 0)", beta_log_cdf(0.0, 0.0, 2.0, 3.0, 1.0, 0.0), 0.0),
        ("bessel_i(3, 800)", bessel_i(3.0, 800.0), inf),
    ] {
        assert_eq!(found, wanted, "{name}");
    }
}
