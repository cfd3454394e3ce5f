//! Which column of the table serves for what.

use crate::data::Table;
use crate::expr::{Ast, parse_condition, parse_expression};
use crate::likelihood::model::{Amount, Form, Response};
use crate::study::Study;

/// The uses of a column, in words, in the order in which the study names them; empty if it has none.
pub fn uses(study: &Study, column: &str) -> Vec<String> {
    let (model, request) = (&study.model, &study.data.request);
    let mut out = Vec::new();
    let mut add = |yes: bool, what: String| {
        if yes && !out.contains(&what) {
            out.push(what);
        }
    };
    match &model.response {
        Response::Column(c) => add(c == column, "the response".into()),
        Response::Ends { lower, upper } => {
            add(lower == column, "the lower end of the response".into());
            add(upper == column, "the upper end of the response".into());
        }
        Response::Several(all) => add(all.iter().any(|c| c == column), "a response".into()),
        Response::None => {}
    }
    let is = |name: &Option<String>| name.as_deref() == Some(column);
    add(is(&request.weight), "the frequency weight".into());
    let amount = |a: &Option<Amount>| matches!(a, Some(Amount::Column(c)) if c == column);
    add(is(&model.exposure) || model.components.iter().any(|c| is(&c.exposure)), "the exposure".into());
    add(amount(&model.trials) || model.components.iter().any(|c| amount(&c.trials)), "the number of trials".into());
    add(amount(&model.successes), "the successes drawn from".into());
    add(amount(&model.failures), "the failures drawn from".into());
    add(amount(&model.above), "the end above which values could be recorded".into());
    add(amount(&model.below), "the end below which values could be recorded".into());
    add(model.event.as_ref().is_some_and(|e| e.column == column), "tells whether the response was seen".into());
    add(is(&model.per), "gives each level its own parameters".into());
    for setting in model.parameters.iter().chain(model.components.iter().flat_map(|c| &c.parameters)) {
        match &setting.form {
            Form::Plain => {}
            Form::Curve(text) => add(names(text, column), format!("in the curve of {}", setting.name)),
            Form::Terms(terms) => {
                add(terms.terms.iter().flatten().any(|c| c == column), format!("a term of {}", setting.name));
                add(
                    terms.offset.as_deref().is_some_and(|o| names(o, column)),
                    format!("in the offset of {}", setting.name),
                );
            }
        }
    }
    add(model.log_density.as_deref().is_some_and(|t| names(t, column)), "in the log density".into());
    for (name, text) in &model.lets {
        add(names(text, column), format!("in {name}"));
    }
    for (name, text) in &request.derive {
        add(names(text, column), format!("makes {name}"));
    }
    add(request.only.as_deref().is_some_and(|t| names(t, column)), "decides which rows are kept".into());
    out
}

/// Columns that stand alone or in products among the terms of some parameter.
pub fn terms(study: &Study) -> impl Iterator<Item = &str> {
    study.model.parameters.iter().flat_map(|s| match &s.form {
        Form::Terms(terms) => terms.terms.iter().flatten().map(String::as_str).collect::<Vec<_>>(),
        _ => Vec::new(),
    })
}

/// Whether a column is made by `[data.derive]`, and from what.
pub fn made_from<'a>(study: &'a Study, column: &str) -> Option<&'a str> {
    study.data.request.derive.iter().find(|d| d.0 == column).map(|d| d.1.as_str())
}

/// Numbers of a column; `None` for labels.
pub fn numbers<'a>(table: &'a Table, column: &str) -> Option<&'a [f64]> {
    match &table.column(column)?.values {
        crate::data::Values::Number(values) => Some(values),
        crate::data::Values::Category { .. } => None,
    }
}

fn names(text: &str, column: &str) -> bool {
    let has = |ast: &Ast| ast.names().iter().any(|(name, _)| name.as_single() == Some(column));
    parse_expression(text).is_ok_and(|a| has(&a)) || parse_condition(text).is_ok_and(|a| has(&a))
}
