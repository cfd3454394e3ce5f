//! The tails of counts against high-precision reference values.

use super::super::*;

/// Written by `tests/reference/count_functions.py` with mpmath.
const TABLE: &str = include_str!("../../../../tests/reference/count_functions.tsv");

type Evaluate = fn(&[f64]) -> f64;

/// Function, evaluation, where its orders stand, tolerance of a value (beside max(1, |value|)) and of a derivative (beside
/// itself, and a few parts of order one that may cancel to zero).
const FUNCTIONS: &[(&str, Evaluate, std::ops::Range<usize>, f64, f64)] = &[
    // Hundreds of factors by recurrence, each with some roundings.
    (
        "negative_binomial_log_tail",
        |a| negative_binomial_log_tail(a[0], a[1], a[2], a[3], a[4], a[5]),
        1..3,
        1e-13,
        1e-10,
    ),
    (
        "beta_binomial_log_tail",
        |a| beta_binomial_log_tail(a[0], a[1], a[2], a[3], a[4], a[5], a[6]),
        1..3,
        1e-13,
        1e-10,
    ),
    ("logarithmic_log_tail", |a| logarithmic_log_tail(a[0], a[1], a[2], a[3]), 1..2, 1e-13, 1e-10),
    ("hypergeometric_log_sum", |a| hypergeometric_log_sum(a[0], a[1], a[2], a[3], a[4]), 0..1, 1e-13, 1e-10),
    ("hypergeometric_log_mass", |a| hypergeometric_log_mass(a[0], a[1], a[2], a[3], a[4], a[5]), 0..1, 1e-13, 1e-10),
    (
        "hypergeometric_log_tail",
        |a| hypergeometric_log_tail(a[0], a[1], a[2], a[3], a[4], a[5], a[6]),
        1..2,
        1e-13,
        1e-10,
    ),
];

#[test]
fn every_function_agrees_with_its_reference() {
    let mut faults = Vec::new();
    for (name, evaluate, orders, value, derivative) in FUNCTIONS {
        let mut count = 0;
        for line in TABLE.lines() {
            let cells: Vec<&str> = line.split('\t').collect();
            if cells[0] != *name {
                continue;
            }
            count += 1;
            let arguments: Vec<f64> = cells[1].split(' ').map(|x| x.parse().unwrap()).collect();
            let wanted: f64 = cells[2].parse().unwrap();
            let found = evaluate(&arguments);
            let plain = arguments[orders.clone()].iter().all(|&o| o == 0.0);
            let tolerance = if plain { value * wanted.abs().max(1.0) } else { derivative * wanted.abs() + 1e-13 };
            let close = (found - wanted).abs() <= tolerance;
            if !close {
                let error = (found - wanted).abs() / wanted.abs();
                faults
                    .push(format!("{name}{arguments:?}: found {found:e}, wanted {wanted:e}, off by {error:.1e} of it"));
            }
        }
        assert!(count > 20, "no reference values for {name}");
    }
    assert!(faults.is_empty(), "{} faults\n{}", faults.len(), faults.join("\n"));
}

#[test]
fn every_line_is_looked_at() {
    for line in TABLE.lines() {
        assert!(FUNCTIONS.iter().any(|f| line.split('\t').next() == Some(f.0)), "nobody checks {line}");
    }
}
