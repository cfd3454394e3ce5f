//! The names an equation or a quantity may use: free parameters, and known values as numbers.

use std::collections::HashMap;

use super::RestrictionError;
use crate::expr::{Ast, ExprError, Graph, Id, Name, Scope, Span};

/// Free parameters and known values, by name.
pub(super) struct Vocabulary {
    /// Parameters, then known values.
    names: Vec<Name>,
    /// The same, as they are written.
    written: Vec<String>,
    index: HashMap<Name, usize>,
    parameters: usize,
    known: Vec<f64>,
}

impl Vocabulary {
    /// # Errors
    /// Two things with one name.
    pub fn new(parameters: &[String], known: &[(String, f64)]) -> Result<Self, RestrictionError> {
        let mut out = Vocabulary {
            names: Vec::new(),
            written: Vec::new(),
            index: HashMap::new(),
            parameters: parameters.len(),
            known: known.iter().map(|k| k.1).collect(),
        };
        for text in parameters.iter().chain(known.iter().map(|k| &k.0)) {
            let name = Name::parse(text).unwrap_or_else(|_| Name::single(text));
            let at = out.names.len();
            if let Some(before) = out.index.insert(name.clone(), at) {
                let what = |i| if i < parameters.len() { "a parameter" } else { "a known value" };
                let (first, second) = (what(before).to_string(), what(at).to_string());
                return Err(RestrictionError::Twice { name: name.to_string(), first, second });
            }
            out.written.push(name.to_string());
            out.names.push(name);
        }
        Ok(out)
    }

    /// A graph and the scope in which every name means its node.
    pub fn scope(&self) -> (Graph, Scope) {
        let mut graph = Graph::new();
        let mut scope = Scope::new("parameter");
        for (at, name) in self.written.iter().enumerate() {
            let node = self.node(&mut graph, at);
            scope.insert(name, node);
        }
        (graph, scope)
    }

    fn node(&self, graph: &mut Graph, at: usize) -> Id {
        // A model with 2^32 parameters would not fit in memory.
        if at < self.parameters { graph.parameter(at as u32) } else { graph.constant(self.known[at - self.parameters]) }
    }

    /// Every name, parameters first.
    pub fn names(&self) -> &[Name] {
        &self.names
    }

    /// The names that fit the pattern, in order.
    ///
    /// # Errors
    /// None does.
    pub fn matching(&self, pattern: &Name, span: Span) -> Result<Vec<&Name>, ExprError> {
        let found: Vec<&Name> = self.names.iter().filter(|n| n.matches(pattern)).collect();
        if found.is_empty() { Err(self.unknown(pattern, span)) } else { Ok(found) }
    }

    /// The error for a name that is not here.
    pub fn unknown(&self, name: &Name, span: Span) -> ExprError {
        ExprError::unknown(span, "parameter", name, self.written.iter().map(String::as_str))
    }

    /// Whether the name is here.
    pub fn has(&self, name: &Name) -> bool {
        self.index.contains_key(name)
    }

    /// Whether this is a free parameter (else known, or not here).
    pub fn is_free(&self, name: &Name) -> bool {
        self.index.get(name).is_some_and(|&i| i < self.parameters)
    }

    /// Indices of the free parameters in the expression, ascending.
    ///
    /// # Errors
    /// A pattern of a sum that nothing fits.
    pub fn parameters_in(&self, ast: &Ast) -> Result<Vec<usize>, ExprError> {
        let mut out: Vec<usize> = ast.names().iter().filter_map(|(n, _)| self.index.get(n).copied()).collect();
        for (pattern, span) in ast.sums() {
            out.extend(self.matching(&pattern, span)?.iter().filter_map(|n| self.index.get(*n).copied()));
        }
        out.retain(|&i| i < self.parameters);
        out.sort_unstable();
        out.dedup();
        Ok(out)
    }
}
