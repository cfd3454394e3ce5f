//! Maxima on kinks, against medians and lines found by trying all that there are.

use crate::data::{Column, Table};
use crate::likelihood::model::{Component, Event, Form, Model, Response, Setting, Terms};
use crate::likelihood::{LogLikelihood, Order, Sample, prepare};
use crate::math::{Random, Vector};
use crate::restriction::{Draft, Role, System};
use crate::solve::testing::close;
use crate::solve::{Fit, Problem, Search, Verdict, maximise};

fn table(columns: Vec<Column>, weights: Option<Vec<f64>>) -> Table {
    Table::from_columns(columns, weights).unwrap()
}

fn laplace() -> Model {
    Model { family: "laplace".into(), response: Response::Column("y".into()), ..Model::default() }
}

fn on_terms(terms: &[&str]) -> Model {
    let terms = Terms {
        terms: terms.iter().map(|t| vec![t.to_string()]).collect(),
        link: None,
        intercept: true,
        full: false,
        offset: None,
    };
    let setting = Setting { name: "location".into(), form: Form::Terms(terms), ..Setting::default() };
    Model { parameters: vec![setting], ..laplace() }
}

fn fit(sample: &Sample, restrictions: &[&str]) -> Fit {
    let names: Vec<String> = sample.parameters().iter().map(|p| p.name.clone()).collect();
    let draft =
        |text: &&str| Draft { name: None, role: Role::Maintained, text: text.to_string(), place: "test".into() };
    let mut drafts: Vec<Draft> = restrictions.iter().map(draft).collect();
    drafts.extend(sample.family_restrictions().iter().map(|t| draft(&t.as_str())));
    let system = System::compile(&drafts, &names, &[]).unwrap();
    let search = Search { second_opinion: true, ..Search::default() };
    maximise(Problem { likelihood: sample, restrictions: &system }, &search, &[]).unwrap()
}

fn at(sample: &Sample, name: &str) -> usize {
    sample.parameters().iter().position(|p| p.name == name).unwrap()
}

#[track_caller]
fn strict(fit: &Fit) {
    let c = &fit.certificate;
    assert_eq!(c.verdict, Verdict::StrictMaximum, "{:#?} {:?}", c, fit.theta);
    assert!(c.stationarity <= 1e-7 && c.feasibility <= 1e-9 && c.derivatives <= 1e-6, "{c:#?}");
    assert_eq!(c.second_opinion, Some(true));
}

fn y(values: &[f64]) -> Column {
    Column::numbers("y", values.to_vec())
}

#[test]
fn an_odd_number_of_rows_has_its_median() {
    let rows = [11.0, 1.0, 4.0, 2.0, 7.0];
    let s = prepare(&laplace(), &table(vec![y(&rows)], None)).unwrap();
    let fit = fit(&s, &[]);
    strict(&fit);
    close(fit.theta[0], 4.0, 1e-14);
    // mean distance from it: (7 + 3 + 0 + 2 + 3) / 5
    close(fit.theta[1], 3.0, 1e-13);
    close(fit.log_likelihood, -5.0 * 6.0f64.ln() - 5.0, 1e-14);
    let note = fit.certificate.notes.iter().find(|n| n.contains("kink")).unwrap();
    assert!(note.contains("line 3 is met exactly"), "{note}");
    // one row is met and one direction is left
    assert_eq!(fit.certificate.rank, 0);
    assert_eq!(fit.multipliers.len(), 0);
    close(fit.slope.unwrap().amax(), 0.0, 1e-10);
}

#[test]
fn far_from_zero_and_in_small_units_too() {
    for (shift, unit) in [(1e6, 1.0), (-3e5, 1.0), (2e3, 1e-3), (0.0, 1e-6), (0.0, 1e7)] {
        let rows: Vec<f64> = [0.5, 1.0, 4.0, 2.0, 7.0, 3.25, 9.5].iter().map(|x| shift + unit * x).collect();
        let s = prepare(&laplace(), &table(vec![y(&rows)], None)).unwrap();
        let fit = fit(&s, &[]);
        strict(&fit);
        assert!((fit.theta[0] - rows[5]).abs() <= 1e-9 * unit + 1e-15 * shift.abs(), "{} {}", fit.theta[0], rows[5]);
    }
}

