//! Likelihoods of the everyday kind.

use crate::math::Range;
use crate::solve::testing::{Case, Jet, close};
use crate::solve::{End, Fit, Search, Verdict};

/// Normal sample with mean x1 and sd x2, by its sufficient statistics.
fn normal(rows: &[f64], start: &[f64]) -> Case {
    let rows = rows.to_vec();
    let at = start.to_vec();
    Case::new(&at, move |x| {
        let zero = x[0].constant(0.0);
        rows.iter().fold(zero, |sum, &y| {
            let z = (y - &x[0]) / &x[1];
            sum - x[1].ln() - 0.5 * z.sq()
        })
    })
    .range(1, Range::POSITIVE)
}

/// Counts n with shares x.
fn shares(counts: &[f64], start: &[f64]) -> Case {
    let counts = counts.to_vec();
    let k = counts.len();
    let mut case = Case::new(start, move |x| {
        let zero = x[0].constant(0.0);
        counts.iter().enumerate().filter(|(_, n)| **n > 0.0).fold(zero, |sum, (i, &n)| sum + x[i].ln() * n)
    })
    .concave();
    for j in 0..k {
        case = case.range(j, Range::UNIT);
    }
    case.linear("sum", 1.0, total)
}

fn total(x: &[Jet]) -> Jet {
    x.iter().skip(1).fold(x[0].clone(), |sum, y| sum + y)
}

#[track_caller]
fn strict(fit: &Fit) {
    assert_eq!(
        fit.certificate.verdict,
        Verdict::StrictMaximum,
        "{:#?} {:#?}",
        fit.certificate,
        fit.trace.iter().take(12).collect::<Vec<_>>()
    );
    assert!(fit.certificate.feasibility <= 1e-9 && fit.certificate.stationarity <= 1e-7);
    assert!(fit.certificate.derivatives <= 1e-6, "derivatives {:e}", fit.certificate.derivatives);
}

#[test]
fn normal_with_the_mean_restricted() {
    // Restricted: sd^2 = mean of (y - 2)^2 = 11/4; multiplier: sum (y - 2) / sd^2.
    let rows = [1.0, 2.0, 4.0, 1.0 + 4.0];
    let fit = normal(&rows, &[0.3, 5.0]).linear("mean", 2.0, |x| x[0].clone()).fit();
    strict(&fit);
    close(fit.theta[0], 2.0, 1e-15);
    close(fit.theta[1], (14.0f64 / 4.0).sqrt(), 1e-14);
    close(fit.multipliers[0], 4.0 / (14.0 / 4.0), 1e-13);
    assert_eq!(fit.certificate.rank, 1);
}

#[test]
fn multipliers_are_slopes_of_the_maximum() {
    let rows = [1.0, 2.0, 4.0, 5.0, 9.0];
    let at = |right: f64| normal(&rows, &[3.0, 2.0]).equal("ratio", right, |x| &x[0] / &x[1]).fit();
    let (fit, below, above) = (at(2.0), at(2.0 - 1e-4), at(2.0 + 1e-4));
    strict(&fit);
    close(fit.multipliers[0], (above.log_likelihood - below.log_likelihood) / 2e-4, 1e-7);
}

#[test]
fn shares_with_a_zero_cell_stand_on_the_edge() {
    // Closed form: shares n_k / N; the edge's multiplier: slope of the empty cell minus that of the sum, 0 - N.
    let fit = shares(&[30.0, 0.0, 50.0, 20.0], &[0.25; 4]).fit();
    strict(&fit);
    for (got, wanted) in fit.theta.iter().zip([0.3, 0.0, 0.5, 0.2]) {
        close(*got, wanted, 1e-13);
    }
    assert_eq!(fit.theta[1], 0.0);
    assert_eq!(fit.edges.len(), 1);
    assert_eq!((fit.edges[0].parameter, fit.edges[0].end), (1, End::Lower));
    close(fit.edges[0].multiplier, -100.0, 1e-10);
    close(fit.multipliers[0], 100.0, 1e-10);
}

#[test]
fn many_zero_cells_and_a_start_on_the_wrong_edges() {
    let counts = [0.0, 12.0, 0.0, 0.0, 5.0, 0.0, 0.0, 3.0];
    let mut start = [0.0; 8];
    start[0] = 0.4;
    start[1] = 0.2;
    start[4] = 0.2;
    start[7] = 0.2;
    let fit = shares(&counts, &start).fit();
    strict(&fit);
    for (got, n) in fit.theta.iter().zip(counts) {
        close(*got, n / 20.0, 1e-13);
    }
    assert_eq!(fit.edges.len(), 5);
}

