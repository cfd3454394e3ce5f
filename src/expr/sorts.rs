//! Numbers, labels and conditions each in their place, and as many arguments as a function takes.

use super::{Ast, ExprError, Fault, Function, Kind, Relation, Span, function};

/// A call of a function of the table.
pub(super) fn plain_call(function: Function, arguments: Vec<Ast>, span: Span) -> Result<Kind, ExprError> {
    for argument in &arguments {
        value(argument)?;
    }
    let function::Entry(_, name, fewest, most, _) = *function.entry();
    let count = arguments.len();
    let takes = match (fewest, most) {
        _ if function == Function::LogMix && count % 2 == 1 => "pairs of a weight and a logarithm".to_string(),
        _ if (fewest..=most).contains(&count) => return Ok(Kind::Call(function, arguments)),
        (1, 1) => "1 argument".to_string(),
        (_, usize::MAX) => format!("{fewest} or more arguments"),
        _ => format!("{fewest} arguments"),
    };
    Err(ExprError { span, fault: Fault::Arguments(name, takes, count), advice: None })
}

/// A call of `if`.
pub(super) fn if_call(arguments: Vec<Ast>, span: Span) -> Result<Kind, ExprError> {
    let count = arguments.len();
    let Ok([test, yes, no]) = <[Ast; 3]>::try_from(arguments) else {
        let fault = Fault::Arguments("if", "3 arguments".to_string(), count);
        return Err(ExprError {
            span,
            fault,
            advice: Some("write if(condition, value if true, value if not)".to_string()),
        });
    };
    condition(&test)?;
    value(&yes)?;
    value(&no)?;
    Ok(Kind::If(Box::new(test), Box::new(yes), Box::new(no)))
}

/// Checks that this is a number.
pub(super) fn value(ast: &Ast) -> Result<(), ExprError> {
    match &ast.kind {
        Kind::Text(text) => Err(ExprError::sort(ast.span, format!("the label '{text}' stands where a number belongs"))
            .advise("a label can only be compared, as in kiln = 'north'; an odd name stands in double quotes")),
        _ if ast.is_condition() => Err(ExprError::sort(ast.span, "a condition stands where a number belongs")
            .advise("turn it into one with if(condition, 1, 0)")),
        _ => Ok(()),
    }
}

/// Checks that this is true or false.
pub(super) fn condition(ast: &Ast) -> Result<(), ExprError> {
    if ast.is_condition() {
        return Ok(());
    }
    let advice = match &ast.kind {
        Kind::Name(name) => format!("compare it: {name} = 1"),
        _ => "compare it with something: < <= > >= = !=".to_string(),
    };
    Err(ExprError::sort(ast.span, "a condition belongs here, which is true or false").advise(advice))
}

/// Checks that this may be a side of the relation, which stands at `place`.
pub(super) fn comparable(ast: &Ast, relation: Relation, place: Span) -> Result<(), ExprError> {
    match &ast.kind {
        Kind::Text(_) if matches!(relation, Relation::Equal | Relation::Unequal) => Ok(()),
        Kind::Text(_) => Err(ExprError::sort(place, "labels are equal or unequal, none is smaller")),
        _ => value(ast),
    }
}

/// Checks that no name outside `sum(pattern)` is a pattern.
pub(super) fn no_pattern(ast: &Ast) -> Result<(), ExprError> {
    match ast.names().into_iter().find(|(name, _)| name.is_pattern()) {
        Some((name, span)) => {
            Err(ExprError::sort(span, format!("{name} is a pattern, which stands for several names"))
                .advise(format!("write sum({name}) for their sum; for a product put spaces round the *")))
        }
        None => Ok(()),
    }
}