#[test]
fn weights_move_the_median() {
    let (rows, weights) = ([1.0, 2.0, 4.0, 7.0], [3.0, 1.0, 2.5, 0.25]);
    let s = prepare(&laplace(), &table(vec![y(&rows)], Some(weights.to_vec()))).unwrap();
    let fit = fit(&s, &[]);
    strict(&fit);
    // half of 6.75 is reached within the second value
    close(fit.theta[0], 2.0, 1e-14);
    close(fit.theta[1], (3.0 + 5.0 + 1.25) / 6.75, 1e-13);
}

#[test]
fn rows_that_are_alike_are_one_kink() {
    let rows = [1.0, 4.0, 4.0, 4.0, 9.0, 11.0];
    let s = prepare(&laplace(), &table(vec![y(&rows)], None)).unwrap();
    let fit = fit(&s, &[]);
    strict(&fit);
    close(fit.theta[0], 4.0, 1e-14);
    close(fit.theta[1], 15.0 / 6.0, 1e-13);
}

#[test]
fn an_even_number_of_rows_leaves_an_interval() {
    let s = prepare(&laplace(), &table(vec![y(&[1.0, 2.0, 4.0, 7.0])], None)).unwrap();
    let fit = fit(&s, &[]);
    assert_eq!(fit.certificate.verdict, Verdict::Flat, "{:#?}", fit.certificate);
    assert!((2.0..=4.0).contains(&fit.theta[0]));
    close(fit.theta[1], 2.0, 1e-12);
    assert_eq!(fit.certificate.flat.len(), 1);
    assert_eq!(fit.certificate.flat[0].weights, vec![(0, 1.0)]);
}

#[test]
fn thousands_of_rows() {
    let mut random = Random::new(7, 0);
    let mut rows: Vec<f64> = (0..5001).map(|_| 3.0 + random.exponential() - random.exponential()).collect();
    let s = prepare(&laplace(), &table(vec![y(&rows)], None)).unwrap();
    let fit = fit(&s, &[]);
    strict(&fit);
    rows.sort_by(f64::total_cmp);
    close(fit.theta[0], rows[2500], 1e-14);
}

#[test]
fn two_levels_with_one_location() {
    let a = [3.0, 5.5, 4.0, 8.25, 6.0, 1.0];
    let b = [2.0, 9.0, 4.5, 3.5, 5.0];
    let rows: Vec<f64> = a.iter().chain(&b).copied().collect();
    let kiln: Vec<&str> = (0..11).map(|i| if i < 6 { "north" } else { "south" }).collect();
    let model = Model { per: Some("kiln".into()), ..laplace() };
    let s = prepare(&model, &table(vec![y(&rows), Column::labels("kiln", &kiln)], None)).unwrap();
    let fit = fit(&s, &["north.location = south.location"]);
    strict(&fit);
    // profile: - sum n log(2 mean distance) - n, at its best in some row
    let mean = |list: &[f64], m: f64| list.iter().map(|y| (y - m).abs()).sum::<f64>() / list.len() as f64;
    let profile = |m: f64| -6.0 * (2.0 * mean(&a, m)).ln() - 5.0 * (2.0 * mean(&b, m)).ln() - 11.0;
    let best = rows.iter().copied().max_by(|x, z| profile(*x).total_cmp(&profile(*z))).unwrap();
    close(fit.theta[at(&s, "north.location")], best, 1e-13);
    close(fit.theta[at(&s, "south.location")], best, 1e-13);
    close(fit.log_likelihood, profile(best), 1e-13);
    // the slope in the kiln that the row is not of is the multiplier's
    let (other, sign) = if a.contains(&best) { (&b[..], -1.0) } else { (&a[..], 1.0) };
    let slope = other.iter().map(|y| (y - best).signum()).sum::<f64>() / mean(other, best);
    close(fit.multipliers[0], sign * slope, 1e-11);
}

