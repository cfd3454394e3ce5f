//! The tree a text parses to. Every node keeps the bytes of the text it came from.

use super::{ExprError, Function, Name};

/// Bytes `start..end` of the text that was parsed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Span {
    /// First byte.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
}

/// An expression or a condition.
#[derive(Debug, Clone, PartialEq)]
pub struct Ast {
    /// What it is.
    pub kind: Kind,
    /// Where it stands.
    pub span: Span,
}

/// The kinds of node.
#[derive(Debug, Clone, PartialEq)]
pub enum Kind {
    /// A number; `pi` is one too.
    Number(f64),
    /// A text in single quotes standing alone: a label in a comparison with a category.
    Text(String),
    /// A parameter, column, let or quantity; may hold `*` where a pattern is allowed (head of a restriction's names).
    Name(Name),
    /// Unary minus.
    Negate(Box<Ast>),
    /// `+ - * / ^`.
    Binary(Operator, Box<Ast>, Box<Ast>),
    /// A function of the table in [`Function`].
    Call(Function, Vec<Ast>),
    /// `sum(pattern)`.
    Sum(Name),
    /// `if(condition, a, b)`.
    If(Box<Ast>, Box<Ast>, Box<Ast>),
    /// A comparison, true or false.
    Compare(Relation, Box<Ast>, Box<Ast>),
    /// `a and b`.
    And(Box<Ast>, Box<Ast>),
    /// `a or b`.
    Or(Box<Ast>, Box<Ast>),
    /// `not a`.
    Not(Box<Ast>),
}

/// Arithmetic operators.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Operator {
    /// `+`
    Add,
    /// `-`
    Subtract,
    /// `*`
    Multiply,
    /// `/`
    Divide,
    /// `^`
    Power,
}

/// Comparison relations.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Relation {
    /// `<`
    Less,
    /// `<=`
    AtMost,
    /// `>`
    More,
    /// `>=`
    AtLeast,
    /// `=`
    Equal,
    /// `!=`
    Unequal,
}

impl Ast {
    /// A number, at a place.
    pub fn number(value: f64, span: Span) -> Ast {
        Ast { kind: Kind::Number(value), span }
    }

    /// A name, at a place.
    pub fn name(name: Name, span: Span) -> Ast {
        Ast { kind: Kind::Name(name), span }
    }

    /// Two operands joined; the place is that of both.
    pub fn binary(operator: Operator, left: Ast, right: Ast) -> Ast {
        let span = left.span.to(right.span);
        Ast { kind: Kind::Binary(operator, Box::new(left), Box::new(right)), span }
    }

    /// Whether this is true or false rather than a number.
    pub fn is_condition(&self) -> bool {
        matches!(self.kind, Kind::Compare(..) | Kind::And(..) | Kind::Or(..) | Kind::Not(..))
    }

    /// The nodes right below this one, left to right.
    pub fn children(&self) -> Vec<&Ast> {
        match &self.kind {
            Kind::Number(_) | Kind::Text(_) | Kind::Name(_) | Kind::Sum(_) => Vec::new(),
            Kind::Negate(a) | Kind::Not(a) => vec![a],
            Kind::Binary(_, a, b) | Kind::Compare(_, a, b) | Kind::And(a, b) | Kind::Or(a, b) => vec![a, b],
            Kind::If(condition, a, b) => vec![condition, a, b],
            Kind::Call(_, arguments) => arguments.iter().collect(),
        }
    }

    /// Every name in it with its place, left to right, repeated as often as it stands there; patterns of
    /// `sum(pattern)` are not among them.
    pub fn names(&self) -> Vec<(Name, Span)> {
        let mut out = Vec::new();
        self.visit(&mut |node| {
            if let Kind::Name(name) = &node.kind {
                out.push((name.clone(), node.span));
            }
        });
        out
    }

    /// The pattern of every `sum(pattern)` with the place of the call, left to right.
    pub fn sums(&self) -> Vec<(Name, Span)> {
        let mut out = Vec::new();
        self.visit(&mut |node| {
            if let Kind::Sum(pattern) = &node.kind {
                out.push((pattern.clone(), node.span));
            }
        });
        out
    }

    /// Calls `see` on every node, each before those below it, left to right.
    pub fn visit(&self, see: &mut dyn FnMut(&Ast)) {
        see(self);
        for child in self.children() {
            child.visit(see);
        }
    }

