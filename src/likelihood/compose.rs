//! From a resolved statement to the formula of one kind of row: names are bound to columns, parameters and predictors.

use super::LikelihoodError;
use super::formula::{Formula, Ingredients};
use super::model::{Amount, Form, Model};
use super::rows::{LOWER, RowKind, Rows, UPPER, Y, table_key};
use super::statement::{Body, Statement};
use crate::data::{Table, Values};
use crate::expr::{Graph, Id, Name, Relation, Scope, Sign, Variable, build, parse_expression};
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
            let low = values.iter().copied().fold(f64::INFINITY, f64::min);
            graph.set_column_sign(i as u32, if values.is_empty() { Sign::Unknown } else { Sign::of_low(low, true) });
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
        let expected = self.expected(&mut graph, kind, &local_nodes, &row_nodes, &variables)?;
        Ok(Formula::compile(Ingredients {
            graph,
            log_density,
            variables,
            expected,
            weighted: self.rows.weights.is_some(),
        }))
    }

    /// Columns, parameters and lets as the user's texts see them.
    fn names(&self, graph: &mut Graph, locals: &[Id]) -> Result<Scope, LikelihoodError> {
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

    fn row_parameters(&self, graph: &mut Graph, scope: &Scope, locals: &[Id]) -> Result<Vec<Id>, LikelihoodError> {
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
        for what in ["exposure", "trials"] {
            let own = self.rows.column(&of(what)).or_else(|| self.rows.column(what));
            let id = match (own, what, trials) {
                (Some((i, _)), ..) => graph.column(i),
                (None, "trials", Some(Amount::Number(n))) => graph.constant(*n),
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

    fn density(
        &self,
        graph: &mut Graph,
        kind: RowKind,
        scope: &Scope,
        locals: &[Id],
        rows: &[Id],
    ) -> Result<Id, LikelihoodError> {
        match &self.statement.body {
            Body::Custom(ast) => build(graph, ast, scope).map_err(LikelihoodError::expression("model.log_density")),
            Body::Categorical => {
                let mut terms = Vec::new();
                for (cell, &share) in locals.iter().enumerate() {
                    let indicator = graph.column(cell as u32);
                    let log = graph.call(crate::expr::Function::Log, &[share]);
                    terms.push((graph.multiply(indicator, log), 1.0));
                }
                Ok(graph.sum(0.0, &terms))
            }
            Body::Density(f) => {
                let s = self.family_scope(graph, f, None, rows);
                self.log_probability(graph, f, kind, &s)
            }
            Body::Mixture(parts) => {
                let mut pairs = Vec::new();
                for (k, (name, f)) in parts.iter().enumerate() {
                    let s = self.family_scope(graph, f, Some(k), rows);
                    let log = self.log_probability(graph, f, kind, &s)?;
                    let share = Name::single("share").then(name);
                    let at = self.locals.iter().position(|l| l.name == share).unwrap_or_default();
                    pairs.push((locals[at], log));
                }
                Ok(graph.log_mix(&pairs))
            }
        }
    }

    /// log of the density, or of the probability of the interval, of a family in its scope.
    fn log_probability(
        &self,
        graph: &mut Graph,
        f: &Family,
        kind: RowKind,
        scope: &Scope,
    ) -> Result<Id, LikelihoodError> {
        if kind == RowKind::Exact {
            return text_node(graph, f.log_density, scope, "model.family");
        }
        let Some(d) = &f.distribution else {
            return Err(LikelihoodError::statement(
                "model.family",
                format!("{} has no distribution function here, so its response cannot be censored or binned", f.name),
                "give the response as exact values, or choose a family that has one",
            ));
        };
        let mut end = |key: &str| match self.rows.column(key) {
            Some((i, _)) => graph.column(i),
            None => graph.constant(f64::NAN),
        };
        let (lower, upper) = (end(LOWER), end(UPPER));
        match kind {
            RowKind::Above => tail(graph, d.above, scope, lower),
            RowKind::Below => tail(graph, d.below, scope, upper),
            _ => between(graph, d, scope, lower, upper),
        }
    }

    /// Expected information between variables, by the chain rule from that between row parameters.
    #[allow(clippy::type_complexity, reason = "a list of entries, named where it is used")]
    fn expected(
        &self,
        graph: &mut Graph,
        kind: RowKind,
        locals: &[Id],
        rows: &[Id],
        variables: &[Variable],
    ) -> Result<Option<Vec<(usize, usize, Id)>>, LikelihoodError> {
        let mut entries: Vec<(Id, Id, Id)> = Vec::new();
        match &self.statement.body {
            Body::Density(f) if kind == RowKind::Exact => {
                let s = self.family_scope(graph, f, None, rows);
                let at = |name: &str| f.parameters.iter().position(|p| p.name == name).unwrap_or_default();
                let Information::Closed(list) = f.information else { return Ok(None) };
                for (a, b, text) in list {
                    let node = text_node(graph, text, &s, "model.family")?;
                    entries.push((rows[at(a)], rows[at(b)], node));
                    if a != b {
                        entries.push((rows[at(b)], rows[at(a)], node));
                    }
                }
            }
            Body::Categorical => {
                for &share in locals {
                    let node = graph.product(&[(share, -1.0)]);
                    entries.push((share, share, node));
                }
            }
            _ => return Ok(None),
        }
        let mut out = Vec::new();
        for u in 0..variables.len() {
            for v in u..variables.len() {
                let mut terms = Vec::new();
                for &(a, b, node) in &entries {
                    let (da, db) = (graph.derivative(a, variables[u]), graph.derivative(b, variables[v]));
                    terms.push((graph.product(&[(da, 1.0), (db, 1.0), (node, 1.0)]), 1.0));
                }
                out.push((u, v, graph.sum(0.0, &terms)));
            }
        }
        Ok(Some(out))
    }

    /// The raw values of a column of the graph for some rows.
    pub(super) fn raw(&self, column: u32, rows: &[usize]) -> Vec<f64> {
        let values = &self.rows.columns[column as usize].1;
        rows.iter().map(|&i| values[i]).collect()
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
    s.insert("at", at);
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
