//! Tests of the Laplace family, whose restricted and unrestricted maxima sit on kinks.

use super::*;
use crate::data::{Column, Table};
use crate::likelihood::model::{Model, Response};
use crate::likelihood::{Sample, prepare};

fn sample(rows: &[f64], kiln: Option<&[&str]>) -> Sample {
    let mut columns = vec![Column::numbers("y", rows.to_vec())];
    columns.extend(kiln.map(|k| Column::labels("kiln", k)));
    let model = Model {
        family: "laplace".into(),
        response: Response::Column("y".into()),
        per: kiln.map(|_| "kiln".into()),
        ..Model::default()
    };
    prepare(&model, &Table::from_columns(columns, None).unwrap()).unwrap()
}

fn distance(rows: &[f64], m: f64) -> f64 {
    rows.iter().map(|y| (y - m).abs()).sum::<f64>() / rows.len() as f64
}

#[test]
fn the_score_of_a_location_is_that_of_signs() {
    for rows in [[1.0, 2.0, 4.0, 7.0, 8.0, 9.5, 12.0], [1.0, 3.0, 4.0, 7.0, 8.0, 9.5, 12.0]] {
        let s = sample(&rows, None);
        let outcome = infer(&s, &system(&s, &[], &["location = 3"]), None);
        // a row on the value tested is on neither side
        let signs: f64 = rows.iter().map(|y| if *y == 3.0 { 0.0 } else { (y - 3.0f64).signum() }).sum();
        close(outcome.score.as_ref().unwrap().chi_square, signs * signs / 7.0);
        // by the sample median of 7
        close(outcome.lr.as_ref().unwrap().chi_square, 14.0 * (distance(&rows, 3.0) / distance(&rows, 7.0)).ln());
        let scale = distance(&rows, 7.0);
        close(outcome.wald.as_ref().unwrap().chi_square, 16.0 * 7.0 / (scale * scale));
        let free = outcome.unrestricted.as_ref().unwrap();
        close(free.estimates[0].value, 7.0);
        close(free.estimates[0].se.unwrap(), scale / 7f64.sqrt());
    }
}

#[test]
fn one_location_for_two_kilns() {
    let (a, b) = ([3.0, 5.5, 4.0, 8.25, 6.0, 1.0, 4.75], [2.0, 9.0, 4.5, 3.5, 7.0]);
    let rows: Vec<f64> = a.iter().chain(&b).copied().collect();
    let kiln: Vec<&str> = (0..12).map(|i| if i < 7 { "north" } else { "south" }).collect();
    let s = sample(&rows, Some(&kiln));
    let outcome = infer(&s, &system(&s, &[], &["north.location = south.location"]), None);
    let profile = |m: f64| -7.0 * distance(&a, m).ln() - 5.0 * distance(&b, m).ln();
    let best = rows.iter().copied().max_by(|x, z| profile(*x).total_cmp(&profile(*z))).unwrap();
    let (sa, sb) = (distance(&a, best), distance(&b, best));
    let (other, scale) = if a.contains(&best) { (&b[..], sb) } else { (&a[..], sa) };
    let slope = other.iter().map(|y| (y - best).signum()).sum::<f64>() / scale;
    close(outcome.score.as_ref().unwrap().chi_square, slope * slope * (sa * sa / 7.0 + sb * sb / 5.0));
    let free = -7.0 * distance(&a, 4.75).ln() - 5.0 * distance(&b, 4.5).ln();
    close(outcome.lr.as_ref().unwrap().chi_square, 2.0 * (free - profile(best)));
    assert!(!codes(&outcome).contains(&"unrestricted-failed"), "{:?}", outcome.warnings);
}
