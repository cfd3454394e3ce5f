//! Trees back to text: faithful (the text parses to the same tree) and with no parenthesis that is not needed.

use std::fmt;

use super::{Ast, Kind, Operator};

/// How tightly the parts of a text bind, from loosest to tightest.
pub(super) mod binding {
    pub const OR: u8 = 1;
    pub const AND: u8 = 2;
    pub const NOT: u8 = 3;
    pub const COMPARE: u8 = 4;
    pub const SUM: u8 = 5;
    pub const PRODUCT: u8 = 6;
    pub const UNARY: u8 = 7;
    pub const POWER: u8 = 8;
    pub const ATOM: u8 = 9;
}

impl Operator {
    /// How tightly the operator binds, and what its left and right operand must bind to stand without parentheses.
    pub(super) fn binding(self) -> (u8, u8, u8) {
        match self {
            Operator::Add | Operator::Subtract => (binding::SUM, binding::SUM, binding::PRODUCT),
            Operator::Multiply | Operator::Divide => (binding::PRODUCT, binding::PRODUCT, binding::UNARY),
            Operator::Power => (binding::POWER, binding::ATOM, binding::UNARY),
        }
    }
}

fn strength(ast: &Ast) -> u8 {
    match &ast.kind {
        Kind::Or(..) => binding::OR,
        Kind::And(..) => binding::AND,
        Kind::Not(_) => binding::NOT,
        Kind::Compare(..) => binding::COMPARE,
        Kind::Binary(operator, ..) => operator.binding().0,
        Kind::Negate(_) => binding::UNARY,
        // A negative number is written with a minus (no text parses to one, but a program may build one).
        Kind::Number(value) if value.is_sign_negative() => binding::UNARY,
        _ => binding::ATOM,
    }
}

/// An operand, in parentheses if it binds less than `least`.
struct Operand<'a>(&'a Ast, u8);

impl fmt::Display for Operand<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if strength(self.0) < self.1 { write!(f, "({})", self.0) } else { write!(f, "{}", self.0) }
    }
}

fn number(value: f64, f: &mut fmt::Formatter<'_>) -> fmt::Result {
    if value == std::f64::consts::PI {
        f.write_str("pi")
    } else if value != 0.0 && !(1e-5..1e16).contains(&value.abs()) {
        write!(f, "{value:e}")
    } else {
        write!(f, "{value}")
    }
}

impl fmt::Display for Ast {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.kind {
            Kind::Number(value) => number(*value, f),
            Kind::Text(text) => write!(f, "'{}'", text.replace('\'', "''")),
            Kind::Name(name) => write!(f, "{name}"),
            Kind::Negate(a) => write!(f, "-{}", Operand(a, binding::UNARY)),
            Kind::Binary(operator, a, b) => {
                let (_, left, right) = operator.binding();
                let (a, b) = (Operand(a, left), Operand(b, right));
                if *operator == Operator::Power {
                    write!(f, "{a}^{b}")
                } else {
                    write!(f, "{a} {} {b}", operator.text())
                }
            }
            Kind::Call(function, arguments) => {
                write!(f, "{}(", function.entry().1)?;
                for (i, argument) in arguments.iter().enumerate() {
                    write!(f, "{}{argument}", if i > 0 { ", " } else { "" })?;
                }
                f.write_str(")")
            }
            Kind::Sum(pattern) => write!(f, "sum({pattern})"),
            Kind::If(condition, a, b) => write!(f, "if({condition}, {a}, {b})"),
            Kind::Compare(relation, a, b) => {
                write!(f, "{} {} {}", Operand(a, binding::SUM), relation.text(), Operand(b, binding::SUM))
            }
            Kind::And(a, b) => write!(f, "{} and {}", Operand(a, binding::AND), Operand(b, binding::NOT)),
            Kind::Or(a, b) => write!(f, "{} or {}", Operand(a, binding::OR), Operand(b, binding::AND)),
            Kind::Not(a) => write!(f, "not {}", Operand(a, binding::NOT)),
        }
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::{Just, Strategy, any, prop, prop_oneof};
    use proptest::{prop_assert_eq, proptest};

