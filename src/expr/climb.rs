//! Precedence climbing: tokens to a tree.

use super::blame::no_function;
use super::lexer;
use super::parse::Equation;
use super::print::binding;
use super::sorts::{comparable, condition, if_call, plain_call, value};
use super::token::{Lexeme, Mark, Token};
use super::{Ast, ExprError, Function, Kind, Name, Operator, Relation, Span};

/// How deep calls of the parser may nest, and how deep a tree may grow (a sum of n terms is n deep): far beyond what
/// anyone writes, and small enough for the walks over the tree in a thread's stack of 2 MB.
const NESTING: usize = 400;
const DEPTH: usize = 1000;

/// A tree with its depth.
pub(super) struct Grown {
    pub(super) ast: Ast,
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

/// The tokens of a text and how far they were read.
pub(super) struct Parser<'a> {
    pub(super) text: &'a str,
    pub(super) tokens: Vec<Token>,
    pub(super) at: usize,
    nesting: usize,
    /// Parentheses open here, with what each belongs to.
    pub(super) open: Vec<Span>,
}

impl<'a> Parser<'a> {
    pub(super) fn new(text: &'a str, what: &str) -> Result<Self, ExprError> {
        let tokens = lexer::tokens(text)?;
        if tokens.len() == 1 {
            return Err(ExprError::syntax(tokens[0].span, format!("the text is empty where {what} should stand")));
        }
        Ok(Parser { text, tokens, at: 0, nesting: 0, open: Vec::new() })
    }

    pub(super) fn token(&self) -> &Token {
        &self.tokens[self.at]
    }

    /// The token, stepping over it (never over the end).
    fn next(&mut self) -> Token {
        let token = self.token().clone();
        self.at = (self.at + 1).min(self.tokens.len() - 1);
        token
    }

    pub(super) fn word(&self) -> Option<&str> {
        match &self.token().kind {
            Lexeme::Word(word) => Some(word),
            _ => None,
        }
    }

    pub(super) fn take(&mut self, mark: Mark) -> bool {
        let found = self.token().kind == Lexeme::Mark(mark);
        if found {
            self.next();
        }
        found
    }

    pub(super) fn written(&self, span: Span) -> &str {
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
    pub(super) fn climb(&mut self, least: u8) -> Result<Grown, ExprError> {
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

    pub(super) fn equal(&mut self) -> Result<Equation, ExprError> {
        let start = self.next().span;
        let (pattern, end) = self.pattern("equal")?;
        if self.token().kind != Lexeme::End {
            return Err(ExprError::syntax(self.token().span, "equal(pattern) is a whole restriction and stands alone"));
        }
        Ok(Equation::Equal(pattern, start.to(end)))
    }

    /// One side of an equation.
    pub(super) fn side(&mut self) -> Result<Ast, ExprError> {
        let ast = self.climb(binding::SUM)?.ast;
        value(&ast)?;
        Ok(ast)
    }

    /// Checks that the text ends here.
    pub(super) fn finish(&self, what: &str) -> Result<(), ExprError> {
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
