//! Responses drawn from a model at given parameter values, one a row of a table.

use rayon::prelude::{IntoParallelIterator, ParallelIterator};

use super::compose::Template;
use super::formula::Formula;
use super::model::{Amount, Model, Response, Values};
use super::part::Part;
use super::prepare::Plan;
use super::rows::{FROM, UPTO, table_key};
use super::statement::Body;
use super::{LikelihoodError, LogLikelihood, Sample};
use crate::data::Table;
use crate::expr::{Graph, Id, Name};
use crate::family::composite::{Drawn, Reads, pick as pick_index};
use crate::family::{Amounts, Family};
use crate::math::{Random, Vector};

/// Draws that are thrown away, at most, before one falls where it could be recorded.
const MOST_TRIES: u32 = 1_000_000;
/// Places at which a custom density is looked at to draw from it.
const GRID: usize = 4_001;
/// Most values of a sum that draws look through.
const MOST_VALUES: f64 = 1e7;

/// The drawn columns of the response, by name: numbers, or labels.
#[derive(Debug, Clone, PartialEq)]
pub enum Column {
    /// Numbers, one a row.
    Numbers(String, Vec<f64>),
    /// Labels, one a row.
    Labels(String, Vec<String>),
}

/// Draws a response for each row of the table, whatever response stands there, from the parameters `theta` (as the prepared
/// sample of the same model and table orders them). Each row has its own stream of the seed, so the rows of a longer table
/// begin with those of a shorter one.
///
/// # Errors
/// A custom density without a support; a response that is censored or binned; an interval in which nothing can be recorded.
pub fn simulate(
    model: &Model,
    table: &Table,
    sample: &Sample,
    theta: &Vector,
    seed: u64,
) -> Result<Vec<Column>, LikelihoodError> {
    let plan = Plan::new(model, table, true)?;
    let refuse = |why: &str, advice: &str| Err(LikelihoodError::statement("model", why, advice));
    if matches!(model.response, Response::Ends { .. }) || model.event.is_some() {
        return refuse(
            "responses that are censored or binned cannot be drawn: nothing says what would have been seen",
            "draw the exact response, and cut it afterwards",
        );
    }
    let template = plan.template();
    let phi = sample.coordinates().phi(theta);
    let labels = labels_by_row(&plan, table)?;
    let mut drawn: Vec<Option<Drawn>> = vec![None; table.rows];
    for level in 0..plan.rows.levels.len().max(1) {
        let quantities = Quantities::compile(&template, &plan.known(level))?;
        // rows of labels are joined by cell where nothing else tells them apart: any of them has the level's quantities
        let members: Vec<usize> = labels.iter().enumerate().filter(|(_, l)| **l == level).map(|(i, _)| i).collect();
        let joined = plan.rows.count != table.rows;
        let sources: Vec<usize> =
            if joined { plan.rows.members[level].first().copied().into_iter().collect() } else { members.clone() };
        let values = quantities.values(&plan, level, &sources, phi.as_slice());
        let found: Vec<Result<Drawn, LikelihoodError>> = (0..members.len())
            .into_par_iter()
            .map(|k| {
                let at = if joined { 0 } else { k };
                let row: Vec<f64> = values.iter().map(|v| v[at]).collect();
                let mut random = Random::new(seed, members[k] as u64);
                one(&template, table, sources[at], members[k], &row, &quantities, &mut random)
            })
            .collect();
        for (&i, d) in members.iter().zip(found) {
            drawn[i] = Some(d?);
        }
    }
    columns(model, &plan, table, drawn.into_iter().flatten().collect())
}

/// Level of `per` of each row of the table.
fn labels_by_row(plan: &Plan, table: &Table) -> Result<Vec<usize>, LikelihoodError> {
    let Some(per) = &plan.model.per else { return Ok(vec![0; table.rows]) };
    Ok(match table.column(per).map(|c| &c.values) {
        Some(crate::data::Values::Category { codes, .. }) => codes.iter().map(|&c| c as usize).collect(),
        _ => {
            let x = super::rows::numbers(table, per, "model.per")?;
            let place = |v: &f64| plan.rows.levels.iter().position(|l| *l == v.to_string()).unwrap_or(0);
            x.iter().map(place).collect()
        }
    })
}

