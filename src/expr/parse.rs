//! The grammar and its parser, by precedence climbing.
//!
//! ```text
//! equation   = "equal" "(" pattern ")" | value "=" value { "=" value }
//! condition  = all { "or" all }
//! all        = denial { "and" denial }
//! denial     = "not" denial | comparison | "(" condition ")"
//! comparison = side ( "<" | "<=" | ">" | ">=" | "=" | "!=" ) side
//! side       = value | label                          (a label with = and != only)
//! value      = product { ( "+" | "-" ) product }
//! product    = unary { ( "*" | "/" ) unary }
//! unary      = ( "-" | "+" ) unary | power
//! power      = atom [ "^" unary ]
//! atom       = number | "pi" | name | function "(" value { "," value } ")" | "sum" "(" pattern ")"
//!            | "if" "(" condition "," value "," value ")" | "(" value ")"
//! name       = piece { ( "." | ":" ) piece }          (without spaces)
//! pattern    = a name in which pieces after a dot, or the first, are "*": exactly one piece each
//! piece      = letter { letter | digit | "_" } | single | double
//! label      = single
//! single     = "'" any text, a quote in it doubled "'"
//! double     = '"' any text, with the escapes \" \\ \b \t \n \f \r \uXXXX \UXXXXXXXX '"'
//! number     = ( digits [ "." [ digits ] ] | "." digits ) [ ( "e" | "E" ) [ "+" | "-" ] digits ]
//! letter     = "A".."Z" | "a".."z" | "_"
//! ```
//!
//! From loosest to tightest: `or`, `and`, `not`, comparisons (which do not chain), `+ -`, `* /`, unary minus, `^`. All
//! associate left but `^`, which associates right: `-2^2` is -4, `2^3^2` is 512, `2^-1` is a half. `and`, `or`, `not` and `pi`
//! are words of the language where they stand alone and plain; as names they are quoted (`"pi"`). A text in single quotes
//! standing alone is a label, one in double quotes a name. Functions are those of the table in [`Function`].
//!
//! A `*` that follows a dot, or that begins an operand and is followed by a dot, belongs to a pattern; any other
//! multiplies. Patterns stand in `sum` and `equal`, and in the names of an equation.

use super::lexer::{self, Lexeme, Mark, Token};
use super::print::binding;
use super::{Ast, ExprError, Fault, Function, Kind, Name, Operator, Relation, Span, function, nearest};

/// An equation between expressions.
#[derive(Debug, Clone, PartialEq)]
pub enum Equation {
    /// `a = b`, `a = b = c`: two sides at least.
    Chain(Vec<Ast>),
    /// `equal(pattern)`: all that fits the pattern is equal.
    Equal(Name, Span),
}

/// Parses an expression that gives a number.
///
/// # Errors
/// The first fault with its place and advice.
///
/// ```
/// let ast = guyline::expr::parse_expression("-2^2 + log(rate.soak)")?;
/// assert_eq!(ast.to_string(), "-2^2 + log(rate.soak)");
/// # Ok::<(), guyline::expr::ExprError>(())
/// ```
pub fn parse_expression(text: &str) -> Result<Ast, ExprError> {
    let mut parser = Parser::new(text, "an expression")?;
    let ast = parser.climb(binding::OR)?.ast;
    parser.finish("an expression")?;
    value(&ast)?;
    no_pattern(&ast)?;
    Ok(ast)
}

/// Parses a condition, which is true or false.
///
/// # Errors
/// The first fault with its place and advice.
pub fn parse_condition(text: &str) -> Result<Ast, ExprError> {
    let mut parser = Parser::new(text, "a condition")?;
    let ast = parser.climb(binding::OR)?.ast;
    parser.finish("a condition")?;
    condition(&ast)?;
    no_pattern(&ast)?;
    Ok(ast)
}

/// Parses an equation: a chain `a = b = c` or `equal(pattern)`. Names may be patterns.
///
/// # Errors
/// The first fault with its place and advice.
pub fn parse_equation(text: &str) -> Result<Equation, ExprError> {
    let mut parser = Parser::new(text, "an equation")?;
    if parser.word() == Some("equal") && parser.tokens[1].kind == Lexeme::Mark(Mark::Open) {
        return parser.equal();
    }
    let mut sides = vec![parser.side()?];
    while parser.take(Mark::Equal) {
        sides.push(parser.side()?);
    }
    let here = parser.token().clone();
    match &here.kind {
        Lexeme::Mark(Mark::Less | Mark::AtMost | Mark::More | Mark::AtLeast) => {
            return Err(ExprError::syntax(here.span, "a restriction is an equation; inequalities are not taken yet").advise(
                "write the model in the difference as a parameter of its own and give that a range: range = \"[0, inf)\"",
            ));
        }
        Lexeme::Mark(Mark::Unequal) => {
            return Err(ExprError::syntax(here.span, "a restriction says what is equal, not what differs"));
        }
        Lexeme::Word(word) if word == "and" => {
            return Err(ExprError::syntax(here.span, "a restriction is one equation")
                .advise("write each under a name of its own, or as a chain a = b = c"));
        }
        _ => parser.finish("an equation")?,
    }
    if sides.len() < 2 {
        return Err(ExprError::syntax(sides[0].span, "a restriction is written left = right"));
    }
    Ok(Equation::Chain(sides))
}

