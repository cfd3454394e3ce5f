//! Expressions over columns: derived columns and the filter.

use super::error::{DataError, clip};
use crate::expr::rows::{ColumnView, evaluate};
use crate::expr::{Ast, ExprError, Kind, Operator, Relation, Span, parse_condition, parse_expression};
use std::collections::BTreeMap;

/// What an expression does with a column.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Use {
    /// Arithmetic.
    Number,
    /// Comparison with a label.
    Label,
    /// Comparison with another column.
    Either,
}

/// A parsed expression over columns and where it stands.
#[derive(Debug, Clone)]
pub(super) struct Formula {
    place: String,
    /// As written.
    pub text: String,
    ast: Ast,
    /// Columns by name (pieces joined as written): what is done with them, and where first.
    pub uses: BTreeMap<String, (Use, Span)>,
}

impl Formula {
    /// Reads an expression that gives a number (or, with `condition`, true or false).
    pub fn parse(place: String, text: &str, condition: bool) -> Result<Formula, DataError> {
        let parsed = if condition { parse_condition(text) } else { parse_expression(text) };
        let wrap =
            |error| DataError::Expression { place: place.clone(), text: text.to_owned(), error: Box::new(error) };
        let ast = parsed.map_err(wrap)?;
        let mut uses = BTreeMap::new();
        gather(&ast, &mut uses).map_err(wrap)?;
        Ok(Formula { place, text: text.to_owned(), ast, uses })
    }

    /// An error about a place in this expression.
    pub fn fault(&self, error: ExprError) -> DataError {
        DataError::Expression { place: self.place.clone(), text: self.text.clone(), error: Box::new(error) }
    }

    /// Its value in each row.
    pub fn values<'v>(
        &self,
        view: &dyn Fn(&str) -> Option<ColumnView<'v>>,
        rows: usize,
    ) -> Result<Vec<f64>, DataError> {
        evaluate(&self.ast, &|name| view(&plain(name)), rows).map_err(|e| self.fault(e))
    }

    /// The innermost step that is undefined, in words (`log of -3`), in a table of one row.
    pub fn culprit<'v>(&self, view: &dyn Fn(&str) -> Option<ColumnView<'v>>) -> Option<String> {
        culprit(&self.ast, view)
    }
}

/// The name of a column, as the header writes it.
fn plain(name: &crate::expr::Name) -> String {
    let mut text = String::new();
    for (i, piece) in name.pieces.iter().enumerate() {
        if i > 0 {
            text.push(if piece.joiner == crate::expr::Joiner::Dot { '.' } else { ':' });
        }
        text.push_str(piece.text.as_deref().unwrap_or("*"));
    }
    text
}

fn gather(ast: &Ast, uses: &mut BTreeMap<String, (Use, Span)>) -> Result<(), ExprError> {
    match &ast.kind {
        // The parser lets texts stand in comparisons only.
        Kind::Number(_) | Kind::Text(_) => Ok(()),
        Kind::Name(name) => note(plain(name), Use::Number, ast.span, uses),
        Kind::Sum(_) => Err(ExprError {
            span: ast.span,
            fault: crate::expr::Fault::Sort("sum over a pattern is for parameters".into()),
            advice: Some("write the columns out: a + b + c".into()),
        }),
        Kind::Negate(a) | Kind::Not(a) => gather(a, uses),
        Kind::Binary(_, a, b) | Kind::And(a, b) | Kind::Or(a, b) => {
            gather(a, uses)?;
            gather(b, uses)
        }
        Kind::Call(_, all) => all.iter().try_for_each(|a| gather(a, uses)),
        Kind::If(c, a, b) => {
            gather(c, uses)?;
            gather(a, uses)?;
            gather(b, uses)
        }
        Kind::Compare(relation, a, b) => {
            let label = matches!(relation, Relation::Equal | Relation::Unequal);
            match (&a.kind, &b.kind) {
                (Kind::Name(n), Kind::Text(_)) if label => note(plain(n), Use::Label, a.span, uses),
                (Kind::Text(_), Kind::Name(n)) if label => note(plain(n), Use::Label, b.span, uses),
                (Kind::Name(m), Kind::Name(n)) if label => {
                    note(plain(m), Use::Either, a.span, uses)?;
                    note(plain(n), Use::Either, b.span, uses)
                }
                _ => {
                    gather(a, uses)?;
                    gather(b, uses)
                }
            }
        }
    }
}

