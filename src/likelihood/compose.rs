//! From a resolved statement to the formula of one kind of row: names are bound to columns, parameters and predictors.

use std::collections::{BTreeMap, HashMap};

use super::LikelihoodError;
use super::fold::Folds;
use super::formula::{Formula, Ingredients};
use super::model::{Amount, Form, Model};
use super::rows::{FROM, LOWER, RowKind, Rows, UPPER, UPTO, Y, table_key};
use super::statement::{Body, Statement};
use crate::data::{Table, Values};
use crate::expr::{Graph, Id, Name, Relation, Scope, Sign, Variable, build, parse_expression};
use crate::family::composite::Made;
use crate::family::{Distribution, Family, Information, Link};
use crate::math::Range;

/// A scalar parameter of the template that all levels of `per` follow.
#[derive(Debug, Clone)]
pub(super) struct Local {
    pub(super) name: Name,
    pub(super) range: Range,
}

/// A linear predictor of the template: which row parameter and by which link.
#[derive(Debug, Clone)]
pub(super) struct LocalPredictor {
    /// Index among the statement's row parameters.
    pub(super) row: usize,
    pub(super) link: Link,
}

/// What a formula is made for.
pub(super) struct Template<'a> {
    pub(super) model: &'a Model,
    pub(super) statement: &'a Statement<'a>,
    pub(super) rows: &'a Rows,
    pub(super) table: &'a Table,
    pub(super) locals: &'a [Local],
    pub(super) predictors: &'a [LocalPredictor],
    /// Whether expected information was asked for.
    pub(super) expected_asked: bool,
}

fn text_node(graph: &mut Graph, text: &str, scope: &Scope, place: &str) -> Result<Id, LikelihoodError> {
    let ast = parse_expression(text).map_err(LikelihoodError::expression(place))?;
    build(graph, &ast, scope).map_err(LikelihoodError::expression(place))
}