    use crate::expr::function::TABLE;
    use crate::expr::{Ast, Kind, Name, Operator, Relation, Span, parse_condition, parse_expression};

    #[test]
    fn parentheses_only_where_needed() {
        for (written, shown) in [
            ("((a))", "a"),
            ("(a + b) + c", "a + b + c"),
            ("a + (b + c)", "a + (b + c)"),
            ("a - (b - c)", "a - (b - c)"),
            ("(a * b) / c", "a * b / c"),
            ("a / (b * c)", "a / (b * c)"),
            ("-(2^2)", "-2^2"),
            ("(-2)^2", "(-2)^2"),
            ("2^(3^2)", "2^3^2"),
            ("(2^3)^2", "(2^3)^2"),
            ("2^(-1)", "2^-1"),
            ("(-a) * (-b)", "-a * -b"),
            ("-(a * b)", "-(a * b)"),
            ("a - (-b)", "a - -b"),
            ("log ( a )", "log(a)"),
            ("pi", "pi"),
            ("1e-9 * 1e20", "1e-9 * 1e20"),
            ("0.5+1.250", "0.5 + 1.25"),
            ("if((a<b) and (not (c = 'x')),1,2)", "if(a < b and not c = 'x', 1, 2)"),
            ("if((a<b or a>c) and b!=c,1,2)", "if((a < b or a > c) and b != c, 1, 2)"),
            ("\"soak time\" + rate.'soak time'", "\"soak time\" + rate.'soak time'"),
        ] {
            assert_eq!(parse_expression(written).unwrap().to_string(), shown);
        }
    }

    #[test]
    fn numbers_a_program_built_keep_their_sign() {
        let at = Span::default();
        let minus = Ast::number(-2.0, at);
        let power = Ast::binary(Operator::Power, minus.clone(), Ast::number(2.0, at));
        assert_eq!(power.to_string(), "(-2)^2");
        assert_eq!(Ast::binary(Operator::Subtract, minus.clone(), minus).to_string(), "-2 - -2");
    }

    fn leaf() -> impl Strategy<Value = Kind> {
        let piece = || {
            prop_oneof!["[a-d]", "[a-z_ .'\"\\\\\n\u{e9}0-9*:]{0,4}", Just("pi".to_string()), Just("and".to_string())]
        };
        let name = prop::collection::vec((piece(), any::<bool>()), 1..4).prop_map(|pieces| {
            let mut out = Name::single(pieces[0].0.clone());
            for (text, colon) in &pieces[1..] {
                out = if *colon { out.colon(text) } else { out.dot(text) };
            }
            out
        });
        prop_oneof![
            prop_oneof![0.0..10.0, any::<f64>().prop_map(f64::abs), Just(std::f64::consts::PI)]
                .prop_filter("finite", |x: &f64| x.is_finite())
                .prop_map(Kind::Number),
            name.clone().prop_map(Kind::Name),
            (name, any::<bool>()).prop_map(|(mut n, head)| {
                if head {
                    n.pieces[0].text = None;
                    n = n.dot("x");
                } else {
                    n.pieces.push(crate::expr::Piece { joiner: crate::expr::Joiner::Dot, text: None });
                }
                Kind::Sum(n)
            }),
        ]
    }

    fn at(kind: Kind) -> Ast {
        Ast { kind, span: Span::default() }
    }

    fn boxed(ast: Ast) -> Box<Ast> {
        Box::new(ast)
    }

