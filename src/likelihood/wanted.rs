//! Which columns a model uses, and what each must hold: the reader's orders.

use super::LikelihoodError;
use super::compose::has_terms;
use super::model::{Amount, Form, Model, Response};
use super::statement::Statement;
use crate::data::{Pair, Sort, Wanted};
use crate::expr::parse_expression;
use crate::family::Support;

/// The columns in use and the relations between them.
///
/// # Errors
/// A statement that does not fit its family.
pub fn wanted(model: &Model) -> Result<(Vec<Wanted>, Vec<Pair>), LikelihoodError> {
    let statement = Statement::resolve(model)?;
    let support = statement.support();
    let of_support = match support {
        Some(Support::Nonnegative) => Sort::Nonnegative,
        Some(Support::Positive) => Sort::Positive,
        Some(Support::Count | Support::CountFromOne | Support::CountOfTrials) => Sort::Count,
        Some(Support::Real | Support::Unit | Support::From(_)) | None => Sort::Number,
    };
    let (mut out, mut pairs) = (Vec::new(), Vec::new());
    let mut want = |name: &str, sort: Sort| {
        let w = Wanted::new(name, sort);
        if !out.contains(&w) {
            out.push(w);
        }
    };
    let categorical = model.family == "categorical";
    match &model.response {
        Response::None => {}
        Response::Column(c) => want(c, if categorical { Sort::Category } else { of_support }),
        Response::Labels(list) => list.iter().for_each(|c| want(c, Sort::Category)),
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