/// The quantities that a row's response is drawn from: row parameters, before them the shares of a mixture; parameters of a
/// custom density.
struct Quantities {
    formula: Formula,
    custom: Option<Custom>,
}

/// A custom density over its one variable.
struct Custom {
    density: Formula,
    axes: Vec<(u32, Values)>,
}

impl Quantities {
    fn compile(template: &Template, known: &[Option<f64>]) -> Result<Quantities, LikelihoodError> {
        let mut graph = Graph::new();
        for (i, (_, values)) in template.rows.columns.iter().enumerate() {
            graph.describe_column(i as u32, values);
        }
        let mut free = 0;
        let locals: Vec<Id> = known
            .iter()
            .map(|k| match k {
                Some(x) => graph.constant(*x),
                None => {
                    free += 1;
                    graph.parameter(free - 1)
                }
            })
            .collect();
        let scope = template.names(&mut graph, &locals)?;
        let rows = template.row_parameters(&mut graph, &scope, &locals)?;
        let mut nodes = match &template.statement.body {
            Body::Density(_) | Body::Composite(..) => Vec::new(),
            Body::Mixture(parts) => locals[..parts.len()].to_vec(),
            Body::Custom(_) => locals.clone(),
        };
        nodes.extend(rows);
        let formula = Formula::of_rows(&mut graph, &nodes, template.predictors.len());
        let custom = match &template.statement.body {
            Body::Custom(_) => Some(Custom::compile(template, known.len())?),
            _ => None,
        };
        Ok(Quantities { formula, custom })
    }

    /// One list a quantity, over some rows of a level.
    fn values(&self, plan: &Plan, level: usize, rows: &[usize], phi: &[f64]) -> Vec<Vec<f64>> {
        let template = plan.template();
        Part::evaluate(
            &self.formula,
            rows.len(),
            &|c| template.raw(c, rows),
            plan.map(level),
            plan.predictors_of(level, rows),
            phi,
        )
    }
}

impl Custom {
    fn compile(template: &Template, quantities: usize) -> Result<Custom, LikelihoodError> {
        let mut axes = Vec::new();
        for (name, values) in &template.model.support {
            if let Some((column, _)) = template.rows.column(&table_key(name)) {
                axes.push((column, values.clone()));
            }
        }
        if axes.len() != 1 {
            return Err(LikelihoodError::statement(
                "model.support",
                "a custom density can be drawn from where [model.support] names the one variable to draw",
                "write [model.support] with the response and its values",
            ));
        }
        let mut graph = Graph::new();
        let own: Vec<Id> = (0..quantities as u32).map(|q| graph.parameter(q)).collect();
        let scope = template.names(&mut graph, &own)?;
        let log = template.density(&mut graph, super::rows::RowKind::Exact, &scope, &own, &[])?;
        Ok(Custom { density: Formula::of_rows(&mut graph, &[log], 0), axes })
    }

    fn log_density(&self, template: &Template, row: usize, values: &[f64], at: &[f64]) -> Vec<f64> {
        let (axis, _) = self.axes[0];
        let raw =
            |c: u32| if c == axis { at.to_vec() } else { vec![template.rows.columns[c as usize].1[row]; at.len()] };
        let map = (0..values.len()).collect();
        Part::evaluate(&self.density, at.len(), &raw, map, Vec::new(), values).swap_remove(0)
    }