/// Keeps the stronger of two uses; a number and a label at once is an error.
fn note(name: String, new: Use, span: Span, uses: &mut BTreeMap<String, (Use, Span)>) -> Result<(), ExprError> {
    match uses.get(&name) {
        Some((old, _)) if *old == new || new == Use::Either => Ok(()),
        Some((Use::Number, _)) | Some((Use::Label, _)) => Err(ExprError {
            span,
            fault: crate::expr::Fault::Sort(format!(
                "{} is used as a number and compared with a label in one expression",
                clip(&name)
            )),
            advice: Some("write labels in quotes, numbers without".into()),
        }),
        Some((Use::Either, _)) | None => {
            uses.insert(name, (new, span));
            Ok(())
        }
    }
}

/// The innermost undefined step below `ast`, found by evaluating its parts in one row.
fn culprit<'v>(ast: &Ast, view: &dyn Fn(&str) -> Option<ColumnView<'v>>) -> Option<String> {
    let value = |a: &Ast| evaluate(a, &|name| view(&plain(name)), 1).ok().and_then(|v| v.first().copied());
    let bad = |a: &Ast| value(a).is_some_and(|x| !x.is_finite());
    let show = |a: &Ast| value(a).map_or_else(String::new, |x| format!("{x}"));
    // The branch that is not taken adds nothing.
    let parts: Vec<&Ast> = match &ast.kind {
        Kind::Negate(a) | Kind::Not(a) => vec![a],
        Kind::Binary(_, a, b) | Kind::Compare(_, a, b) | Kind::And(a, b) | Kind::Or(a, b) => vec![a, b],
        Kind::Call(_, all) => all.iter().collect(),
        Kind::If(c, a, b) => match value(c) {
            Some(x) if x.is_nan() => vec![c],
            Some(x) => vec![c, if x != 0.0 { a } else { b }],
            None => vec![],
        },
        Kind::Number(_) | Kind::Text(_) | Kind::Name(_) | Kind::Sum(_) => vec![],
    };
    if let Some(inner) = parts.iter().find_map(|p| culprit(p, view)) {
        return Some(inner);
    }
    if !bad(ast) {
        return None;
    }
    Some(match &ast.kind {
        Kind::Call(function, all) => {
            format!("{} of {}", function.entry().1, all.iter().map(show).collect::<Vec<_>>().join(", "))
        }
        Kind::Binary(operator, a, b) => {
            let sign = match operator {
                Operator::Add => '+',
                Operator::Subtract => '-',
                Operator::Multiply => '*',
                Operator::Divide => '/',
                Operator::Power => '^',
            };
            format!("{} {sign} {}", show(a), show(b))
        }
        _ => format!("a value of {}", show(ast)),
    })
}

#[cfg(test)]
mod tests {
    use super::{Formula, Use};
    use crate::expr::rows::ColumnView;

    fn formula(text: &str) -> Formula {
        Formula::parse("data.derive.x".into(), text, false).unwrap()
    }

    fn condition(text: &str) -> Formula {
        Formula::parse("data.only".into(), text, true).unwrap()
    }

    #[test]
    fn tells_what_is_done_with_each_column() {
        let uses = condition("log(area) > 0 and kiln = 'north' and 'south' != yard and a = b").uses;
        let of = |name: &str| uses[name].0;
        assert_eq!((of("area"), of("kiln"), of("yard")), (Use::Number, Use::Label, Use::Label));
        assert_eq!((of("a"), of("b")), (Use::Either, Use::Either));
        assert_eq!(uses.len(), 5);
    }

    #[test]
    fn odd_names_are_columns() {
        assert_eq!(formula("log(\"soak time\") + a.b").uses.keys().collect::<Vec<_>>(), ["a.b", "soak time"]);
        let label = Formula::parse("data.derive.x".into(), "log('soak time')", false).unwrap_err();
        assert!(label.to_string().contains("an odd name stands in double quotes"), "{label}");
    }

    #[test]
    fn a_number_and_a_label_at_once_is_an_error() {
        let error = Formula::parse("data.only".into(), "year > 1990 and year != '1999'", true).unwrap_err();
        assert!(error.to_string().contains("year is used as a number and compared with a label"), "{error}");
        let error = Formula::parse("data.derive.x".into(), "sum(flaws.*)", false).unwrap_err();
        assert!(error.to_string().contains("write the columns out"), "{error}");
    }

    #[test]
    fn names_the_step_that_is_undefined() {
        let at = |text: &str, x: f64| {
            let values = [x];
            formula(text).culprit(&|_| Some(ColumnView::Number(&values)))
        };
        assert_eq!(at("1 + log(area)", -3.0).unwrap(), "log of -3");
        assert_eq!(at("1 / (area - 2)", 2.0).unwrap(), "1 / 0");
        assert_eq!(at("if(area > 0, log(area), 0)", -3.0), None);
        assert_eq!(at("log_sum_exp(area, sqrt(area))", -1.0).unwrap(), "sqrt of -1");
        assert_eq!(at("exp(area)", 1000.0).unwrap(), "exp of 1000");
    }
}