#[test]
fn all_shares_fixed_leave_no_free_direction() {
    // Multipliers by hand: with the shares fixed at p, sum and three of the four fixed: slope n_4/p_4 of the last goes to the
    // sum, the others' excess over it to theirs.
    let counts = [10.0, 20.0, 30.0, 40.0];
    let fit = shares(&counts, &[0.25; 4])
        .linear("a", 0.25, |x| x[0].clone())
        .linear("b", 0.25, |x| x[1].clone())
        .linear("c", 0.25, |x| x[2].clone())
        .fit();
    strict(&fit);
    assert_eq!(fit.certificate.curvature_min, None);
    for (got, wanted) in fit.multipliers.iter().zip([160.0, -120.0, -80.0, -40.0]) {
        close(*got, wanted, 1e-12);
    }
}

#[test]
fn an_edge_fixed_by_a_restriction_leaves_its_slope_to_the_restriction() {
    let fit = shares(&[30.0, 0.0, 70.0], &[0.3, 0.3, 0.4]).linear("none", 0.0, |x| x[1].clone()).fit();
    strict(&fit);
    close(fit.multipliers[1], -100.0, 1e-10);
    assert_eq!(fit.edges.len(), 1);
    assert_eq!(fit.edges[0].multiplier, 0.0);
    assert!(fit.redundant.is_empty());
}

#[test]
fn linkage() {
    // Counts 125, 18, 20, 34 (Rao 1973): root of 197 t^2 - 15 t - 68 = 0.
    let fit = Case::new(&[0.5], |x| {
        let t = &x[0];
        (0.5 + 0.25 * t).ln() * 125.0 + (0.25 * (1.0 - t)).ln() * 38.0 + (0.25 * t).ln() * 34.0
    })
    .range(0, Range::UNIT)
    .fit();
    strict(&fit);
    close(fit.theta[0], (15.0 + (225.0f64 + 4.0 * 197.0 * 68.0).sqrt()) / 394.0, 1e-14);
}

#[test]
fn linkage_as_shares_with_restrictions() {
    let fit = shares(&[125.0, 18.0, 20.0, 34.0], &[0.4, 0.2, 0.2, 0.2])
        .linear("same", 0.0, |x| &x[1] - &x[2])
        .linear("link", 0.5, |x| &x[0] - &x[3])
        .fit();
    strict(&fit);
    let t = (15.0 + (225.0f64 + 4.0 * 197.0 * 68.0).sqrt()) / 394.0;
    close(fit.theta[3], 0.25 * t, 1e-14);
    // grad = A' mu + H' lambda: share 2: 18/p2 = mu + l1, share 3: 20/p3 = mu - l1.
    close(fit.multipliers[1], (18.0 - 20.0) / (2.0 * fit.theta[1]), 1e-11);
}

#[test]
fn blood_groups_under_a_square_root_restriction() {
    // Counts A 212, B 103, AB 39, O 148 (recalled from Rao 1973, after Clarke and others): shares with the gene model as
    // a restriction on them; the answer agrees with maximising over the gene frequencies.
    let counts = [212.0, 103.0, 39.0, 148.0];
    let restricted = shares(&counts, &[0.4, 0.2, 0.1, 0.3])
        .equal("gene", 1.0, |x| {
            let (a, b, o) = ((&x[0] + &x[3]).sqrt(), (&x[1] + &x[3]).sqrt(), x[3].sqrt());
            (a - &o) + (b - &o) + o
        })
        .fit();
    strict(&restricted);
    let genes = Case::new(&[0.3, 0.2], |x| {
        let (p, q) = (&x[0], &x[1]);
        let r = 1.0 - p - q;
        (p.sq() + 2.0 * p * &r).ln() * 212.0
            + (q.sq() + 2.0 * q * &r).ln() * 103.0
            + (2.0 * p * q).ln() * 39.0
            + r.sq().ln() * 148.0
    })
    .range(0, Range::UNIT)
    .range(1, Range::UNIT)
    .fit();
    strict(&genes);
    // The share of AB must be 2pq under the gene model: three free shares, two genes, one restriction.
    let (p, q) = (genes.theta[0], genes.theta[1]);
    let model = Case::new(&[0.3], |x| x[0].sq() * -1.0).fit();
    assert_eq!(model.theta[0], 0.0);
    let r = 1.0 - p - q;
    for (got, wanted) in restricted.theta.iter().zip([p * p + 2.0 * p * r, q * q + 2.0 * q * r, 2.0 * p * q, r * r]) {
        close(*got, wanted, 1e-9);
    }
    close(restricted.log_likelihood, genes.log_likelihood, 1e-12);
}