/// How deep calls of the parser may nest, and how deep a tree may grow (a sum of n terms is n deep): far beyond what
/// anyone writes, and small enough for the walks over the tree in a thread's stack of 2 MB.
const NESTING: usize = 400;
const DEPTH: usize = 1000;

/// A tree with its depth.
struct Grown {
    ast: Ast,
    depth: usize,
}

impl Grown {
    fn leaf(kind: Kind, span: Span) -> Grown {
        Grown { ast: Ast { kind, span }, depth: 1 }
    }

    fn over(kind: Kind, span: Span, below: usize) -> Result<Grown, ExprError> {
        if below >= DEPTH { Err(too_deep(span)) } else { Ok(Grown { ast: Ast { kind, span }, depth: below + 1 }) }
    }
}

fn too_deep(span: Span) -> ExprError {
    ExprError::syntax(span, "this expression is nested too deeply, or too long").advise("break it into named pieces")
}

struct Parser<'a> {
    text: &'a str,
    tokens: Vec<Token>,
    at: usize,
    nesting: usize,
    /// Parentheses open here, with what each belongs to.
    open: Vec<Span>,
}

impl<'a> Parser<'a> {
    fn new(text: &'a str, what: &str) -> Result<Self, ExprError> {
        let tokens = lexer::tokens(text)?;
        if tokens.len() == 1 {
            return Err(ExprError::syntax(tokens[0].span, format!("the text is empty where {what} should stand")));
        }
        Ok(Parser { text, tokens, at: 0, nesting: 0, open: Vec::new() })
    }

    fn token(&self) -> &Token {
        &self.tokens[self.at]
    }

    /// The token, stepping over it (never over the end).
    fn next(&mut self) -> Token {
        let token = self.token().clone();
        self.at = (self.at + 1).min(self.tokens.len() - 1);
        token
    }

    fn word(&self) -> Option<&str> {
        match &self.token().kind {
            Lexeme::Word(word) => Some(word),
            _ => None,
        }
    }

    fn take(&mut self, mark: Mark) -> bool {
        let found = self.token().kind == Lexeme::Mark(mark);
        if found {
            self.next();
        }
        found
    }

    fn written(&self, span: Span) -> &str {
        &self.text[span.start..span.end]
    }

    /// The operator at this place, with how it binds.
    fn operator(&self) -> Option<(Infix, u8)> {
        let arithmetic = |o: Operator| Some((Infix::Arithmetic(o), o.binding().0));
        let relation = |r: Relation| Some((Infix::Relation(r), binding::COMPARE));
        match &self.token().kind {
            Lexeme::Mark(Mark::Plus) => arithmetic(Operator::Add),
            Lexeme::Mark(Mark::Minus) => arithmetic(Operator::Subtract),
            Lexeme::Mark(Mark::Star) => arithmetic(Operator::Multiply),
            Lexeme::Mark(Mark::Slash) => arithmetic(Operator::Divide),
            Lexeme::Mark(Mark::Caret) => arithmetic(Operator::Power),
            Lexeme::Mark(Mark::Less) => relation(Relation::Less),
            Lexeme::Mark(Mark::AtMost) => relation(Relation::AtMost),
            Lexeme::Mark(Mark::More) => relation(Relation::More),
            Lexeme::Mark(Mark::AtLeast) => relation(Relation::AtLeast),
            Lexeme::Mark(Mark::Equal) => relation(Relation::Equal),
            Lexeme::Mark(Mark::Unequal) => relation(Relation::Unequal),
            Lexeme::Word(word) if word == "and" => Some((Infix::And, binding::AND)),
            Lexeme::Word(word) if word == "or" => Some((Infix::Or, binding::OR)),
            _ => None,
        }
    }