impl Template<'_> {
    /// Compiles the formula of rows of this kind; `known` gives the value of each local that is known.
    ///
    /// # Errors
    /// A text that names what is not there; a kind of row for which the family has no formula.
    pub(super) fn compile(&self, kind: RowKind, known: &[Option<f64>]) -> Result<Formula, LikelihoodError> {
        let mut graph = Graph::new();
        for (i, (_, values)) in self.rows.columns.iter().enumerate() {
            graph.describe_column(i as u32, values);
        }
        let mut variables = Vec::new();
        let mut local_nodes = Vec::new();
        for (local, known) in self.locals.iter().zip(known) {
            let id = match known {
                Some(x) => graph.constant(*x),
                None => {
                    let p = variables.len() as u32;
                    graph.set_parameter_sign(p, Sign::of_low(local.range.low, local.range.low_closed));
                    variables.push(Variable::Parameter(p));
                    graph.parameter(p)
                }
            };
            local_nodes.push(id);
        }
        let scope = self.names(&mut graph, &local_nodes)?;
        let row_nodes = self.row_parameters(&mut graph, &scope, &local_nodes)?;
        variables.extend((0..self.predictors.len()).map(|k| Variable::Predictor(k as u32)));
        let log_density = self.density(&mut graph, kind, &scope, &local_nodes, &row_nodes)?;
        let expected = self.expected(&mut graph, kind, &row_nodes, &variables)?;
        let needed = match self.statement.body {
            // a mixture is judged by observed information unless expected is asked for
            Body::Mixture(_) => self.expected_asked,
            // the mass of the user's density is looked at
            Body::Custom(_) => true,
            Body::Density(_) | Body::Composite(..) => expected.is_none(),
        };
        let expectation = match kind == RowKind::Exact && needed {
            true => self.expectation(&graph, known, &local_nodes, &row_nodes)?.map(Box::new),
            false => None,
        };
        let weighted = self.rows.weights.is_some();
        let columns = self.rows.columns.len() as u32;
        let found = Folds::of(&mut graph, log_density, &variables, columns, weighted);
        let formula = Formula::compile(Ingredients {
            graph,
            log_density,
            variables,
            expected,
            expectation,
            weighted,
            heights: found.heights,
            slopes: found.slopes,
        });
        Ok(Formula { folds: found.folds, ..formula })
    }

    /// Columns, parameters and lets as the user's texts see them.
    pub(super) fn names(&self, graph: &mut Graph, locals: &[Id]) -> Result<Scope, LikelihoodError> {
        let mut scope = Scope::new("parameter or column");
        for (i, (key, _)) in self.rows.columns.iter().enumerate() {
            let Some(name) = key.strip_prefix(' ') else { continue };
            let id = graph.column(i as u32);
            let written = Name::single(name).to_string();
            match self.table.column(name).map(|c| &c.values) {
                Some(Values::Category { levels, .. }) => scope.insert_category(written, id, levels),
                _ => scope.insert(written, id),
            }
        }
        for (local, &id) in self.locals.iter().zip(locals) {
            scope.insert(local.name.to_string(), id);
        }
        for (name, ast) in &self.statement.lets {
            let id = build(graph, ast, &scope).map_err(LikelihoodError::expression(format!("model.let.{name}")))?;
            scope.insert(Name::single(name.as_str()).to_string(), id);
        }
        Ok(scope)
    }

    pub(super) fn row_parameters(
        &self,
        graph: &mut Graph,
        scope: &Scope,
        locals: &[Id],
    ) -> Result<Vec<Id>, LikelihoodError> {
        let mut out = Vec::new();
        for (at, row) in self.statement.rows.iter().enumerate() {
            let id = if let Some(ast) = &row.curve {
                build(graph, ast, scope).map_err(LikelihoodError::expression(format!("{}.curve", row.place)))?
            } else if let Some(k) = self.predictors.iter().position(|p| p.row == at) {
                let mut s = Scope::new("name");
                let eta = graph.predictor(k as u32);
                s.insert("eta", eta);
                text_node(graph, self.predictors[k].link.inverse(), &s, &row.place)?
            } else {
                let at = self.locals.iter().position(|l| l.name == row.name);
                locals[at.unwrap_or_default()]
            };
            out.push(id);
        }
        Ok(out)
    }

    /// What a family's formula may name, for the family itself or for component `k` of a mixture.
    fn family_scope(&self, graph: &mut Graph, family: &Family, component: Option<usize>, rows: &[Id]) -> Scope {
        let mut scope = Scope::new("name");
        for key in [Y, LOWER, UPPER] {
            if let Some((i, _)) = self.rows.column(key) {
                let id = graph.column(i);
                scope.insert(key, id);
            }
        }
        let of = |what: &str| match component {
            Some(k) => format!("{what} of {}", self.model.components[k].name),
            None => what.to_string(),
        };
        let trials = match component {
            Some(k) => &self.model.components[k].trials,
            None => &self.model.trials,
        };
        let stated = [
            ("exposure", &None),
            ("trials", trials),
            ("successes", &self.model.successes),
            ("failures", &self.model.failures),
        ];
        for (what, amount) in stated {
            let own = self.rows.column(&of(what)).or_else(|| self.rows.column(what));
            let id = match (own, amount) {
                (Some((i, _)), _) => graph.column(i),
                (None, Some(Amount::Number(n))) => graph.constant(*n),
                _ => graph.constant(1.0),
            };
            scope.insert(what, id);
        }
        let mine = self.statement.rows.iter().zip(rows).filter(|(r, _)| r.component == component);
        for (p, (_, &id)) in family.parameters.iter().zip(mine) {
            scope.insert(p.name, id);
        }
        scope
    }

    pub(super) fn density(
        &self,
        graph: &mut Graph,
        kind: RowKind,
        scope: &Scope,
        locals: &[Id],
        rows: &[Id],
    ) -> Result<Id, LikelihoodError> {
        match &self.statement.body {
            Body::Custom(ast) => build(graph, ast, scope).map_err(LikelihoodError::expression("model.log_density")),
            Body::Composite(_, _, made) => {
                let s = self.composite_scope(graph, made, rows)?;
                text_node(graph, &made.log_density, &s, "model.family")
            }
            Body::Density(_) | Body::Mixture(_) => {
                let (lower, upper) = (self.end(graph, LOWER), self.end(graph, UPPER));
                let log = self.log_probability(graph, kind, (lower, upper), locals, rows)?;
                // what could not be recorded is taken out of the whole
                let (from, upto) = (self.rows.column(FROM), self.rows.column(UPTO));
                let whole = match (from.is_some(), upto.is_some()) {
                    (false, false) => return Ok(log),
                    (true, false) => RowKind::Above,
                    (false, true) => RowKind::Below,
                    (true, true) => RowKind::Between,
                };
                let ends = (self.end(graph, FROM), self.end(graph, UPTO));
                let all = self.log_probability(graph, whole, ends, locals, rows)?;
                Ok(graph.subtract(log, all))
            }
        }
    }

    /// A column by key; NaN where there is none.
    fn end(&self, graph: &mut Graph, key: &str) -> Id {
        match self.rows.column(key) {
            Some((i, _)) => graph.column(i),
            None => graph.constant(f64::NAN),
        }
    }

    /// What the formulas of a family made from the data may name.
    fn composite_scope(&self, graph: &mut Graph, made: &Made, rows: &[Id]) -> Result<Scope, LikelihoodError> {
        let mut scope = Scope::new("name");
        for (i, (key, _)) in self.rows.columns.iter().enumerate().filter(|(_, c)| !c.0.starts_with(' ')) {
            let id = graph.column(i as u32);
            scope.insert(key.clone(), id);
        }
        for (r, &id) in self.statement.rows.iter().zip(rows) {
            scope.insert(r.name.to_string(), id);
        }
        for (name, text) in &made.lets {
            let id = text_node(graph, text, &scope, "model.family")?;
            scope.insert(name.clone(), id);
        }
        Ok(scope)
    }

    /// log of the density, or of the probability of an interval, of the family or of the mixture.
    fn log_probability(
        &self,
        graph: &mut Graph,
        kind: RowKind,
        ends: (Id, Id),
        locals: &[Id],
        rows: &[Id],
    ) -> Result<Id, LikelihoodError> {
        let parts = match &self.statement.body {
            Body::Density(f) => {
                let s = self.family_scope(graph, f, None, rows);
                return log_probability(graph, f, kind, ends, &s);
            }
            Body::Mixture(parts) => parts,
            Body::Composite(..) | Body::Custom(_) => return Ok(graph.constant(f64::NAN)),
        };
        // Where all mass stands at one value, a density beside it has none there.
        let mut atoms = Vec::new();
        for (k, (_, f)) in parts.iter().enumerate().filter(|(_, (_, f))| f.support.is_lump()) {
            let s = self.family_scope(graph, f, Some(k), rows);
            atoms.extend(s.node(f.parameters[0].name));
        }
        let mut pairs = Vec::new();
        for (k, (name, f)) in parts.iter().enumerate() {
            let s = self.family_scope(graph, f, Some(k), rows);
            let mut log = log_probability(graph, f, kind, ends, &s)?;
            if kind == RowKind::Exact && !f.support.is_count() && !f.support.is_lump() {
                for &atom in &atoms {
                    let y = self.end(graph, Y);
                    let there = graph.compare(Relation::Equal, y, atom);
                    let nothing = graph.constant(f64::NEG_INFINITY);
                    log = graph.choice(there, nothing, log);
                }
            }
            let share = Name::single("share").then(name);
            let at = self.locals.iter().position(|l| l.name == share).unwrap_or_default();
            pairs.push((locals[at], log));
        }
        Ok(graph.log_mix(&pairs))
    }

    /// Expected information between variables, by the chain rule from that between row parameters.
    #[allow(clippy::type_complexity, reason = "a list of entries, named where it is used")]
    fn expected(
        &self,
        graph: &mut Graph,
        kind: RowKind,
        rows: &[Id],
        variables: &[Variable],
    ) -> Result<Option<Vec<(usize, usize, Id)>>, LikelihoodError> {
        let mut entries: Vec<(Id, Id, Id)> = Vec::new();
        match &self.statement.body {
            Body::Density(f) if kind == RowKind::Exact && !self.rows.truncated() => {
                let s = self.family_scope(graph, f, None, rows);
                let at = |name: &str| f.parameters.iter().position(|p| p.name == name).unwrap_or_default();
                let Information::Closed(list) = f.information else { return Ok(None) };
                for (a, b, text) in list {
                    let node = text_node(graph, text, &s, "model.family")?;
                    entries.push((rows[at(a)], rows[at(b)], node));
                }
            }
            Body::Composite(_, _, made) => {
                let s = self.composite_scope(graph, made, rows)?;
                for (a, b, text) in &made.information {
                    let node = text_node(graph, text, &s, "model.family")?;
                    let of = |name: &str| s.node(name).unwrap_or(node);
                    entries.push((of(a), of(b), node));
                }
            }
            _ => return Ok(None),
        }
        Ok(Some(chain(graph, &entries, variables)))
    }

    /// The raw values of a column of the graph for some rows.
    pub(super) fn raw(&self, column: u32, rows: &[usize]) -> Vec<f64> {
        let values = &self.rows.columns[column as usize].1;
        rows.iter().map(|&i| values[i]).collect()
    }
}

