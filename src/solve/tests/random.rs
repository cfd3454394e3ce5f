//! Random problems with closed forms.

use proptest::prelude::{ProptestConfig, prop, prop_assert, proptest};

use crate::math::{Matrix, Vector};
use crate::solve::testing::{Case, Jet};
use crate::solve::{Search, Verdict};

/// l = b'x - x'Px/2 with P = M M' + I/10, restrictions A x = r.
fn quadratic(n: usize, m: &[f64], b: &[f64], a: &[Vec<f64>], r: &[f64]) -> (Case, Vector, Vector) {
    let root = Matrix::from_fn(n, n, |i, j| m[i * n + j]);
    let p = &root * root.transpose() + Matrix::identity(n, n) * 0.1;
    let k = a.len();
    let mut kkt = Matrix::zeros(n + k, n + k);
    kkt.view_mut((0, 0), (n, n)).copy_from(&p);
    for (i, row) in a.iter().enumerate() {
        for (j, &x) in row.iter().take(n).enumerate() {
            kkt[(n + i, j)] = x;
            kkt[(j, n + i)] = x;
        }
    }
    let right = Vector::from_iterator(n + k, b.iter().take(n).chain(r).copied());
    let answer = kkt.full_piv_lu().solve(&right).unwrap_or_else(|| Vector::zeros(n + k));
    let (b, start) = (b.to_vec(), vec![0.5; n]);
    let mut case = Case::new(&start, move |x| {
        let mut l = x[0].constant(0.0);
        for i in 0..n {
            l = l + &x[i] * b[i];
            for j in 0..n {
                l = l - &x[i] * &x[j] * (0.5 * p[(i, j)]);
            }
        }
        l
    });
    for (i, row) in a.iter().enumerate() {
        let row = row.clone();
        case = case.linear("row", r[i], move |x: &[Jet]| (0..n).fold(x[0].constant(0.0), |s, j| s + &x[j] * row[j]));
    }
    (case, answer.rows(0, n).into_owned(), answer.rows(n, k).into_owned())
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 500, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn linear_restrictions_agree_with_the_closed_form(
        n in 2usize..7,
        m in prop::collection::vec(-1.0f64..1.0, 36),
        b in prop::collection::vec(-3.0f64..3.0, 6),
        a in prop::collection::vec(prop::collection::vec(-1.0f64..1.0, 6), 1..3),
        r in prop::collection::vec(-1.0f64..1.0, 3),
        doubled in prop::bool::ANY,
    ) {
        let k = a.len().min(n - 1);
        let a = &a[..k];
        let rows = Matrix::from_fn(k, n, |i, j| a[i][j]);
        let singular = rows.clone().svd(false, false).singular_values;
        // Nearly dependent rows are another test.
        if singular.min() > 1e-2 {
            let (mut case, x, lambda) = quadratic(n, &m, &b, a, &r[..k]);
            if doubled {
                let (row, right) = (a[0].clone(), -3.0 * r[0]);
                case = case.linear("again", right, move |x: &[Jet]| (0..n).fold(x[0].constant(0.0), |s, j| s - &x[j] * (3.0 * row[j])));
            }
            let fit = case.search(&Search { starts: Some(1), ..Search::default() });
            prop_assert!(fit.certificate.verdict == Verdict::StrictMaximum, "{:#?}", fit.certificate);
            prop_assert!((&fit.theta - &x).amax() <= 1e-8 * (1.0 + x.amax()));
            prop_assert!((fit.multipliers.rows(0, k) - &lambda).amax() <= 1e-7 * (1.0 + lambda.amax()));
            prop_assert!(fit.redundant.len() == usize::from(doubled));
        }
    }
}