    /// Everything from here on that binds at least so tightly.
    fn climb(&mut self, least: u8) -> Result<Grown, ExprError> {
        self.nesting += 1;
        if self.nesting > NESTING {
            return Err(too_deep(self.token().span));
        }
        let mut left = self.prefix(least)?;
        while let Some((infix, binds)) = self.operator() {
            if binds < least {
                break;
            }
            let place = self.next().span;
            let right = self.climb(infix.right())?;
            left = self.join(infix, place, left, right)?;
        }
        self.nesting -= 1;
        Ok(left)
    }

    fn join(&self, infix: Infix, place: Span, left: Grown, right: Grown) -> Result<Grown, ExprError> {
        let below = left.depth.max(right.depth);
        let span = left.ast.span.to(right.ast.span);
        let (a, b) = (Box::new(left.ast), Box::new(right.ast));
        let kind = match infix {
            Infix::Arithmetic(operator) => {
                value(&a)?;
                value(&b)?;
                Kind::Binary(operator, a, b)
            }
            Infix::Relation(relation) => {
                if let Some((Infix::Relation(_), _)) = self.operator() {
                    return Err(ExprError::syntax(self.token().span, "a comparison has two sides")
                        .advise("join two comparisons with and: a < b and b < c"));
                }
                comparable(&a, relation, place)?;
                comparable(&b, relation, place)?;
                Kind::Compare(relation, a, b)
            }
            Infix::And | Infix::Or => {
                condition(&a)?;
                condition(&b)?;
                if infix == Infix::And { Kind::And(a, b) } else { Kind::Or(a, b) }
            }
        };
        Grown::over(kind, span, below)
    }

    /// An operand with the signs and denials before it.
    fn prefix(&mut self, least: u8) -> Result<Grown, ExprError> {
        let start = self.token().span;
        if self.take(Mark::Minus) {
            let of = self.climb(binding::UNARY)?;
            value(&of.ast)?;
            let span = start.to(of.ast.span);
            return Grown::over(Kind::Negate(Box::new(of.ast)), span, of.depth);
        }
        if self.take(Mark::Plus) {
            let of = self.climb(binding::UNARY)?;
            value(&of.ast)?;
            return Ok(of);
        }
        if self.word() == Some("not") {
            if least > binding::NOT {
                return Err(ExprError::sort(start, "not stands before a condition, not within arithmetic")
                    .advise("put the denial in parentheses or before the whole comparison: not a = b"));
            }
            self.next();
            let of = self.climb(binding::NOT)?;
            condition(&of.ast)?;
            let span = start.to(of.ast.span);
            return Grown::over(Kind::Not(Box::new(of.ast)), span, of.depth);
        }
        let atom = self.atom()?;
        if let Some(error) = self.side_by_side(start) {
            return Err(error);
        }
        Ok(atom)
    }

    fn atom(&mut self) -> Result<Grown, ExprError> {
        let token = self.token().clone();
        match token.kind {
            Lexeme::Number(x) => {
                self.next();
                Ok(Grown::leaf(Kind::Number(x), token.span))
            }
            Lexeme::Text(text) => {
                self.next();
                Ok(Grown::leaf(Kind::Text(text), token.span))
            }
            Lexeme::Name(name) => {
                self.next();
                Ok(Grown::leaf(Kind::Name(name), token.span))
            }
            Lexeme::Word(word) if word != "and" && word != "or" => {
                self.next();
                if self.token().kind == Lexeme::Mark(Mark::Open) {
                    self.call(&word, token.span)
                } else if word == "pi" {
                    Ok(Grown::leaf(Kind::Number(std::f64::consts::PI), token.span))
                } else {
                    Ok(Grown::leaf(Kind::Name(Name::single(word)), token.span))
                }
            }
            Lexeme::Mark(Mark::Open) => {
                self.next();
                if self.token().kind == Lexeme::Mark(Mark::Close) {
                    let span = token.span.to(self.token().span);
                    return Err(ExprError::syntax(span, "nothing stands between these parentheses"));
                }
                self.open.push(token.span);
                let mut inner = self.climb(binding::OR)?;
                inner.ast.span = token.span.to(self.close()?);
                Ok(inner)
            }
            _ => Err(self.operand_missing()),
        }
    }

    /// Steps over the parenthesis that closes the innermost open one; its place.
    fn close(&mut self) -> Result<Span, ExprError> {
        let here = self.token().clone();
        match here.kind {
            Lexeme::Mark(Mark::Close) => {
                self.open.pop();
                self.next();
                Ok(here.span)
            }
            Lexeme::Mark(Mark::Comma) => Err(self.stray_comma(here.span)),
            _ => Err(self
                .unclosed()
                .unwrap_or_else(|| ExprError::syntax(here.span, "a closing parenthesis belongs here"))),
        }
    }