/// Entries between nodes as entries between variables, by the chain rule; symmetric entries are given once.
fn chain(graph: &mut Graph, entries: &[(Id, Id, Id)], variables: &[Variable]) -> Vec<(usize, usize, Id)> {
    let zero = graph.constant(0.0);
    let mut slopes: HashMap<Id, Vec<(usize, Id)>> = HashMap::new();
    for &(a, b, _) in entries {
        for node in [a, b] {
            slopes.entry(node).or_insert_with(|| {
                let all = variables.iter().enumerate().map(|(v, &by)| (v, graph.derivative(node, by)));
                all.filter(|&(_, d)| d != zero).collect()
            });
        }
    }
    let mut sums: BTreeMap<(usize, usize), Vec<(Id, f64)>> = BTreeMap::new();
    for &(a, b, node) in entries {
        for &(u, du) in &slopes[&a] {
            for &(v, dv) in &slopes[&b] {
                let term = graph.product(&[(du, 1.0), (dv, 1.0), (node, 1.0)]);
                // one place stands for both (u, v) and (v, u)
                let twice = if a != b && u == v { 2.0 } else { 1.0 };
                if a != b || u <= v {
                    sums.entry((u.min(v), u.max(v))).or_default().push((term, twice));
                }
            }
        }
    }
    sums.into_iter().map(|((u, v), terms)| (u, v, graph.sum(0.0, &terms))).collect()
}

