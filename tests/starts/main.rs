//! Do the starting values reach the maximum? `cargo run --release --example starts -- SETS ROWS [FAMILY]` simulates SETS data sets of
//! each family and compares the default run with the best of 50 random starts, or the same edge or verdict.

use std::io::Write;

use guyline::data::{Column, Table, Values};
use guyline::family::{Amounts, FAMILIES, Family, Given};
use guyline::likelihood::model::{Amount, Component, Model, Response, Setting};
use guyline::likelihood::simulate::Column as Drawn;
use guyline::likelihood::{LogLikelihood, prepare, simulate};
use guyline::math::{Random, Vector};
use guyline::restriction::{Draft, Role, System};
use guyline::solve::{Fit, Problem, Search, Verdict, maximise};
use rayon::prelude::{IntoParallelIterator, ParallelIterator};

/// Random starts that the default run is compared with.
const STARTS: usize = 50;
/// How far below the best a maximum may lie: what two runs that stop at 1e-7 of a standard error can differ by, and more.
const SLACK: f64 = 1e-6;
/// Amounts of every simulated row.
const AMOUNTS: Amounts = Amounts { exposure: 1.0, trials: 8.0, successes: 9.0, failures: 12.0 };

/// Parameters drawn over the sizes that data have.
fn parameters(f: &Family, random: &mut Random) -> Vec<f64> {
    f.parameters
        .iter()
        .map(|p| match (p.name, p.given) {
            (_, Given::KnownAs(x)) => x,
            (_, Given::Known) => 1.5,
            ("df", _) => 2.0 + 10.0 * random.uniform(),
            ("shape", _) if p.range.low == -0.5 => -0.3 + 0.8 * random.uniform(),
            ("rate", _) => 0.3 + 4.0 * random.uniform(),
            ("dispersion", _) => 1.5 * random.uniform(),
            ("overdispersion", _) => 0.5 * random.uniform(),
            _ if p.range.high == 1.0 => 0.1 + 0.8 * random.uniform(),
            _ if p.range.low == 0.0 => (2.0 * random.uniform() - 0.5).exp(),
            _ => 6.0 * random.uniform() - 3.0,
        })
        .collect()
}

fn settings(f: &Family) -> Vec<Setting> {
    let known = |p: &&guyline::family::RowParameter| p.given == Given::Known;
    let one = |p: &guyline::family::RowParameter| Setting {
        name: p.name.into(),
        known: vec![(None, 1.5)],
        ..Setting::default()
    };
    f.parameters.iter().filter(known).map(one).collect()
}

fn model(f: &Family) -> Model {
    let amount = |what: &str, x: f64| f.amounts.contains(&what).then_some(Amount::Number(x));
    Model {
        family: f.name.into(),
        response: Response::Column("y".into()),
        trials: amount("trials", AMOUNTS.trials),
        successes: amount("successes", AMOUNTS.successes),
        failures: amount("failures", AMOUNTS.failures),
        parameters: settings(f),
        ..Model::default()
    }
}

fn table(y: Vec<f64>) -> Table {
    Table {
        file: "simulated".into(),
        rows: y.len(),
        columns: vec![Column { name: "y".into(), values: Values::Number(y) }],
        ..Table::default()
    }
}

/// What the default run made of it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Found {
    Best,
    SameVerdict,
    Missed,
    Refused,
}

fn compare(model: &Model, table: &Table, seed: u64) -> (Found, String) {
    let sample = match prepare(model, table) {
        Ok(s) => s,
        Err(e) => return (Found::Refused, format!("{e:?}")),
    };
    let names: Vec<String> = sample.parameters().iter().map(|p| p.name.clone()).collect();
    let drafts: Vec<Draft> = sample
        .family_restrictions()
        .iter()
        .map(|t| Draft { name: None, role: Role::Family, text: t.clone(), place: String::new() })
        .collect();
    let system = match System::compile(&drafts, &names, sample.known()) {
        Ok(s) => s,
        Err(e) => return (Found::Refused, e.to_string()),
    };
    let problem = Problem { likelihood: &sample, restrictions: &system };
    let run = |starts: Option<usize>, seed: u64| maximise(problem, &Search { starts, seed, ..Search::default() }, &[]);
    let (Ok(first), Ok(best)) = (run(None, 1), run(Some(STARTS), 1000 + seed)) else {
        return (Found::Refused, "no start".into());
    };
    let good = |f: &Fit| f.certificate.verdict == Verdict::StrictMaximum;
    let say = |f: &Fit| format!("{} {:.9} at {:?}", f.certificate.verdict.text(), f.log_likelihood, f.theta.as_slice());
    let found = if good(&first) && (!good(&best) || first.log_likelihood >= best.log_likelihood - SLACK) {
        Found::Best
    } else if first.certificate.verdict == best.certificate.verdict && !good(&first) {
        Found::SameVerdict
    } else {
        Found::Missed
    };
    (found, format!("default {}; best {}", say(&first), say(&best)))
}