    fn unclosed(&self) -> Option<ExprError> {
        let place = *self.open.last()?;
        Some(ExprError::syntax(place, "the parenthesis opened here is never closed").advise("close it with )"))
    }

    fn call(&mut self, word: &str, place: Span) -> Result<Grown, ExprError> {
        match word {
            "sum" => return self.sum(place),
            "if" | "equal" => {}
            _ if Function::named(word).is_some() => {}
            _ => return Err(no_function(word, place)),
        }
        if word == "equal" {
            return Err(ExprError::syntax(place, "equal(pattern) is a whole restriction and stands alone"));
        }
        let open = self.next().span;
        self.open.push(open);
        let mut arguments = Vec::new();
        let mut below = 0;
        if self.token().kind != Lexeme::Mark(Mark::Close) {
            loop {
                let argument = self.climb(binding::OR)?;
                below = below.max(argument.depth);
                arguments.push(argument.ast);
                if !self.take(Mark::Comma) {
                    break;
                }
            }
        }
        let span = place.to(self.close()?);
        let kind = match Function::named(word) {
            Some(function) => plain_call(function, arguments, span)?,
            None => if_call(arguments, span)?,
        };
        Grown::over(kind, span, below)
    }

    /// `sum(pattern)`, at the parenthesis.
    fn sum(&mut self, place: Span) -> Result<Grown, ExprError> {
        let (pattern, close) = self.pattern("sum")?;
        Ok(Grown::leaf(Kind::Sum(pattern), place.to(close)))
    }

    /// `(pattern)`, and the place of its end.
    fn pattern(&mut self, of: &str) -> Result<(Name, Span), ExprError> {
        let open = self.next().span;
        self.open.push(open);
        let token = self.next();
        let advice = format!("it takes one pattern: {of}(share.*) or {of}(*.shape)");
        let name = match token.kind {
            Lexeme::Name(name) if name.is_pattern() => name,
            Lexeme::Word(_) | Lexeme::Name(_) if of == "equal" => {
                return Err(
                    ExprError::syntax(token.span, "equal takes a pattern, a name with a *").advise("else write a = b")
                );
            }
            Lexeme::End => {
                return Err(ExprError::syntax(token.span, "the text ends where a pattern should follow").advise(advice));
            }
            _ => {
                let message = format!("{of} takes a pattern, a name with a *");
                return Err(ExprError::syntax(token.span, message).advise(advice));
            }
        };
        match self.token().kind {
            Lexeme::Mark(Mark::Close) | Lexeme::End => Ok((name, self.close()?)),
            _ => {
                Err(ExprError::syntax(self.token().span, format!("{of} takes one pattern and nothing else"))
                    .advise(advice))
            }
        }
    }

    fn equal(&mut self) -> Result<Equation, ExprError> {
        let start = self.next().span;
        let (pattern, end) = self.pattern("equal")?;
        if self.token().kind != Lexeme::End {
            return Err(ExprError::syntax(self.token().span, "equal(pattern) is a whole restriction and stands alone"));
        }
        Ok(Equation::Equal(pattern, start.to(end)))
    }

    /// One side of an equation.
    fn side(&mut self) -> Result<Ast, ExprError> {
        let ast = self.climb(binding::SUM)?.ast;
        value(&ast)?;
        Ok(ast)
    }

    /// The error for an operand that follows another (`start` is where that begins) without an operator between.
    fn side_by_side(&self, start: Span) -> Option<ExprError> {
        let here = self.token();
        let operand = match &here.kind {
            Lexeme::Word(word) => word != "and" && word != "or",
            Lexeme::Number(_) | Lexeme::Name(_) | Lexeme::Text(_) | Lexeme::Mark(Mark::Open) => true,
            _ => false,
        };
        if !operand {
            return None;
        }
        let before = &self.tokens[self.at - 1];
        let left = self.written(Span { start: start.start, end: before.span.end });
        let right = self.written(here.span);
        let span = start.to(here.span);
        Some(match (&before.kind, &here.kind) {
            (Lexeme::Word(word), _) if Function::named(word).is_some() => {
                ExprError::syntax(span, format!("the argument of {word} stands in parentheses"))
                    .advise(format!("write {word}({right})"))
            }
            (Lexeme::Number(_), Lexeme::Mark(Mark::Open)) | (Lexeme::Mark(Mark::Close), Lexeme::Mark(Mark::Open)) => {
                ExprError::syntax(span, "a * is missing before the parenthesis").advise(format!("write {left} * (...)"))
            }
            (Lexeme::Name(_), Lexeme::Mark(Mark::Open)) => no_function(left, start),
            (Lexeme::Word(_), Lexeme::Word(next)) if next != "not" => {
                ExprError::syntax(span, format!("an operator is missing between {left} and {right}")).advise(format!(
                    "a product is written {left} * {right}; a name with a space is quoted, \"{left} {right}\""
                ))
            }
            _ => ExprError::syntax(span, format!("an operator is missing between {left} and {right}"))
                .advise(format!("a product is written {left} * {right}")),
        })
    }