    /// A copy with every name changed; patterns of `sum(pattern)` stay.
    pub fn map_names(&self, change: &mut dyn FnMut(&Name) -> Name) -> Ast {
        let mut leaf = |node: &Ast| match &node.kind {
            Kind::Name(name) => Ok(Some(Kind::Name(change(name)))),
            _ => Ok(None),
        };
        // The closure never fails, so neither does the walk.
        self.replace(&mut leaf).unwrap_or_else(|_: ExprError| self.clone())
    }

    /// A copy in which each name, sum, number or text for which `leaf` gives a kind has become that kind, at its place.
    ///
    /// # Errors
    /// The first error of `leaf`, left to right.
    pub fn replace(&self, leaf: &mut dyn FnMut(&Ast) -> Result<Option<Kind>, ExprError>) -> Result<Ast, ExprError> {
        let mut below = |a: &Ast| a.replace(leaf).map(Box::new);
        let kind = match &self.kind {
            Kind::Number(_) | Kind::Text(_) | Kind::Name(_) | Kind::Sum(_) => {
                leaf(self)?.unwrap_or_else(|| self.kind.clone())
            }
            Kind::Negate(a) => Kind::Negate(below(a)?),
            Kind::Not(a) => Kind::Not(below(a)?),
            Kind::Binary(operator, a, b) => Kind::Binary(*operator, below(a)?, below(b)?),
            Kind::Compare(relation, a, b) => Kind::Compare(*relation, below(a)?, below(b)?),
            Kind::And(a, b) => Kind::And(below(a)?, below(b)?),
            Kind::Or(a, b) => Kind::Or(below(a)?, below(b)?),
            Kind::If(condition, a, b) => Kind::If(below(condition)?, below(a)?, below(b)?),
            Kind::Call(function, arguments) => {
                Kind::Call(*function, arguments.iter().map(|a| a.replace(leaf)).collect::<Result<_, _>>()?)
            }
        };
        Ok(Ast { kind, span: self.span })
    }
}

impl Span {
    /// From the start of this to the end of the other.
    pub fn to(self, end: Span) -> Span {
        Span { start: self.start, end: end.end }
    }
}

impl Operator {
    /// As written.
    pub fn text(self) -> &'static str {
        match self {
            Operator::Add => "+",
            Operator::Subtract => "-",
            Operator::Multiply => "*",
            Operator::Divide => "/",
            Operator::Power => "^",
        }
    }
}

impl Relation {
    /// As written.
    pub fn text(self) -> &'static str {
        match self {
            Relation::Less => "<",
            Relation::AtMost => "<=",
            Relation::More => ">",
            Relation::AtLeast => ">=",
            Relation::Equal => "=",
            Relation::Unequal => "!=",
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::expr::{Kind, Name, parse_expression};

    #[test]
    fn names_are_listed_in_order_with_their_places() {
        let text = "a.x * log(b) + if(kiln = 'north', a.x, 0) - sum(share.*)";
        let ast = parse_expression(text).unwrap();
        let names: Vec<&str> = ast.names().into_iter().map(|(_, s)| &text[s.start..s.end]).collect();
        assert_eq!(names, ["a.x", "b", "kiln", "a.x"]);
        let sums: Vec<&str> = ast.sums().into_iter().map(|(_, s)| &text[s.start..s.end]).collect();
        assert_eq!(sums, ["sum(share.*)"]);
    }

    #[test]
    fn names_are_changed_everywhere_but_in_sums() {
        let ast = parse_expression("a + exp(-a^b) + if(not a < b, a, 1) + sum(a.*)").unwrap();
        let changed = ast.map_names(&mut |n| if *n == Name::single("a") { Name::of(&["c", "a"]) } else { n.clone() });
        assert_eq!(changed.to_string(), "c.a + exp(-c.a^b) + if(not c.a < b, c.a, 1) + sum(a.*)");
    }

    #[test]
    fn leaves_are_replaced_at_their_place() {
        let ast = parse_expression("a + b").unwrap();
        let known =
            ast.replace(&mut |n| Ok((n.kind == Kind::Name(Name::single("b"))).then_some(Kind::Number(2.0)))).unwrap();
        assert_eq!(known.to_string(), "a + 2");
        assert_eq!(known.span, ast.span);
    }
}