fn main() {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let number = |k: usize, otherwise: usize| arguments.get(k).and_then(|a| a.parse().ok()).unwrap_or(otherwise);
    let (sets, rows) = (number(0, 100), number(1, 60));
    let only = arguments.get(2);
    let mut out = std::io::stdout();
    let _ = writeln!(out, "family, sets, at the best, same verdict without a maximum, missed, refused");
    let mut tally = |name: &str, results: Vec<(Found, String)>| {
        let count = |w: Found| results.iter().filter(|r| r.0 == w).count();
        let _ = writeln!(
            out,
            "{name}, {}, {}, {}, {}, {}",
            results.len(),
            count(Found::Best),
            count(Found::SameVerdict),
            count(Found::Missed),
            count(Found::Refused)
        );
        let bad = |r: &&(Found, String)| matches!(r.0, Found::Missed | Found::Refused);
        for (_, why) in results.iter().filter(bad).take(3) {
            let _ = writeln!(out, "    {why}");
        }
    };
    for f in FAMILIES.iter().filter(|f| !f.support.is_lump() && only.is_none_or(|o| o == f.name)) {
        let one = |set: usize| {
            let mut random = Random::new(7, set as u64);
            let theta = parameters(f, &mut random);
            let y: Vec<f64> = (0..rows).map(|_| (f.sample)(&theta, &AMOUNTS, &mut random)).collect();
            let (found, why) = compare(&model(f), &table(y), set as u64);
            (found, format!("set {set} from {theta:?}: {why}"))
        };
        tally(f.name, (0..sets).into_par_iter().map(one).collect());
    }
    for (name, columns, theta) in [
        ("multivariate_normal", 3, &[1.0, -2.0, 0.5, 1.0, 3.0, 0.2, 0.7, -0.4, 0.1][..]),
        ("dirichlet", 3, &[0.7, 2.0, 5.0][..]),
    ] {
        if only.is_some_and(|o| o != name) {
            continue;
        }
        let one = |set: usize| {
            let names: Vec<String> = (0..columns).map(|k| format!("y{k}")).collect();
            let model = Model { family: name.into(), response: Response::Several(names.clone()), ..Model::default() };
            // a response that the family can read, to be drawn anew
            let dummy = |k: usize| Column {
                name: names[k].clone(),
                values: Values::Number((0..rows).map(|i| (1.0 + ((i + k) % columns) as f64) / 6.0).collect()),
            };
            let mut table = Table { rows, columns: (0..columns).map(dummy).collect(), ..Table::default() };
            let drawn = prepare(&model, &table).and_then(|sample| {
                simulate(&model, &table, &sample, &Vector::from_column_slice(theta), set as u64 + 1)
            });
            let drawn = match drawn {
                Ok(d) => d,
                Err(e) => return (Found::Refused, format!("{e:?}")),
            };
            for (column, new) in table.columns.iter_mut().zip(drawn) {
                if let Drawn::Numbers(_, y) = new {
                    column.values = Values::Number(y);
                }
            }
            let (found, why) = compare(&model, &table, set as u64);
            (found, format!("set {set}: {why}"))
        };
        tally(name, (0..sets).into_par_iter().map(one).collect());
    }
    for (name, families) in [
        ("mixture of two normals", vec!["normal", "normal"]),
        ("mixture of three normals", vec!["normal", "normal", "normal"]),
        ("mixture of two poissons", vec!["poisson", "poisson"]),
        ("zero inflation", vec!["point", "poisson"]),
    ] {
        if only.is_some_and(|o| o != "mixture") {
            continue;
        }
        let one = |set: usize| {
            let mut random = Random::new(11, set as u64);
            let k = families.len();
            let y: Vec<f64> = (0..3 * rows)
                .map(|_| {
                    let part = ((random.uniform() * k as f64) as usize).min(k - 1);
                    match families[part] {
                        "normal" => 3.5 * part as f64 + (0.7 + 0.3 * part as f64) * random.normal(),
                        "poisson" => random.poisson(1.5 + 6.0 * part as f64),
                        _ => 0.0,
                    }
                })
                .collect();
            let components = families
                .iter()
                .enumerate()
                .map(|(i, f)| Component {
                    name: format!("c{i}"),
                    family: (*f).into(),
                    parameters: match *f {
                        "point" => vec![Setting { name: "at".into(), known: vec![(None, 0.0)], ..Setting::default() }],
                        _ => Vec::new(),
                    },
                    ..Component::default()
                })
                .collect();
            let model = Model {
                family: "mixture".into(),
                response: Response::Column("y".into()),
                components,
                ..Model::default()
            };
            let (found, why) = compare(&model, &table(y), set as u64);
            (found, format!("set {set}: {why}"))
        };
        tally(name, (0..sets).into_par_iter().map(one).collect());
    }
}