    /// The error for a place where a number or a name should begin and does not.
    fn operand_missing(&self) -> ExprError {
        let here = self.token();
        match &here.kind {
            Lexeme::End => match self.unclosed() {
                // `log(` and nothing more: the open parenthesis is the fault.
                Some(error) if self.at > 0 && self.tokens[self.at - 1].kind == Lexeme::Mark(Mark::Open) => error,
                _ => ExprError::syntax(here.span, "the text ends where a number or a name should follow"),
            },
            Lexeme::Mark(Mark::Close) if self.open.is_empty() => {
                ExprError::syntax(here.span, "this parenthesis closes nothing")
            }
            _ => {
                let sign = self.written(here.span);
                ExprError::syntax(here.span, format!("a number or a name is missing before {sign}"))
            }
        }
    }

    fn stray_comma(&self, span: Span) -> ExprError {
        ExprError::syntax(span, "a comma separates the arguments of a function")
            .advise("the decimal sign of a number is a point: 0.5")
    }

    /// Checks that the text ends here.
    fn finish(&self, what: &str) -> Result<(), ExprError> {
        let here = self.token();
        let error = match here.kind {
            Lexeme::End => return Ok(()),
            Lexeme::Mark(Mark::Close) => ExprError::syntax(here.span, "this parenthesis closes nothing"),
            Lexeme::Mark(Mark::Comma) => self.stray_comma(here.span),
            _ => ExprError::syntax(here.span, format!("{} cannot go on with {}", what, self.written(here.span))),
        };
        Err(error)
    }
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Infix {
    Arithmetic(Operator),
    Relation(Relation),
    And,
    Or,
}

impl Infix {
    /// What the right operand must bind at least.
    fn right(self) -> u8 {
        match self {
            Infix::Arithmetic(operator) => operator.binding().2,
            Infix::Relation(_) => binding::SUM,
            Infix::And => binding::NOT,
            Infix::Or => binding::AND,
        }
    }
}

fn plain_call(function: Function, arguments: Vec<Ast>, span: Span) -> Result<Kind, ExprError> {
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

fn if_call(arguments: Vec<Ast>, span: Span) -> Result<Kind, ExprError> {
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

/// Functions of other notations and what they are called here.
const ELSEWHERE: &[(&str, &str)] = &[
    ("ln", "the natural logarithm is written log(x)"),
    ("log10", "write log(x) / log(10)"),
    ("log2", "write log(x) / log(2)"),
    ("pow", "a power is written a ^ b"),
    ("power", "a power is written a ^ b"),
    ("sqr", "a square is written x^2"),
    ("gamma", "write exp(lgamma(x))"),
    ("factorial", "write exp(lgamma(n + 1))"),
    ("lfactorial", "write lgamma(n + 1)"),
    ("choose", "write exp(lgamma(n + 1) - lgamma(k + 1) - lgamma(n - k + 1))"),
    ("gammaln", "write lgamma(x)"),
    ("trigamma", "write polygamma(1, x)"),
    ("sigmoid", "write logistic(x)"),
    ("expit", "write logistic(x)"),
    ("phi", "write normal_cdf(x)"),
    ("logsumexp", "write log_sum_exp(a, b)"),
    ("arcsin", "write asin(x)"),
    ("arccos", "write acos(x)"),
    ("arctan", "write atan(x)"),
    ("mean", "write sum(share.*) and divide by how many there are"),
];

fn no_function(word: &str, place: Span) -> ExprError {
    let elsewhere =
        ELSEWHERE.iter().find(|(name, _)| *name == word.to_lowercase()).map(|(_, advice)| (*advice).to_string());
    let names = function::TABLE.iter().map(|e| e.1).chain(["sum", "if", "equal"]);
    let advice = elsewhere
        .or_else(|| nearest(word, names).map(|n| format!("nearest name: {n}")))
        .or_else(|| Some("for a product write a * before the parenthesis".to_string()));
    ExprError { span: place, fault: Fault::Unknown("function", word.to_string()), advice }
}

fn value(ast: &Ast) -> Result<(), ExprError> {
    match &ast.kind {
        Kind::Text(text) => Err(ExprError::sort(ast.span, format!("the label '{text}' stands where a number belongs"))
            .advise("a label can only be compared, as in kiln = 'north'; an odd name stands in double quotes")),
        _ if ast.is_condition() => Err(ExprError::sort(ast.span, "a condition stands where a number belongs")
            .advise("turn it into one with if(condition, 1, 0)")),
        _ => Ok(()),
    }
}

fn condition(ast: &Ast) -> Result<(), ExprError> {
    if ast.is_condition() {
        return Ok(());
    }
    let advice = match &ast.kind {
        Kind::Name(name) => format!("compare it: {name} = 1"),
        _ => "compare it with something: < <= > >= = !=".to_string(),
    };
    Err(ExprError::sort(ast.span, "a condition belongs here, which is true or false").advise(advice))
}

fn comparable(ast: &Ast, relation: Relation, place: Span) -> Result<(), ExprError> {
    match &ast.kind {
        Kind::Text(_) if matches!(relation, Relation::Equal | Relation::Unequal) => Ok(()),
        Kind::Text(_) => Err(ExprError::sort(place, "labels are equal or unequal, none is smaller")),
        _ => value(ast),
    }
}

/// Checks that no name outside `sum(pattern)` is a pattern.
fn no_pattern(ast: &Ast) -> Result<(), ExprError> {
    match ast.names().into_iter().find(|(name, _)| name.is_pattern()) {
        Some((name, span)) => {
            Err(ExprError::sort(span, format!("{name} is a pattern, which stands for several names"))
                .advise(format!("write sum({name}) for their sum; for a product put spaces round the *")))
        }
        None => Ok(()),
    }
}

#[cfg(test)]
mod tests {
    use super::{Equation, parse_condition, parse_equation, parse_expression};
    use crate::expr::{Ast, ExprError, Function, Kind, Operator, function};

    /// The tree written with all its parentheses.
    fn full(ast: &Ast) -> String {
        match &ast.kind {
            Kind::Negate(a) => format!("(-{})", full(a)),
            Kind::Not(a) => format!("(not {})", full(a)),
            Kind::Binary(o, a, b) => format!("({}{}{})", full(a), o.text(), full(b)),
            Kind::Compare(r, a, b) => format!("({}{}{})", full(a), r.text(), full(b)),
            Kind::And(a, b) => format!("({} and {})", full(a), full(b)),
            Kind::Or(a, b) => format!("({} or {})", full(a), full(b)),
            _ => ast.to_string(),
        }
    }

    #[test]
    fn precedence() {
        for (text, tree) in [
            ("1+2*3", "(1+(2*3))"),
            ("1-2-3", "((1-2)-3)"),
            ("8/4*2", "((8/4)*2)"),
            ("-2^2", "(-(2^2))"),
            ("2^-1", "(2^(-1))"),
            ("2^3^2", "(2^(3^2))"),
            ("2^-1^2", "(2^(-(1^2)))"),
            ("-a*b", "((-a)*b)"),
            ("a*-b", "(a*(-b))"),
            ("a--b", "(a-(-b))"),
            ("--a", "(-(-a))"),
            ("+a", "a"),
            ("(1+2)*3", "((1+2)*3)"),
            ("rate.kiln.middle:soak*2", "(rate.kiln.middle:soak*2)"),
            ("sum(share.*)*2", "(sum(share.*)*2)"),
            ("sum(*.x)", "sum(*.x)"),
        ] {
            assert_eq!(full(&parse_expression(text).unwrap()), tree, "{text}");
        }
        for (text, tree) in [
            ("a<b or c<d and not e=f", "((a<b) or ((c<d) and (not (e=f))))"),
            ("not a<b and c<d", "((not (a<b)) and (c<d))"),
            ("not not a<b", "(not (not (a<b)))"),
            ("(a<b or c<d) and e!='x'", "(((a<b) or (c<d)) and (e!='x'))"),
            ("a+1>=b*2", "((a+1)>=(b*2))"),
            ("(a+1)*2>b", "(((a+1)*2)>b)"),
            ("'x'=a", "('x'=a)"),
        ] {
            assert_eq!(full(&parse_condition(text).unwrap()), tree, "{text}");
        }
    }

    #[test]
    fn places_of_nodes() {
        let text = " (a + b) * log(c)";
        let ast = parse_expression(text).unwrap();
        let of = |a: &Ast| text[a.span.start..a.span.end].to_string();
        assert_eq!(of(&ast), "(a + b) * log(c)");
        let Kind::Binary(Operator::Multiply, a, b) = &ast.kind else { panic!("{ast:?}") };
        assert_eq!((of(a), of(b)), ("(a + b)".to_string(), "log(c)".to_string()));
    }

    #[test]
    fn every_function_is_called_with_as_many_arguments_as_it_takes() {
        for function::Entry(f, name, fewest, most, _) in function::TABLE {
            let pairs = *f == Function::LogMix;
            for count in 0..8 {
                let text = format!("{name}({})", vec!["x"; count].join(", "));
                let fits = (*fewest..=*most).contains(&count) && !(pairs && count % 2 == 1);
                assert_eq!(parse_expression(&text).is_ok(), fits, "{text}");
            }
        }
    }

    #[test]
    fn equations() {
        let shown = |text: &str| match parse_equation(text).unwrap() {
            Equation::Chain(sides) => sides.iter().map(Ast::to_string).collect::<Vec<_>>().join(" | "),
            Equation::Equal(pattern, _) => format!("equal {pattern}"),
        };
        assert_eq!(shown("a = 2 * b"), "a | 2 * b");
        assert_eq!(shown("a = b = 0"), "a | b | 0");
        assert_eq!(shown("equal(*.shape)"), "equal *.shape");
        assert_eq!(shown("*.shape = 1"), "*.shape | 1");
        assert_eq!(shown("*.mean = 2 * *.sd"), "*.mean | 2 * *.sd");
        assert_eq!(shown("equal = 3"), "equal | 3");
        assert_eq!(shown("if(a = b, 1, 2) = 3"), "if(a = b, 1, 2) | 3");
    }

    /// Every fault: the text, the place, words of the message, words of the advice.
    const FAULTS: &[(&str, &str, &str, &str)] = &[
        ("a ** b", "**", "** is not an operator", "a ^ b"),
        ("ln(a)", "ln", "no function is called ln", "log(x)"),
        ("lgama(a)", "lgama", "no function is called lgama", "nearest name: lgamma"),
        ("rate(a)", "rate", "no function is called rate", "*"),
        ("a + (b * (c + d)", "(", "never closed", "close it"),
        ("log(a", "(", "never closed", "close it"),
        ("log(", "(", "never closed", "close it"),
        ("a)", ")", "closes nothing", ""),
        ("2x", "2x", "missing between 2 and x", "2 * x"),
        ("2(a)", "2(", "* is missing", "2 * (...)"),
        ("(a)(b)", "(a)(", "* is missing", "(a) * (...)"),
        ("a b", "a b", "missing between a and b", "a * b"),
        ("log a", "log a", "in parentheses", "log(a)"),
        ("a.b(c)", "a.b", "no function", ""),
        ("a \u{2212} b", "\u{2212}", "typographic", "write -"),
        ("\u{2018}a\u{2019}", "\u{2018}", "typographic", "straight quotes"),
        ("5%", "%", "no meaning", "0.05"),
        ("a := b", ":", "colon", ""),
        ("", "", "empty", ""),
        ("  ", "", "empty", ""),
        ("a +", "", "text ends", ""),
        ("* b", "*", "missing before *", ""),
        ("a + * b", "*", "missing before *", ""),
        ("()", "()", "nothing stands", ""),
        ("(a, b)", ",", "comma", "point"),
        ("1,5", ",", "comma", "point"),
        ("log(a,)", ")", "missing before )", ""),
        ("log(a, b)", "log(a, b)", "log takes 1 argument, not 2", ""),
        ("bessel_i(x)", "bessel_i(x)", "bessel_i takes 2 arguments, not 1", ""),
        ("log_mix(a, b, c)", "log_mix(a, b, c)", "pairs", ""),
        ("min()", "min()", "1 or more arguments, not 0", ""),
        ("if(a < b, 1)", "if(a < b, 1)", "if takes 3 arguments, not 2", "condition"),
        ("if(a, 1, 2)", "a", "a condition belongs here", "a = 1"),
        ("a < b", "a < b", "where a number belongs", "if("),
        ("log(a < b)", "a < b", "where a number belongs", "if("),
        ("a = b", "a = b", "where a number belongs", "if("),
        ("'north' + 1", "'north'", "where a number belongs", "compared"),
        ("sum(a, b)", "a", "takes a pattern", "share.*"),
        ("sum(a.*, b)", ",", "one pattern", "share.*"),
        ("sum(a.* + b)", "+", "one pattern", "share.*"),
        ("sum(", "", "text ends", "share.*"),
        ("equal(*.a)", "equal", "stands alone", ""),
        ("share.* + 1", "share.*", "pattern", "sum(share.*)"),
        ("share.2", ".2", "digit", ".'2'"),
        ("share. north", ".", "missing after the dot", "without spaces"),
        ("a !b", "!", "no meaning", "!="),
        ("k\u{f6}ln + 1", "k\u{f6}ln", "must be quoted", "\"k\u{f6}ln\""),
        ("2 * not a", "not", "before a condition", ""),
        ("a $ b", "$", "no meaning", ""),
        ("a \u{0} b", "\u{0}", "invisible", ""),
        ("[a]", "[", "no meaning", "( )"),
    ];

    fn check(text: &str, place: &str, message: &str, advice: &str, error: ExprError) {
        assert_eq!(&text[error.span.start..error.span.end], place, "{text}: {error:?}");
        assert!(error.to_string().contains(message), "{text}: {error:?}");
        let given = error.advice.unwrap_or_default();
        assert!(given.contains(advice), "{text}: {given}");
    }

    #[test]
    fn faults_say_where_and_what_to_do() {
        for (text, place, message, advice) in FAULTS {
            check(text, place, message, advice, parse_expression(text).unwrap_err());
        }
        let at = |text: &str| parse_expression(text).unwrap_err().span.start;
        assert_eq!(at("a + (b * (c + d)"), 4, "the outer one is open");
        assert_eq!(at("a + (b * (c + d"), 9, "the inner one is open");
    }

    #[test]
    fn faults_of_conditions() {
        for (text, place, message, advice) in [
            ("a == b", "==", "not a relation", "one ="),
            ("a => b", "=>", "not a relation", ">="),
            ("a <> b", "<>", "not a relation", "!="),
            ("a && b", "&&", "not an operator", "and"),
            ("a || b", "||", "not an operator", "or"),
            ("a < b < c", "<", "two sides", "and"),
            ("a + 1", "a + 1", "a condition belongs here", "compare"),
            ("a", "a", "a condition belongs here", "a = 1"),
            ("a < b and c", "c", "a condition belongs here", "c = 1"),
            ("kiln < 'north'", "<", "labels", ""),
            ("(a < b) = c", "(a < b)", "where a number belongs", ""),
            ("not a", "a", "a condition belongs here", ""),
            ("and a < b", "and", "missing before and", ""),
            ("", "", "a condition should stand", ""),
        ] {
            check(text, place, message, advice, parse_condition(text).unwrap_err());
        }
    }

    #[test]
    fn faults_of_equations() {
        for (text, place, message, advice) in [
            ("a <= b", "<=", "inequalities", "range"),
            ("a > b", ">", "inequalities", "range"),
            ("a != b", "!=", "not what differs", ""),
            ("a + b", "a + b", "left = right", ""),
            ("a = b and c = d", "and", "one equation", "chain"),
            ("a =", "", "text ends", ""),
            ("= a", "=", "missing before =", ""),
            ("a = = b", "=", "missing before =", ""),
            ("a == b", "==", "not a relation", "one ="),
            ("equal(a)", "a", "a pattern", "a = b"),
            ("equal(a, b)", "a", "a pattern", "a = b"),
            ("equal(*.a", "(", "never closed", ""),
            ("equal(*.a) = 1", "=", "stands alone", ""),
            ("1 + equal(*.a) = 1", "equal", "stands alone", ""),
            ("kiln = 'north'", "'north'", "where a number belongs", "compared"),
            ("(a = b) = c", "(a = b)", "where a number belongs", ""),
            ("a = b)", ")", "closes nothing", ""),
            ("name: a = b", ":", "colon", ""),
            ("", "", "empty", ""),
        ] {
            check(text, place, message, advice, parse_equation(text).unwrap_err());
        }
    }

    #[test]
    fn pathological_texts_are_errors_not_overflows() {
        let deep = "(".repeat(10_000) + "a" + &")".repeat(10_000);
        let minus = "-".repeat(10_000) + "a";
        let power = vec!["a"; 10_000].join("^");
        let sum = vec!["a"; 10_000].join(" + ");
        let calls = "log(".repeat(10_000);
        let not = "not ".repeat(10_000) + "a < b";
        for text in [deep, minus, power, sum, calls, not] {
            let error = parse_expression(&text).unwrap_err();
            assert!(error.to_string().contains("nested too deeply"), "{error}");
        }
        // What a program may write is taken: 900 terms, 90 parentheses.
        let sum = parse_expression(&vec!["a"; 900].join(" + ")).unwrap();
        assert_eq!(parse_expression(&sum.to_string()).unwrap(), sum);
        parse_expression(&("(a + ".repeat(90) + "a" + &")".repeat(90))).unwrap();
    }
}
