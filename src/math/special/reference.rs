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
    ("normal_quantile", |a| normal_quantile(a[0]), Relative, 2e-15),
    ("normal_log_interval", |a| normal_log_interval(a[0], a[1]), Relative, 4e-15),
    ("interval_slope_a", |a| normal_interval_slopes(a[0], a[1]).0, Relative, 1e-14),
    ("interval_slope_b", |a| normal_interval_slopes(a[0], a[1]).1, Relative, 1e-14),
    ("log_logistic", |a| log_logistic(a[0]), Relative, 1e-15),
    ("logistic", |a| logistic(a[0]), Relative, 1e-15),
    ("logit", |a| logit(a[0]), Relative, 1e-15),
    ("log1mexp", |a| log1mexp(a[0]), Relative, 1e-15),
    // The sum may be near one, and its logarithm near zero.
    ("log_sum_exp", log_sum_exp, Mixed, 1e-15),
    ("log_mix", log_mix, Mixed, 1e-15),
    // As promised up to order 1000: exponents up to some hundred carry eps each.
    ("bessel_i", |a| bessel_i(a[0], a[1]), Relative, 1e-12),
    ("bessel_i_scaled", |a| bessel_i_scaled(a[0], a[1]), Relative, 1e-12),
    ("chi_square_upper", |a| tail::chi_square_upper(a[0], a[1]), Relative, 1e-12),
    ("chi_square_log10_upper", |a| tail::chi_square_log10_upper(a[0], a[1]), Relative, 1e-12),
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
            if !(error <= worst.0) {
                worst = (error, arguments, found, wanted);
            }
        }
        assert!(count > 4, "no reference values for {name}");
        if !(worst.0 <= tolerance) {
            faults.push(format!(
                "{name}{:?}: found {:e}, wanted {:e}, error {:.1e} over {tolerance:.0e}",
                worst.1, worst.2, worst.3, worst.0
            ));
        }
        if std::env::var_os("GUYLINE_SHOW_ERRORS").is_some() {
            faults.push(format!("{name}: {count} values, worst {:.1e} at {:?}", worst.0, worst.1));
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