    /// A value or a condition over values.
    fn grow(value: impl Strategy<Value = Ast> + Clone + 'static) -> impl Strategy<Value = Ast> {
        let relations =
            [Relation::Less, Relation::AtMost, Relation::More, Relation::AtLeast, Relation::Equal, Relation::Unequal];
        let operators = [Operator::Add, Operator::Subtract, Operator::Multiply, Operator::Divide, Operator::Power];
        let label = (value.clone(), "[a-z ']{0,3}", any::<bool>()).prop_map(|(v, label, not)| {
            let relation = if not { Relation::Unequal } else { Relation::Equal };
            at(Kind::Compare(relation, boxed(v), boxed(at(Kind::Text(label)))))
        });
        let compare = (value.clone(), prop::sample::select(relations.to_vec()), value.clone())
            .prop_map(|(a, r, b)| at(Kind::Compare(r, boxed(a), boxed(b))));
        let condition = prop_oneof![label, compare].prop_recursive(3, 8, 2, |inner| {
            prop_oneof![
                (inner.clone(), inner.clone()).prop_map(|(a, b)| at(Kind::And(boxed(a), boxed(b)))),
                (inner.clone(), inner.clone()).prop_map(|(a, b)| at(Kind::Or(boxed(a), boxed(b)))),
                inner.prop_map(|a| at(Kind::Not(boxed(a)))),
            ]
        });
        prop_oneof![
            value.clone().prop_map(|a| at(Kind::Negate(boxed(a)))),
            (prop::sample::select(operators.to_vec()), value.clone(), value.clone())
                .prop_map(|(o, a, b)| at(Kind::Binary(o, boxed(a), boxed(b)))),
            (0..TABLE.len(), prop::collection::vec(value.clone(), 8)).prop_map(|(i, arguments)| {
                let entry = &TABLE[i];
                let count = if entry.3 > 8 { entry.2.max(4) } else { entry.3 };
                at(Kind::Call(entry.0, arguments[..count].to_vec()))
            }),
            (condition, value.clone(), value).prop_map(|(c, a, b)| at(Kind::If(boxed(c), boxed(a), boxed(b)))),
        ]
    }

    fn tree() -> impl Strategy<Value = Ast> {
        leaf().prop_map(at).prop_recursive(5, 40, 6, |inner| grow(inner.boxed()).boxed())
    }

    /// The tree with all places forgotten.
    fn bare(ast: &Ast) -> Ast {
        let below = |a: &Ast| Box::new(bare(a));
        at(match &ast.kind {
            Kind::Negate(a) => Kind::Negate(below(a)),
            Kind::Not(a) => Kind::Not(below(a)),
            Kind::Binary(o, a, b) => Kind::Binary(*o, below(a), below(b)),
            Kind::Compare(r, a, b) => Kind::Compare(*r, below(a), below(b)),
            Kind::And(a, b) => Kind::And(below(a), below(b)),
            Kind::Or(a, b) => Kind::Or(below(a), below(b)),
            Kind::If(c, a, b) => Kind::If(below(c), below(a), below(b)),
            Kind::Call(f, arguments) => Kind::Call(*f, arguments.iter().map(bare).collect()),
            leaf => leaf.clone(),
        })
    }

    proptest! {
        #[test]
        fn a_printed_tree_parses_to_itself(ast in tree()) {
            let text = ast.to_string();
            let again = parse_expression(&text);
            prop_assert_eq!(again.map(|a| bare(&a)), Ok(ast), "{}", text);
        }

        #[test]
        fn a_printed_condition_parses_to_itself(ast in grow(tree().boxed())) {
            if let Kind::If(condition, ..) = ast.kind {
                let text = condition.to_string();
                prop_assert_eq!(parse_condition(&text).map(|a| bare(&a)), Ok(*condition), "{}", text);
            }
        }

        #[test]
        fn no_text_makes_the_parser_panic(text in "[a-c0-9 .*:'\"()^+<>=,!~\u{e9}-]{0,30}") {
            let _ = parse_expression(&text);
            let _ = parse_condition(&text);
            let _ = crate::expr::parse_equation(&text);
        }
    }
}