/// log of the density, or of the probability of an interval, of a family in its scope.
fn log_probability(
    graph: &mut Graph,
    f: &Family,
    kind: RowKind,
    (lower, upper): (Id, Id),
    scope: &Scope,
) -> Result<Id, LikelihoodError> {
    if kind == RowKind::Exact {
        return text_node(graph, f.log_density, scope, "model.family");
    }
    let Some(d) = &f.distribution else {
        return Err(LikelihoodError::statement(
            "model.family",
            format!(
                "{} has no distribution function here, so its response cannot be censored, binned or truncated",
                f.name
            ),
            "give the response as exact values, or choose a family that has one",
        ));
    };
    match kind {
        RowKind::Above => tail(graph, d.above, scope, lower),
        RowKind::Below => tail(graph, d.below, scope, upper),
        _ => between(graph, d, scope, lower, upper),
    }
}

/// log P(lower < Y <= upper) from the distribution function: from whichever tail is the smaller at the lower end.
fn between(graph: &mut Graph, d: &Distribution, scope: &Scope, lower: Id, upper: Id) -> Result<Id, LikelihoodError> {
    if let Some(text) = d.between {
        let mut s = scope.clone();
        s.insert(LOWER, lower);
        s.insert(UPPER, upper);
        return text_node(graph, text, &s, "model.family");
    }
    let (f_low, f_high) = (tail(graph, d.below, scope, lower)?, tail(graph, d.below, scope, upper)?);
    let (s_low, s_high) = (tail(graph, d.above, scope, lower)?, tail(graph, d.above, scope, upper)?);
    let mut difference = |more: Id, less: Id| {
        let gap = graph.subtract(more, less);
        let log = graph.call(crate::expr::Function::Log1mexp, &[gap]);
        graph.add(more, log)
    };
    let (left, right) = (difference(f_high, f_low), difference(s_low, s_high));
    let low_side = graph.compare(Relation::Less, f_low, s_low);
    Ok(graph.choice(low_side, left, right))
}

/// A tail of the distribution function at a node.
fn tail(graph: &mut Graph, text: &str, scope: &Scope, at: Id) -> Result<Id, LikelihoodError> {
    let mut s = scope.clone();
    s.insert("q", at);
    if scope.node("at").is_none() {
        s.insert("at", at);
    }
    text_node(graph, text, &s, "model.family")
}

/// Whether a setting makes a row parameter a linear predictor.
pub(super) fn has_terms(form: Option<&Form>) -> bool {
    matches!(form, Some(Form::Terms(_)))
}

/// Whether the table column key is used by the user's texts.
pub(super) fn uses(rows: &Rows, name: &str) -> bool {
    rows.column(&table_key(name)).is_some()
}