/// Least sum of |y - a - b x| over all lines through two rows.
fn by_pairs(x: &[f64], y: &[f64]) -> (f64, f64, f64) {
    let mut best = (f64::INFINITY, 0.0, 0.0);
    for i in 0..x.len() {
        for j in (0..i).filter(|&j| x[j] != x[i]) {
            let slope = (y[i] - y[j]) / (x[i] - x[j]);
            let start = y[i] - slope * x[i];
            let sum: f64 = x.iter().zip(y).map(|(x, y)| (y - start - slope * x).abs()).sum();
            if sum < best.0 {
                best = (sum, start, slope);
            }
        }
    }
    best
}

#[test]
fn lines_of_least_absolute_deviations() {
    let mut random = Random::new(3, 0);
    for n in [12, 25, 60] {
        let x: Vec<f64> = (0..n).map(|_| 10.0 * random.uniform()).collect();
        let rows: Vec<f64> =
            x.iter().map(|x| 2.0 - 0.5 * x + random.exponential() - 2.0 * random.exponential()).collect();
        let s = prepare(&on_terms(&["x"]), &table(vec![y(&rows), Column::numbers("x", x.clone())], None)).unwrap();
        let fit = fit(&s, &[]);
        let (sum, start, slope) = by_pairs(&x, &rows);
        strict(&fit);
        close(fit.theta[at(&s, "location.intercept")], start, 1e-11);
        close(fit.theta[at(&s, "location.x")], slope, 1e-11);
        close(fit.theta[at(&s, "scale")], sum / n as f64, 1e-11);
    }
}

#[test]
fn lines_on_a_grid_where_more_rows_tie_than_there_are_coefficients() {
    let mut random = Random::new(5, 0);
    let whole = |z: f64| z.floor();
    let mut strict_seen = 0;
    for turn in 0..12 {
        let n = 15 + turn;
        let x: Vec<f64> = (0..n).map(|_| whole(5.0 * random.uniform())).collect();
        let rows: Vec<f64> = x.iter().map(|x| x + whole(3.0 * random.uniform())).collect();
        let s = prepare(&on_terms(&["x"]), &table(vec![y(&rows), Column::numbers("x", x.clone())], None)).unwrap();
        let fit = fit(&s, &[]);
        let (sum, ..) = by_pairs(&x, &rows);
        let value = -(n as f64) * ((2.0 * sum / n as f64).ln() + 1.0);
        assert!(
            matches!(fit.certificate.verdict, Verdict::StrictMaximum | Verdict::Flat),
            "{turn}: {:#?}",
            fit.certificate
        );
        strict_seen += usize::from(fit.certificate.verdict == Verdict::StrictMaximum);
        close(fit.log_likelihood, value, 1e-12);
        if fit.certificate.verdict == Verdict::StrictMaximum {
            // nothing near is as high
            for k in 0..40 {
                let angle = 0.157 * f64::from(k);
                let mut phi = fit.phi.clone();
                phi[at(&s, "location.intercept")] += 1e-4 * angle.cos();
                phi[at(&s, "location.x")] += 1e-4 * angle.sin();
                assert!(s.evaluate(&phi, Order::Value).value < fit.log_likelihood - 1e-9, "{turn} {k}");
            }
        }
    }
    assert!(strict_seen >= 6, "{strict_seen}");
}