    /// Draws by the distribution function, summed over values or, for an interval, over a grid with straight lines between.
    fn draw(&self, template: &Template, row: usize, values: &[f64], random: &mut Random) -> Option<f64> {
        let pick =
            |points: &[f64], weights: &[f64], random: &mut Random| points.get(pick_index(weights, random)).copied();
        let mass = |points: &[f64]| -> Vec<f64> {
            let log = self.log_density(template, row, values, points);
            log.into_iter().map(libm::exp).map(|f| if f.is_finite() { f } else { 0.0 }).collect()
        };
        match &self.axes[0].1 {
            Values::List(list) => pick(list, &mass(list), random),
            Values::Whole(low, high) => {
                let (start, step) = if low.is_finite() { (*low, 1.0) } else { (*high, -1.0) };
                let (mut u, mut done) = (random.uniform(), 0.0);
                while done < MOST_VALUES {
                    let points: Vec<f64> = (0..256)
                        .map(|i| start + step * (done + f64::from(i)))
                        .take_while(|x| x >= low && x <= high)
                        .collect();
                    for (x, f) in points.iter().zip(mass(&points)) {
                        u -= f;
                        if u <= 0.0 {
                            return Some(*x);
                        }
                    }
                    if points.len() < 256 {
                        return None;
                    }
                    done += 256.0;
                }
                None
            }
            Values::Interval(low, high) => {
                let points = grid(*low, *high, &|x| mass(x));
                let f = mass(&points);
                let areas: Vec<f64> =
                    points.windows(2).zip(f.windows(2)).map(|(x, f)| 0.5 * (x[1] - x[0]) * (f[0] + f[1])).collect();
                let k = pick_index(&areas, random);
                let (a, b) = (f[k], f[k + 1]);
                let u = random.uniform();
                // the place in a trapezium left of which a part u of its area lies
                let t = if (b - a).abs() < 1e-12 * (a + b) {
                    u
                } else {
                    ((a * a + u * (b * b - a * a)).sqrt() - a) / (b - a)
                };
                Some(points[k] + t * (points[k + 1] - points[k]))
            }
        }
    }
}

/// A grid over what carries the mass: first coarse over many sizes, then even between the outermost places that matter.
fn grid(low: f64, high: f64, f: &dyn Fn(&[f64]) -> Vec<f64>) -> Vec<f64> {
    let even =
        |a: f64, b: f64, n: usize| -> Vec<f64> { (0..n).map(|i| a + (b - a) * (i as f64 + 0.5) / n as f64).collect() };
    let mut points: Vec<f64> = match (low.is_finite(), high.is_finite()) {
        (true, true) => even(low, high, GRID),
        (finite, _) => {
            let sizes: Vec<f64> =
                (0..GRID / 2).map(|i| libm::exp(-14.0 + 42.0 * i as f64 / (GRID / 2) as f64)).collect();
            match (finite, high.is_finite()) {
                (true, _) => sizes.iter().map(|s| low + s).collect(),
                (_, true) => sizes.iter().rev().map(|s| high - s).collect(),
                _ => sizes.iter().rev().map(|s| -s).chain([0.0]).chain(sizes.iter().copied()).collect(),
            }
        }
    };
    for _ in 0..6 {
        let mass = f(&points);
        let areas: Vec<f64> =
            points.windows(2).zip(mass.windows(2)).map(|(x, m)| 0.5 * (x[1] - x[0]) * (m[0] + m[1])).collect();
        let total: f64 = areas.iter().sum();
        let Some(first) = areas.iter().position(|&a| a > 1e-9 * total) else { break };
        let last = areas.iter().rposition(|&a| a > 1e-9 * total).unwrap_or(first);
        let (a, b) = (points[first.saturating_sub(1)], points[(last + 2).min(points.len() - 1)]);
        points = even(a, b, GRID);
        if last - first > GRID / 2 {
            break;
        }
    }
    points
}

