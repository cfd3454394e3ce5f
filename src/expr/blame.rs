//! What is said of a text that breaks the grammar: the place, the fault, and what was probably meant.

use super::climb::Parser;
use super::token::{Lexeme, Mark};
use super::{ExprError, Fault, Function, Span, function, nearest};

impl Parser<'_> {
    pub(super) fn unclosed(&self) -> Option<ExprError> {
        let place = *self.open.last()?;
        Some(ExprError::syntax(place, "the parenthesis opened here is never closed").advise("close it with )"))
    }

    /// The error for an operand that follows another (`start` is where that begins) without an operator between.
    pub(super) fn side_by_side(&self, start: Span) -> Option<ExprError> {
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
    pub(super) fn operand_missing(&self) -> ExprError {
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

    pub(super) fn stray_comma(&self, span: Span) -> ExprError {
        ExprError::syntax(span, "a comma separates the arguments of a function")
            .advise("the decimal sign of a number is a point: 0.5")
    }
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

/// The error for a call of a function there is not.
pub(super) fn no_function(word: &str, place: Span) -> ExprError {
    let elsewhere =
        ELSEWHERE.iter().find(|(name, _)| *name == word.to_lowercase()).map(|(_, advice)| (*advice).to_string());
    let names = function::TABLE.iter().map(|e| e.1).chain(["sum", "if", "equal"]);
    let advice = elsewhere
        .or_else(|| nearest(word, names).map(|n| format!("nearest name: {n}")))
        .or_else(|| Some("for a product write a * before the parenthesis".to_string()));
    ExprError { span: place, fault: Fault::Unknown("function", word.to_string()), advice }
}

/// The error for a character that has no meaning, with what was probably meant.
pub(super) fn stray(c: char, span: Span) -> ExprError {
    let typographic = |write: &str| {
        ExprError::syntax(span, format!("{c} (U+{:04X}) is a typographic sign", c as u32))
            .advise(format!("write {write}"))
    };
    match c {
        '\u{2212}' | '\u{2012}'..='\u{2015}' | '\u{2010}' | '\u{2011}' => typographic("-"),
        '\u{d7}' | '\u{b7}' | '\u{22c5}' | '\u{2217}' => typographic("*"),
        '\u{f7}' | '\u{2044}' | '\u{2215}' => typographic("/"),
        '\u{2264}' => typographic("<="),
        '\u{2265}' => typographic(">="),
        '\u{2260}' => typographic("!="),
        '\u{2018}' | '\u{2019}' | '\u{201a}' | '\u{2032}' => typographic("straight quotes '"),
        '\u{201c}' | '\u{201d}' | '\u{201e}' | '\u{2033}' => typographic("straight quotes \""),
        '\u{b2}' => typographic("^2"),
        '\u{b3}' => typographic("^3"),
        '\u{221a}' => typographic("sqrt(...)"),
        '\u{3c0}' => ExprError::syntax(span, "names are in A-Z").advise("the number is written pi"),
        '%' => ExprError::syntax(span, "% has no meaning here").advise("five per cent is written 0.05"),
        '!' => ExprError::syntax(span, "! has no meaning here")
            .advise("denial is written not, unequal !=, a factorial exp(lgamma(n + 1))"),
        '&' => ExprError::syntax(span, "& has no meaning here").advise("write and"),
        '|' => ExprError::syntax(span, "| has no meaning here").advise("write or, or abs(x) for an absolute value"),
        '[' | ']' | '{' | '}' => {
            ExprError::syntax(span, format!("{c} has no meaning here")).advise("parentheses are round: ( )")
        }
        ':' => ExprError::syntax(span, "a colon stands between two pieces of a name, without spaces")
            .advise("a product of terms is written rate.kiln.middle:soak, a ratio a / b"),
        '.' => ExprError::syntax(span, "a dot stands in a number or between two pieces of a name, without spaces"),
        '#' => ExprError::syntax(span, "# has no meaning here").advise("comments stand outside the quoted expression"),
        '~' => ExprError::syntax(span, "~ has no meaning here").advise("an equation is written left = right"),
        c if c.is_control() => ExprError::syntax(span, format!("an invisible sign (U+{:04X}) stands here", c as u32)),
        c => ExprError::syntax(span, format!("{c} has no meaning here")),
    }
}
