//! Which columns a model uses, and what each must hold: the reader's orders.

use super::LikelihoodError;
use super::compose::has_terms;
use super::model::{Amount, Form, Model, Response};
use super::statement::{Body, Statement};
use crate::data::{Pair, Sort, Wanted};
use crate::expr::parse_expression;
use crate::family::Support;
use crate::family::composite::Reads;

/// The columns in use and the relations between them.
///
/// # Errors
/// A statement that does not fit its family.
pub fn wanted(model: &Model) -> Result<(Vec<Wanted>, Vec<Pair>), LikelihoodError> {
    let statement = Statement::resolve(model, None)?;
    // a mixture takes what one of its components takes
    let of_support = statement.supports().into_iter().filter(|s| !s.is_lump()).map(sort).reduce(|a, b| match (a, b) {
        (a, b) if a == b => a,
        (Sort::Number, _) | (_, Sort::Number) => Sort::Number,
        _ => Sort::Nonnegative,
    });
    let of_support = of_support.unwrap_or(Sort::Number);
    let (mut out, mut pairs) = (Vec::new(), Vec::new());
    let mut want = |name: &str, sort: Sort| {
        let w = Wanted::new(name, sort);
        if !out.contains(&w) {
            out.push(w);
        }
    };
    let response = match &statement.body {
        Body::Composite(f, ..) => match f.reads {
            Reads::Labels | Reads::OrderedLabels | Reads::Contest => Sort::Category,
            Reads::Numbers => Sort::Number,
            Reads::Shares => Sort::Positive,
        },
        Body::Custom(_) => Sort::Either,
        Body::Density(_) | Body::Mixture(_) => of_support,
    };
    match &model.response {
        Response::None => {}
        Response::Column(c) => want(c, response),
        Response::Several(list) => list.iter().for_each(|c| want(c, response)),
        Response::Ends { lower, upper } => {
            want(lower, Sort::LowerEnd);
            want(upper, Sort::UpperEnd);
            pairs.push(Pair::Ends { lower: lower.clone(), upper: upper.clone() });
        }
    }
    if let Some(c) = &model.exposure {
        want(c, Sort::Positive);
    }
    if let Some(Amount::Column(n)) = &model.trials {
        want(n, Sort::Count);
        if let Response::Column(y) = &model.response {
            pairs.push(Pair::AtMost { count: y.clone(), trials: n.clone() });
        }
    }
    for amount in [&model.successes, &model.failures] {
        if let Some(Amount::Column(n)) = amount {
            want(n, Sort::Count);
        }
    }
    for amount in [&model.above, &model.below] {
        if let Some(Amount::Column(n)) = amount {
            want(n, Sort::Number);
        }
    }
    for c in &model.components {
        if let Some(e) = &c.exposure {
            want(e, Sort::Positive);
        }
        if let Some(Amount::Column(n)) = &c.trials {
            want(n, Sort::Count);
        }
    }
    if let Some(e) = &model.event {
        want(&e.column, if e.seen.is_some() { Sort::Category } else { Sort::Either });
    }
    if let Some(per) = &model.per {
        want(per, Sort::Category);
    }
    for c in statement.columns() {
        want(&c, Sort::Either);
    }
    for r in statement.rows.iter().filter(|r| has_terms(r.setting.map(|s| &s.form))) {
        let Some(Form::Terms(t)) = r.setting.map(|s| &s.form) else { continue };
        t.terms.iter().flatten().for_each(|c| want(c, Sort::Either));
        if let Some(text) = &t.offset {
            let place = format!("{}.offset", r.place);
            let ast = parse_expression(text).map_err(LikelihoodError::expression(place))?;
            for (name, _) in ast.names() {
                if let Some(c) = name.as_single() {
                    want(c, Sort::Either);
                }
            }
        }
    }
    Ok((out, pairs))
}

/// What the reader must find in a column of responses.
fn sort(support: Support) -> Sort {
    match support {
        Support::Nonnegative => Sort::Nonnegative,
        Support::Positive => Sort::Positive,
        Support::Count | Support::CountFromOne | Support::CountOfTrials | Support::Draws => Sort::Count,
        Support::Real | Support::Angle | Support::Unit | Support::From(_) | Support::Lump(_) => Sort::Number,
    }
}