#[test]
fn a_location_that_is_fixed_on_a_row_leaves_no_kink_to_sit_on() {
    let s = prepare(&laplace(), &table(vec![y(&[1.0, 2.0, 3.0, 7.0, 8.0, 9.0])], None)).unwrap();
    let fit = fit(&s, &["location = 3"]);
    strict(&fit);
    let scale = (2.0 + 1.0 + 4.0 + 5.0 + 6.0) / 6.0;
    close(fit.theta[1], scale, 1e-13);
    // three above, two below, the row itself on neither side
    close(fit.multipliers[0], 1.0 / scale, 1e-12);
}

#[test]
fn censored_rows_and_mixtures() {
    let rows = [1.0, 2.5, 3.0, 4.25, 5.0, 6.5, 8.0, 9.75, 12.0];
    let seen = Column::numbers("seen", vec![1.0, 1.0, 0.0, 1.0, 1.0, 1.0, 0.0, 1.0, 1.0]);
    let model = Model { event: Some(Event { column: "seen".into(), seen: None }), ..laplace() };
    let s = prepare(&model, &table(vec![y(&rows), seen], None)).unwrap();
    let censored = fit(&s, &[]);
    strict(&censored);
    // l by hand, on a fine grid of locations in every row and between, with the scale free
    let l = |m: f64, b: f64| {
        let one = |(i, &y): (usize, &f64)| {
            let z = (y - m) / b;
            match i {
                2 | 6 if z < 0.0 => (1.0 - 0.5 * z.exp()).ln(),
                2 | 6 => 0.5f64.ln() - z,
                _ => -(2.0 * b).ln() - z.abs(),
            }
        };
        rows.iter().enumerate().map(one).sum::<f64>()
    };
    let (m, b) = (censored.theta[0], censored.theta[1]);
    close(censored.log_likelihood, l(m, b), 1e-13);
    for i in 0..400 {
        for k in 0..100 {
            assert!(l(1.0 + 0.025 * f64::from(i), 1.0 + 0.05 * f64::from(k)) <= censored.log_likelihood + 1e-12);
        }
    }
    let mut random = Random::new(11, 0);
    let rows: Vec<f64> = (0..121)
        .map(|i| if i % 3 == 0 { 9.0 + 0.7 * random.normal() } else { random.exponential() - random.exponential() })
        .collect();
    let component =
        |name: &str, family: &str| Component { name: name.into(), family: family.into(), ..Component::default() };
    let model = Model {
        family: "mixture".into(),
        response: Response::Column("y".into()),
        components: vec![component("sharp", "laplace"), component("round", "normal")],
        ..Model::default()
    };
    let s = prepare(&model, &table(vec![y(&rows)], None)).unwrap();
    let mixed = fit(&s, &[]);
    strict(&mixed);
    let sharp = mixed.theta[at(&s, "sharp.location")];
    assert!(rows.iter().any(|y| (y - sharp).abs() < 1e-12), "{sharp}");
}

#[test]
fn a_perfect_fit_has_no_maximum() {
    let s = prepare(&laplace(), &table(vec![y(&[3.0, 3.0, 3.0])], None)).unwrap();
    let fit = fit(&s, &[]);
    assert_eq!(fit.certificate.verdict, Verdict::Unbounded, "{:#?}", fit.certificate);
}

#[test]
fn kinks_at_which_no_maximum_sits_are_left_alone() {
    // the square pulls to 2, the ridge at 1 is a valley of l
    let model = Model {
        family: "custom".into(),
        log_density: Some("-(y - a)^2 + abs(a - 1) / 10".into()),
        parameters: vec![Setting { name: "a".into(), start: vec![(None, 1.5)], ..Setting::default() }],
        ..Model::default()
    };
    let s = prepare(&model, &table(vec![y(&[2.0, 2.5])], None)).unwrap();
    let fit = fit(&s, &[]);
    strict(&fit);
    close(fit.theta[0], 2.3, 1e-9);
    assert!(fit.slope.is_none());
    let restricted = Vector::from_vec(vec![1.0]);
    assert!(s.evaluate(&restricted, Order::Value).value < fit.log_likelihood);
}
