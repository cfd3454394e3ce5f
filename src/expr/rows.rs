//! Evaluation of a parsed text over whole columns, for derived columns and filters.

use super::build::label_code;
use super::graph::power;
use super::{Ast, ExprError, Fault, Kind, Name, Operator, Relation};

/// A column as an expression sees it.
#[derive(Debug, Clone, Copy)]
pub enum ColumnView<'a> {
    /// Numbers, one a row.
    Number(&'a [f64]),
    /// Codes into levels.
    Category {
        /// One a row.
        codes: &'a [u32],
        /// The labels.
        levels: &'a [String],
    },
}

/// The value of the expression in each row; conditions give 1 and 0. NaN where it is undefined, in conditions too
/// (`log(-3) > 0` is neither true nor false), unless the rest decides: false `and` undefined is false, true `or`
/// undefined is true. The branch of an `if` not taken adds nothing, even if undefined.
///
/// # Errors
/// A name without column, a category where a number belongs, a label that is no level.
pub fn evaluate<'a>(
    ast: &Ast,
    columns: &dyn Fn(&Name) -> Option<ColumnView<'a>>,
    rows: usize,
) -> Result<Vec<f64>, ExprError> {
    let go = |a: &Ast| evaluate(a, columns, rows);
    let pair = |a: &Ast, b: &Ast, f: &dyn Fn(f64, f64) -> f64| -> Result<Vec<f64>, ExprError> {
        let (mut x, y) = (go(a)?, go(b)?);
        x.iter_mut().zip(&y).for_each(|(x, &y)| *x = f(*x, y));
        Ok(x)
    };
    let missing =
        |name: &Name| ExprError { span: ast.span, fault: Fault::Unknown("column", name.to_string()), advice: None };
    let column = |name: &Name| match columns(name) {
        Some(ColumnView::Number(x)) => Ok(x.to_vec()),
        Some(ColumnView::Category { .. }) => Err(ExprError {
            span: ast.span,
            fault: Fault::Sort(format!("{name} is a category and has no value as a number")),
            advice: Some(format!("compare it with a label, as in {name} = 'label'")),
        }),
        None => Err(missing(name)),
    };
    match &ast.kind {
        Kind::Number(x) => Ok(vec![*x; rows]),
        Kind::Name(name) => column(name),
        Kind::Text(text) => column(&Name::single(text.as_str())),
        Kind::Negate(a) => Ok(go(a)?.into_iter().map(|x| -x).collect()),
        Kind::Binary(op, a, b) => match op {
            Operator::Add => pair(a, b, &|x, y| x + y),
            Operator::Subtract => pair(a, b, &|x, y| x - y),
            Operator::Multiply => pair(a, b, &|x, y| x * y),
            Operator::Divide => pair(a, b, &|x, y| x / y),
            Operator::Power => pair(a, b, &power),
        },
        Kind::Call(function, arguments) => {
            let values = arguments.iter().map(go).collect::<Result<Vec<_>, _>>()?;
            let mut row = vec![0.0; values.len()];
            Ok((0..rows)
                .map(|i| {
                    row.iter_mut().zip(&values).for_each(|(r, v)| *r = v[i]);
                    function.value(&row)
                })
                .collect())
        }
        Kind::Sum(pattern) => Err(missing(pattern)),
        Kind::If(c, a, b) => {
            let (c, a, b) = (go(c)?, go(a)?, go(b)?);
            let choose = |i: usize| match c[i] {
                c if c.is_nan() => f64::NAN,
                0.0 => b[i],
                _ => a[i],
            };
            Ok((0..rows).map(choose).collect())
        }
        Kind::Compare(relation, a, b) => compare(*relation, a, b, columns, rows),
        Kind::And(a, b) => pair(a, b, &both),
        Kind::Or(a, b) => pair(a, b, &|x, y| 1.0 - both(1.0 - x, 1.0 - y)),
        Kind::Not(a) => Ok(go(a)?.into_iter().map(|x| 1.0 - x).collect()),
    }
}

/// `and` of two truths, of which NaN is neither.
fn both(x: f64, y: f64) -> f64 {
    if x == 0.0 || y == 0.0 { 0.0 } else { x * y }
}

fn compare<'a>(
    relation: Relation,
    a: &Ast,
    b: &Ast,
    columns: &dyn Fn(&Name) -> Option<ColumnView<'a>>,
    rows: usize,
) -> Result<Vec<f64>, ExprError> {
    let truth = |b: bool| f64::from(u8::from(b));
    let verdict = |x: f64, y: f64| if x.is_nan() || y.is_nan() { f64::NAN } else { truth(relation.holds(x, y)) };
    let category = |x: &Ast| match &x.kind {
        Kind::Name(n) => match columns(n) {
            Some(ColumnView::Category { codes, levels }) => Some((codes, levels)),
            _ => None,
        },
        _ => None,
    };
    let (codes, levels, other) = match (category(a), category(b)) {
        (Some((c, l)), None) => (c, l, b),
        (None, Some((c, l))) => (c, l, a),
        _ => {
            let (x, y) = (evaluate(a, columns, rows)?, evaluate(b, columns, rows)?);
            return Ok(x.iter().zip(&y).map(|(&x, &y)| verdict(x, y)).collect());
        }
    };
    let code = label_code(relation, other, levels)? as u32;
    Ok(codes.iter().map(|&c| truth((c == code) == (relation == Relation::Equal))).collect())
}

#[cfg(test)]
mod tests {
    use super::{ColumnView, evaluate};
    use crate::expr::{parse_condition, parse_expression};

    #[test]
    fn what_is_undefined_decides_nothing() {
        let x = [-1.0, 1.0, 3.0];
        let of = |text: &str| {
            let ast = parse_condition(text).or_else(|_| parse_expression(text)).unwrap();
            let values = evaluate(&ast, &|_| Some(ColumnView::Number(&x)), x.len()).unwrap();
            values.into_iter().map(|v| (!v.is_nan()).then_some(v)).collect::<Vec<_>>()
        };
        assert_eq!(of("log(x) > 0"), [None, Some(0.0), Some(1.0)]);
        assert_eq!(of("not log(x) > 0"), [None, Some(1.0), Some(0.0)]);
        assert_eq!(of("x > 0 and log(x) > 0"), [Some(0.0), Some(0.0), Some(1.0)]);
        assert_eq!(of("log(x) > 0 or x < 0"), [Some(1.0), Some(0.0), Some(1.0)]);
        assert_eq!(of("log(x) > 0 or x > 0"), [None, Some(1.0), Some(1.0)]);
        assert_eq!(of("if(log(x) > 0, x, 0)"), [None, Some(0.0), Some(3.0)]);
        assert_eq!(of("if(x > 0, log(x), 0)"), [Some(0.0), Some(0.0), Some(libm::log(3.0))]);
    }
}