/// Draws the response of one row.
fn one(
    template: &Template,
    table: &Table,
    row: usize,
    shown: usize,
    values: &[f64],
    quantities: &Quantities,
    random: &mut Random,
) -> Result<Drawn, LikelihoodError> {
    let (model, rows) = (template.model, template.rows);
    let column = |key: &str| rows.column(key).map(|c| c.1[row]);
    let amounts = |component: Option<usize>| {
        let name = component.map(|k| &model.components[k]);
        let get = |what: &str, stated: Option<&Amount>, otherwise: f64| {
            let own = name.and_then(|c| column(&format!("{what} of {}", c.name)));
            own.or_else(|| column(what)).unwrap_or(match stated {
                Some(Amount::Number(n)) => *n,
                _ => otherwise,
            })
        };
        let trials = name.and_then(|c| c.trials.as_ref()).or(model.trials.as_ref());
        Amounts {
            exposure: get("exposure", None, 1.0),
            trials: get("trials", trials, 1.0),
            successes: get("successes", model.successes.as_ref(), 0.0),
            failures: get("failures", model.failures.as_ref(), 0.0),
        }
    };
    let number = |random: &mut Random| -> Option<f64> {
        match &template.statement.body {
            Body::Density(f) => Some((f.sample)(values, &amounts(None), random)),
            Body::Mixture(parts) => {
                let k = pick_index(&values[..parts.len()], random);
                let before: usize = parts[..k].iter().map(|(_, f)| f.parameters.len()).sum();
                let f: &Family = parts[k].1;
                let from = parts.len() + before;
                Some((f.sample)(&values[from..from + f.parameters.len()], &amounts(Some(k)), random))
            }
            Body::Custom(_) => quantities.custom.as_ref().and_then(|c| c.draw(template, row, values, random)),
            Body::Composite(..) => None,
        }
    };
    if let Body::Composite(f, layout, _) = &template.statement.body {
        if f.reads == Reads::Contest {
            // the two items stand in the table; which of them won is drawn
            let Response::Several(names) = &model.response else { return Ok(Drawn::Won(true)) };
            let strength = |name: &str| {
                let label = Name::single(label(table, name, shown));
                layout.pieces.iter().position(|p| *p == label).and_then(|k| values.get(k).copied()).unwrap_or(0.0)
            };
            return Ok((f.sample)(layout, &[strength(&names[0]), strength(&names[1])], random));
        }
        return Ok((f.sample)(layout, values, random));
    }
    let (from, upto) = (column(FROM), column(UPTO));
    let counts = template.statement.counts();
    for _ in 0..MOST_TRIES {
        let Some(y) = number(random) else { break };
        let low = from.is_none_or(|a| y > a);
        let high = upto.is_none_or(|b| if counts { y <= b } else { y < b });
        if low && high {
            return Ok(Drawn::Values(vec![y]));
        }
    }
    Err(LikelihoodError::Data(format!(
        "line {}: no response can be drawn there; is all of the probability outside what can be recorded?",
        table.line(shown)
    )))
}

/// The label in a row of a column; numbers are labels too.
fn label(table: &Table, name: &str, row: usize) -> String {
    match table.column(name).map(|c| &c.values) {
        Some(crate::data::Values::Category { codes, levels }) => levels[codes[row] as usize].clone(),
        Some(crate::data::Values::Number(x)) => x[row].to_string(),
        None => String::new(),
    }
}

/// What was drawn, as columns under the names of the response.
fn columns(model: &Model, plan: &Plan, table: &Table, drawn: Vec<Drawn>) -> Result<Vec<Column>, LikelihoodError> {
    let names: Vec<String> = match &model.response {
        Response::Column(c) => vec![c.clone()],
        Response::Several(list) => list.clone(),
        _ => model.support.iter().map(|s| s.0.clone()).collect(),
    };
    let labels = |pick: &dyn Fn(&Drawn, usize) -> Option<String>| -> Vec<Column> {
        names
            .iter()
            .enumerate()
            .map(|(k, n)| Column::Labels(n.clone(), drawn.iter().filter_map(|d| pick(d, k)).collect()))
            .collect()
    };
    Ok(match &plan.statement.body {
        Body::Composite(f, layout, _) => match f.reads {
            Reads::Numbers | Reads::Shares => numbers(&names, &drawn),
            Reads::Labels | Reads::OrderedLabels => labels(&|d, k| match d {
                Drawn::Label(cell) => layout.pieces[*cell].pieces[k].text.clone(),
                _ => None,
            }),
            Reads::Contest => {
                let (mut won, mut lost) = (Vec::new(), Vec::new());
                for (row, d) in drawn.iter().enumerate() {
                    let (a, b) = (label(table, &names[0], row), label(table, &names[1], row));
                    let first = matches!(d, Drawn::Won(true));
                    let (x, y) = if first { (a, b) } else { (b, a) };
                    won.push(x);
                    lost.push(y);
                }
                vec![Column::Labels(names[0].clone(), won), Column::Labels(names[1].clone(), lost)]
            }
        },
        _ => numbers(&names, &drawn),
    })
}

fn numbers(names: &[String], drawn: &[Drawn]) -> Vec<Column> {
    let value = |d: &Drawn, k: usize| match d {
        Drawn::Values(v) => v.get(k).copied().unwrap_or(f64::NAN),
        _ => f64::NAN,
    };
    names
        .iter()
        .enumerate()
        .map(|(k, n)| Column::Numbers(n.clone(), drawn.iter().map(|d| value(d, k)).collect()))
        .collect()
}