/// Bernoulli rows (x, y) on a logistic line.
fn logistic(rows: &'static [(f64, f64)], start: &[f64]) -> Case {
    Case::new(start, move |b| {
        let zero = b[0].constant(0.0);
        rows.iter().fold(zero, |sum, &(x, y)| {
            let eta = &b[0] + &(&b[1] * x);
            // log(1 + exp(eta)) without overflow.
            let log1p = if eta.v > 0.0 { &eta + (1.0 + (-eta.clone()).exp()).ln() } else { (1.0 + eta.exp()).ln() };
            sum + &eta * y - log1p
        })
    })
    .concave()
}

#[test]
fn logistic_regression_under_a_linear_restriction() {
    static ROWS: [(f64, f64); 6] = [(0.0, 0.0), (1.0, 0.0), (2.0, 1.0), (3.0, 0.0), (4.0, 1.0), (5.0, 1.0)];
    let free = logistic(&ROWS, &[0.0, 0.0]).fit();
    strict(&free);
    let fit = logistic(&ROWS, &[0.0, 0.0]).linear("centre", 0.0, |b| &b[0] + 2.0 * &b[1]).fit();
    strict(&fit);
    close(fit.theta[0] + 2.0 * fit.theta[1], 0.0, 1e-14);
    assert!(fit.log_likelihood <= free.log_likelihood);
    assert!(fit.certificate.iterations <= 8);
}

#[test]
fn separated_rows_have_no_maximum() {
    static ROWS: [(f64, f64); 4] = [(0.0, 0.0), (1.0, 0.0), (2.0, 1.0), (3.0, 1.0)];
    let fit = logistic(&ROWS, &[0.0, 0.0]).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Unbounded, "{:#?}", fit.certificate);
    static UNTIED: [(f64, f64); 4] = [(0.0, 1.0), (1.0, 1.0), (2.0, 1.0), (3.0, 1.0)];
    let fit = logistic(&UNTIED, &[0.0, 0.0]).linear("level", 0.0, |b| b[1].clone()).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Unbounded, "{:#?}", fit.certificate);
    assert!(fit.certificate.reason.unwrap().contains("`x1` grows without end"));
}

#[test]
fn a_perfect_fit_sends_the_spread_to_zero() {
    let fit = normal(&[3.0, 3.0, 3.0], &[2.5, 1.0]).fit();
    assert_eq!(fit.certificate.verdict, Verdict::Unbounded, "{:#?}", fit.certificate);
    assert!(fit.certificate.reason.unwrap().contains("`x2` falls to the open end 0"));
}

#[test]
fn mixture_of_two_normals_from_many_starts() {
    // Rows without a source, two groups round 0 and 5; common sd, share of the first.
    let rows = [-1.1, -0.4, 0.0, 0.3, 0.8, 1.2, 4.1, 4.6, 5.0, 5.2, 5.9];
    let case = Case::new(&[0.5, -1.0, 6.0, 2.0], move |x| {
        let zero = x[0].constant(0.0);
        rows.iter().fold(zero, |sum, &y| {
            let part = |mean: &Jet| (-0.5 * ((y - mean) / &x[3]).sq()).exp() / &x[3];
            sum + (&x[0] * part(&x[1]) + (1.0 - &x[0]) * part(&x[2])).ln()
        })
    })
    .range(0, Range::UNIT)
    .range(3, Range::POSITIVE);
    let fit = case.search(&Search::default());
    strict(&fit);
    assert_eq!(fit.certificate.starts, 20);
    assert!(fit.certificate.starts_at_best >= 1);
    let (one, other) = (fit.theta[1].min(fit.theta[2]), fit.theta[1].max(fit.theta[2]));
    assert!(one < 0.5 && other > 4.5, "{:?}", fit.theta);
    let halves = case.linear("half", 0.5, |x| x[0].clone()).search(&Search::default());
    strict(&halves);
    assert!(halves.log_likelihood <= fit.log_likelihood);
    assert!(halves.certificate.iterations <= 30);
}
