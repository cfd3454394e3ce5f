//! From a parsed text to nodes of a graph: names are looked up in a [`Scope`].

use std::collections::HashMap;

use super::graph::{Graph, Id};
use super::{Ast, ExprError, Fault, Kind, Name, Operator, Relation, Span, nearest};

/// What names mean while an expression is built.
#[derive(Debug, Clone, Default)]
pub struct Scope {
    meanings: HashMap<String, Meaning>,
    order: Vec<String>,
    /// What a name ought to be, for the message when there is none: `parameter`, `column`, ...
    pub wanted: &'static str,
}

#[derive(Debug, Clone)]
enum Meaning {
    Node(Id),
    Category(Id, Vec<String>),
}

impl Scope {
    /// An empty scope; `wanted` says in errors what a name should have been.
    pub fn new(wanted: &'static str) -> Self {
        Scope { wanted, ..Self::default() }
    }

    /// Lets a name (as [`Name`] prints it) mean a node. A later meaning hides an earlier one.
    pub fn insert(&mut self, name: impl Into<String>, node: Id) {
        let name = name.into();
        if self.meanings.insert(name.clone(), Meaning::Node(node)).is_none() {
            self.order.push(name);
        }
    }

    /// Lets a name mean a column of codes into these levels; it can be compared with labels only.
    pub fn insert_category(&mut self, name: impl Into<String>, codes: Id, levels: &[String]) {
        let name = name.into();
        if self.meanings.insert(name.clone(), Meaning::Category(codes, levels.to_vec())).is_none() {
            self.order.push(name);
        }
    }

    /// The node a name means, if it is a number.
    pub fn node(&self, name: &str) -> Option<Id> {
        match self.meanings.get(name) {
            Some(Meaning::Node(id)) => Some(*id),
            _ => None,
        }
    }

    /// The names, in the order they came.
    pub fn names(&self) -> impl Iterator<Item = &str> {
        self.order.iter().map(String::as_str)
    }
}

/// Builds the nodes of an expression.
///
/// # Errors
/// A name that is not in the scope, a category where a number belongs, a label that is no level.
pub fn build(graph: &mut Graph, ast: &Ast, scope: &Scope) -> Result<Id, ExprError> {
    match &ast.kind {
        Kind::Number(x) => Ok(graph.constant(*x)),
        Kind::Name(name) => number(scope, &name.to_string(), ast.span),
        Kind::Text(text) => {
            // a column with an odd name, quoted
            number(scope, &Name::single(text.as_str()).to_string(), ast.span)
        }
        Kind::Negate(a) => {
            let a = build(graph, a, scope)?;
            Ok(graph.scale(-1.0, a))
        }
        Kind::Binary(op, a, b) => {
            let (a, b) = (build(graph, a, scope)?, build(graph, b, scope)?);
            Ok(match op {
                Operator::Add => graph.add(a, b),
                Operator::Subtract => graph.subtract(a, b),
                Operator::Multiply => graph.multiply(a, b),
                Operator::Divide => graph.divide(a, b),
                Operator::Power => graph.power(a, b),
            })
        }
        Kind::Call(function, arguments) => {
            let ids = arguments.iter().map(|a| build(graph, a, scope)).collect::<Result<Vec<_>, _>>()?;
            Ok(graph.call(*function, &ids))
        }
        Kind::Sum(pattern) => {
            let mut terms = Vec::new();
            for name in scope.names() {
                if Name::parse(name).is_ok_and(|n| n.matches(pattern))
                    && let Some(id) = scope.node(name)
                {
                    terms.push((id, 1.0));
                }
            }
            if terms.is_empty() {
                return Err(unknown(scope, &pattern.to_string(), ast.span));
            }
            Ok(graph.sum(0.0, &terms))
        }
        Kind::If(c, a, b) => {
            let (c, a, b) = (build(graph, c, scope)?, build(graph, a, scope)?, build(graph, b, scope)?);
            Ok(graph.choice(c, a, b))
        }
        Kind::Compare(relation, a, b) => compare(graph, *relation, a, b, scope),
        Kind::And(a, b) => {
            let (a, b) = (build(graph, a, scope)?, build(graph, b, scope)?);
            Ok(graph.and(a, b))
        }
        Kind::Or(a, b) => {
            let (a, b) = (build(graph, a, scope)?, build(graph, b, scope)?);
            Ok(graph.or(a, b))
        }
        Kind::Not(a) => {
            let a = build(graph, a, scope)?;
            Ok(graph.not(a))
        }
    }
}

fn compare(graph: &mut Graph, relation: Relation, a: &Ast, b: &Ast, scope: &Scope) -> Result<Id, ExprError> {
    let category = |ast: &Ast| match &ast.kind {
        Kind::Name(n) => match scope.meanings.get(&n.to_string()) {
            Some(Meaning::Category(id, levels)) => Some((*id, levels)),
            _ => None,
        },
        _ => None,
    };
    let pair = match (category(a), category(b)) {
        (Some(c), None) => Some((c, b)),
        (None, Some(c)) => Some((c, a)),
        _ => None,
    };
    let Some(((codes, levels), other)) = pair else {
        let (a, b) = (build(graph, a, scope)?, build(graph, b, scope)?);
        return Ok(graph.compare(relation, a, b));
    };
    let code = label_code(relation, other, levels)?;
    let code = graph.constant(code as f64);
    Ok(graph.compare(relation, codes, code))
}

/// The code of the label that a category is compared with.
///
/// # Errors
/// No label, a relation that needs an order, a label that is no level.
pub(super) fn label_code(relation: Relation, other: &Ast, levels: &[String]) -> Result<usize, ExprError> {
    let fault = |fault: Fault, advice: String| ExprError { span: other.span, fault, advice: Some(advice) };
    let Kind::Text(label) = &other.kind else {
        return Err(fault(
            Fault::Sort("a category can be compared with a label only".into()),
            "write the label in single quotes, as in kiln = 'north'".into(),
        ));
    };
    if !matches!(relation, Relation::Equal | Relation::Unequal) {
        return Err(fault(Fault::Sort("labels have no order here".into()), "use = or !=".into()));
    }
    levels.iter().position(|l| l == label).ok_or_else(|| {
        fault(
            Fault::Unknown("level", label.to_string()),
            format!("the levels are {}", levels.iter().take(12).cloned().collect::<Vec<_>>().join(", ")),
        )
    })
}

fn number(scope: &Scope, name: &str, span: Span) -> Result<Id, ExprError> {
    match scope.meanings.get(name) {
        Some(Meaning::Node(id)) => Ok(*id),
        Some(Meaning::Category(..)) => Err(ExprError {
            span,
            fault: Fault::Sort(format!("{name} is a category and has no value as a number")),
            advice: Some(format!("compare it with a label, as in {name} = 'label'")),
        }),
        None => Err(unknown(scope, name, span)),
    }
}

fn unknown(scope: &Scope, name: &str, span: Span) -> ExprError {
    let near = nearest(name, scope.names()).map(|n| format!("nearest name: {n}"));
    ExprError { span, fault: Fault::Unknown(scope.wanted, name.to_string()), advice: near }
}
