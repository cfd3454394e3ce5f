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
//! standing alone is a label, one in double quotes a name. Functions are those of the table in [`TABLE`](super::function::TABLE).
//!
//! A `*` that follows a dot, or that begins an operand and is followed by a dot, belongs to a pattern; any other
//! multiplies. Patterns stand in `sum` and `equal`, and in the names of an equation.

use super::climb::Parser;
use super::print::binding;
use super::sorts::{condition, no_pattern, value};
use super::token::{Lexeme, Mark};
use super::{Ast, ExprError, Name, Span};

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
        ("2 * \u{3c0}", "\u{3c0}", "A-Z", "pi"),
        ("x\u{b2}", "\u{b2}", "typographic", "^2"),
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
