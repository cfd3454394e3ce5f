//! The usual mistakes of a study, found in its data and at its starting point. Each is one sentence with what to do.

use super::columns::{numbers, terms};
use crate::data::{Table, Values};
use crate::likelihood::LogLikelihood;
use crate::math::Vector;
use crate::math::linear::dependent_rows;
use crate::restriction::{Role, System};
use crate::study::Study;

/// Fewest rows for a column of few whole numbers to look like codes.
const ROWS: usize = 8;
/// Most different whole numbers that look like codes.
const CODES: usize = 8;
/// Largest numbers beyond this, or all below its inverse, make a poor unit.
const HUGE: f64 = 1e6;
/// Rows of the Jacobian that depend on others up to this are implied by them.
const DEPENDENT: f64 = 1e-9;

/// Mistakes that the data show.
pub fn of_data(study: &Study, table: &Table) -> Vec<String> {
    let mut out = Vec::new();
    let mut seen: Vec<&str> = Vec::new();
    for column in terms(study) {
        if seen.contains(&column) {
            continue;
        }
        seen.push(column);
        match numbers(table, column) {
            Some(values) => out.extend(of_term(column, values)),
            None => out.extend(of_levels(table, column)),
        }
    }
    if let Some(sentence) = study.data.request.weight.as_deref().and_then(|w| of_weight(w, table)) {
        out.push(sentence);
    }
    out
}

fn of_term(column: &str, values: &[f64]) -> Option<String> {
    let mut different: Vec<f64> = values.to_vec();
    different.sort_by(f64::total_cmp);
    different.dedup();
    let largest = values.iter().fold(0.0f64, |m, v| m.max(v.abs()));
    if different.len() == 1 {
        return Some(format!(
            "{column} is {} in every row, so no coefficient of it can be told from the intercept",
            different[0]
        ));
    }
    let whole = different.iter().all(|v| v.fract() == 0.0);
    if whole && (3..=CODES).contains(&different.len()) && values.len() >= ROWS {
        let list: Vec<String> = different.iter().map(f64::to_string).collect();
        return Some(format!(
            "{column} is used as a number and holds only {}: if these are codes, list it under [data.category]",
            super::sentence::list(&list)
        ));
    }
    if !(1.0 / HUGE..=HUGE).contains(&largest) {
        return Some(format!(
            "the largest {column} is {largest:e}: make a column in a handier unit under [data.derive], so that its coefficient \
             is near one"
        ));
    }
    None
}

fn of_levels(table: &Table, column: &str) -> Option<String> {
    let Values::Category { levels, codes } = &table.column(column)?.values else { return None };
    let unseen: Vec<&str> =
        (0..levels.len()).filter(|i| !codes.contains(&(*i as u32))).map(|i| levels[i].as_str()).collect();
    if !unseen.is_empty() {
        return Some(format!("no row has {column} {}: its coefficient cannot be told", super::sentence::list(&unseen)));
    }
    (levels.len() > CODES && 2 * levels.len() > codes.len()).then(|| {
        format!(
            "{column} has {} different labels in {} rows: is it a number with some text in it?",
            levels.len(),
            codes.len()
        )
    })
}

fn of_weight(column: &str, table: &Table) -> Option<String> {
    let weights = table.weights.as_ref()?;
    let index = weights.len() > 2 && weights.windows(2).all(|w| w[1] - w[0] == 1.0) && weights[0] <= 1.0;
    index.then(|| format!("the weights in {column} count 1, 2, 3, ... like row numbers: is it the right column?"))
}

/// Mistakes that the restrictions show at the starting point.
pub fn of_restrictions(system: &System, likelihood: &dyn LogLikelihood, start: &Vector) -> Vec<String> {
    let mut out: Vec<String> =
        system.left_out().iter().map(|l| format!("{} holds whatever the parameters are", l.name)).collect();
    let items = system.items();
    let jacobian = system.jacobian(start);
    if jacobian.iter().all(|v| v.is_finite()) {
        let gaps = system.gaps(start);
        let mut wide = jacobian.clone().insert_column(jacobian.ncols(), 0.0);
        wide.set_column(jacobian.ncols(), &gaps);
        let dependent: Vec<usize> = dependent_rows(&jacobian, DEPENDENT);
        let implied = dependent_rows(&wide, DEPENDENT);
        for i in dependent {
            let (name, linear) = (&items[i].name, system.is_linear());
            if jacobian.row(i).iter().all(|v| *v == 0.0) {
                out.push(format!(
                    "{name} has no slope in any parameter at the start: its multiplier may not exist there; write it so that it \
                     changes with its parameters (x = 0, not x^2 = 0)"
                ));
            } else if implied.contains(&i) {
                out.push(format!("{name} says nothing that the restrictions before it do not say: leave it out"));
            } else if linear {
                out.push(format!(
                    "{name} contradicts the restrictions before it: no values of the parameters meet them all"
                ));
            } else {
                out.push(format!(
                    "at the start {name} has the slopes of those before it: it may repeat or contradict them"
                ));
            }
        }
    } else {
        out.push("some restriction is undefined at the start: give starting values at which it can be computed".into());
    }
    let free = likelihood.parameters().len().saturating_sub(items.iter().filter(|r| r.role != Role::Tested).count());
    if free > 0 && likelihood.weight_total() < 10.0 * free as f64 {
        out.push(format!(
            "there are {} observations for {free} free parameters: chi-square needs some ten a parameter",
            likelihood.weight_total()
        ));
    }
    if !items.iter().any(|r| r.role == Role::Tested) {
        out.push("no restriction is put to the test: add one under [tested] to have multipliers and a test".into());
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::data::Column;
    use crate::study::Overlay;

    fn study(text: &str) -> Study {
        Study::from_text(text, "s", Default::default(), &Overlay::default()).unwrap()
    }

    fn table(columns: &[(&str, Vec<f64>)]) -> Table {
        let column =
            |(name, v): &(&str, Vec<f64>)| Column { name: name.to_string(), values: Values::Number(v.clone()) };
        Table { rows: columns[0].1.len(), columns: columns.iter().map(column).collect(), ..Table::default() }
    }

    const MEAN: &str =
        "[data]\nfile='a'\nweight='w'\n[model]\nfamily='normal'\nresponse='y'\n[model.mean]\nterms=['x']\n";

    #[test]
    fn codes_units_constants_and_indices_are_found() {
        let said = |x: Vec<f64>| of_data(&study(MEAN), &table(&[("x", x)])).join("\n");
        assert!(said([1.0, 2.0, 3.0].repeat(4)).contains("only 1, 2 and 3"));
        assert!(said([0.0, 1.0].repeat(9)).is_empty(), "0 and 1 are the same as a number and as labels");
        assert!(said((0..40).map(|i| i as f64 * 0.5).collect()).is_empty());
        assert!(said(vec![2.0; 9]).contains("2 in every row"));
        assert!(said((0..40).map(|i| 1e7 + i as f64).collect()).contains("handier unit"));
        let mut t = table(&[("x", (0..9).map(|i| i as f64 * 0.3).collect())]);
        t.weights = Some((1..10).map(f64::from).collect());
        assert!(of_data(&study(MEAN), &t).join("").contains("row numbers"));
    }
}
