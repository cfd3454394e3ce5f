//! One text to its scalar equations: chains, `equal(pattern)`, and a `*` that stands for each level in turn.

use super::vocabulary::Vocabulary;
use crate::expr::name::quoted;
use crate::expr::{Ast, Equation, ExprError, Kind, Name, Span, parse_equation};

/// One scalar equation, `left = right`.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Link {
    /// The name of the whole, with the level and the number of the link where there are several.
    pub name: String,
    pub left: Ast,
    pub right: Ast,
}

/// The equations a text stands for. `base` is the name of the whole as it is written.
///
/// # Errors
/// A fault of the grammar; a name or pattern that fits nothing; a `*` that cannot be told apart.
pub(super) fn expand(base: &str, text: &str, vocabulary: &Vocabulary) -> Result<Vec<Link>, ExprError> {
    match parse_equation(text)? {
        Equation::Equal(pattern, span) => equal(base, &pattern, span, vocabulary),
        Equation::Chain(sides) => {
            let patterns: Vec<(Name, Span)> =
                sides.iter().flat_map(Ast::names).filter(|(name, _)| name.is_pattern()).collect();
            if patterns.is_empty() {
                return chain(base, &sides, vocabulary);
            }
            let mut out = Vec::new();
            for level in levels(&patterns, vocabulary)? {
                let here: Vec<Ast> =
                    sides.iter().map(|side| at_level(side, &level, vocabulary)).collect::<Result<_, _>>()?;
                out.extend(chain(&format!("{base}.{}", quoted(&level)), &here, vocabulary)?);
            }
            Ok(out)
        }
    }
}

/// Neighbours in pairs, numbered if there are several.
fn chain(base: &str, sides: &[Ast], vocabulary: &Vocabulary) -> Result<Vec<Link>, ExprError> {
    for side in sides {
        for (name, span) in side.names() {
            if !vocabulary.has(&name) {
                return Err(vocabulary.unknown(&name, span));
            }
        }
        vocabulary.parameters_in(side)?;
    }
    Ok(numbered(base, sides.windows(2).map(|w| (w[0].clone(), w[1].clone())).collect()))
}

fn numbered(base: &str, pairs: Vec<(Ast, Ast)>) -> Vec<Link> {
    let several = pairs.len() > 1;
    let name = |i: usize| if several { format!("{base}.{}", i + 1) } else { base.to_string() };
    pairs.into_iter().enumerate().map(|(i, (left, right))| Link { name: name(i), left, right }).collect()
}

/// Each that fits the pattern equal to the first.
fn equal(base: &str, pattern: &Name, span: Span, vocabulary: &Vocabulary) -> Result<Vec<Link>, ExprError> {
    let found = vocabulary.matching(pattern, span)?;
    if found.len() < 2 {
        let message = format!("only {} fits {pattern}, and one alone equals nothing", found[0]);
        return Err(ExprError::sort(span, message));
    }
    let name = |n: &Name| Ast::name(n.clone(), span);
    Ok(numbered(base, found[1..].iter().map(|n| (name(n), name(found[0]))).collect()))
}

/// What the `*` of the patterns can stand for, in the order of the parameters.
fn levels(patterns: &[(Name, Span)], vocabulary: &Vocabulary) -> Result<Vec<String>, ExprError> {
    for (pattern, span) in patterns {
        if pattern.stars() > 1 {
            return Err(ExprError::sort(*span, format!("{pattern} has more than one *, and each would be a level"))
                .advise("one * a name writes the restriction once a level; sum(...) takes several"));
        }
        vocabulary.matching(pattern, *span)?;
    }
    let mut out: Vec<String> = Vec::new();
    for name in vocabulary.names() {
        for level in patterns.iter().filter_map(|(pattern, _)| name.star_of(pattern)) {
            if !out.iter().any(|l| l == level) {
                out.push(level.to_string());
            }
        }
    }
    Ok(out)
}

/// The side with its patterns written out for one level.
fn at_level(side: &Ast, level: &str, vocabulary: &Vocabulary) -> Result<Ast, ExprError> {
    side.replace(&mut |node| match &node.kind {
        Kind::Name(pattern) if pattern.is_pattern() => {
            let name = pattern.substitute(level);
            if vocabulary.has(&name) {
                return Ok(Some(Kind::Name(name)));
            }
            let error = vocabulary.unknown(&name, node.span);
            let level = quoted(level);
            let near = error.advice.as_ref().map(|a| format!("; {a}")).unwrap_or_default();
            Err(error.advise(format!("* stands for {level} here, since another name has it{near}")))
        }
        _ => Ok(None),
    })
}

#[cfg(test)]
mod tests {
    use super::expand;
    use crate::restriction::vocabulary::Vocabulary;

    fn vocabulary() -> Vocabulary {
        let free = [
            "acme.shape",
            "acme.scale",
            "bolt.shape",
            "bolt.scale",
            "'2'.scale",
            "share.north.pass",
            "share.south.pass",
            "rate.intercept",
            "rate.soak",
            "rate.kiln.middle",
            "rate.kiln.south",
            "rate.kiln.middle:soak",
            "rate.kiln.south:soak",
        ];
        let free: Vec<String> = free.iter().map(|n| (*n).to_string()).collect();
        Vocabulary::new(&free, &[("'2'.shape".to_string(), 1.5)]).unwrap()
    }

    fn shown(text: &str) -> Vec<String> {
        let links = expand("same", text, &vocabulary()).unwrap();
        links.iter().map(|l| format!("{}: {} = {}", l.name, l.left, l.right)).collect()
    }

    #[test]
    fn one_link_keeps_the_name_and_several_are_numbered() {
        assert_eq!(shown("rate.soak = 2 * rate.intercept"), ["same: rate.soak = 2 * rate.intercept"]);
        assert_eq!(
            shown("rate.kiln.middle:soak = rate.kiln.south:soak = 0"),
            ["same.1: rate.kiln.middle:soak = rate.kiln.south:soak", "same.2: rate.kiln.south:soak = 0"]
        );
    }

    #[test]
    fn equal_sets_each_equal_to_the_first() {
        assert_eq!(shown("equal(share.*.pass)"), ["same: share.south.pass = share.north.pass"]);
        assert_eq!(shown("equal(*.shape)"), ["same.1: bolt.shape = acme.shape", "same.2: '2'.shape = acme.shape"]);
        assert_eq!(shown("equal(rate.kiln.*:soak)"), ["same: rate.kiln.south:soak = rate.kiln.middle:soak"]);
    }

    #[test]
    fn a_star_stands_for_each_level() {
        assert_eq!(
            shown("*.shape = 1"),
            ["same.acme: acme.shape = 1", "same.bolt: bolt.shape = 1", "same.'2': '2'.shape = 1"]
        );
        assert_eq!(
            shown("*.shape = 2 * *.scale"),
            [
                "same.acme: acme.shape = 2 * acme.scale",
                "same.bolt: bolt.shape = 2 * bolt.scale",
                "same.'2': '2'.shape = 2 * '2'.scale",
            ]
        );
        assert_eq!(
            shown("share.*.pass = 0.5 = sum(share.*.pass) / 2"),
            [
                "same.north.1: share.north.pass = 0.5",
                "same.north.2: 0.5 = sum(share.*.pass) / 2",
                "same.south.1: share.south.pass = 0.5",
                "same.south.2: 0.5 = sum(share.*.pass) / 2",
            ]
        );
    }

    #[test]
    fn sums_stay_as_written() {
        assert_eq!(shown("sum(rate.kiln.*) = 0"), ["same: sum(rate.kiln.*) = 0"]);
    }

    #[test]
    fn faults() {
        for (text, place, message, advice) in [
            ("rate.soke = 0", "rate.soke", "no parameter is called rate.soke", "nearest name: rate.soak"),
            ("0 = 1 = rate.sok", "rate.sok", "no parameter is called rate.sok", "nearest name: rate.soak"),
            ("sum(rate.kilm.*) = 0", "sum(rate.kilm.*)", "no parameter matches rate.kilm.*", "something: rate.kiln.*"),
            ("*.shap = 1", "*.shap", "no parameter matches *.shap", "shape"),
            ("*.shape = *.scal", "*.scal", "no parameter matches *.scal", "scale"),
            ("equal(*.mean)", "equal(*.mean)", "no parameter matches *.mean", ""),
            ("equal(*.intercept)", "equal(*.intercept)", "only rate.intercept fits", ""),
            (
                "*.shape = share.*.pass",
                "share.*.pass",
                "no parameter is called share.acme.pass",
                "* stands for acme here",
            ),
            ("*.*.pass = 0.5", "*.*.pass", "more than one *", "once a level"),
            ("rate.soak", "rate.soak", "left = right", ""),
            ("rate.soak <= 1", "<=", "inequalities", "range"),
        ] {
            let error = expand("same", text, &vocabulary()).unwrap_err();
            assert_eq!(&text[error.span.start..error.span.end], place, "{text}: {error:?}");
            assert!(error.to_string().contains(message), "{text}: {error}");
            assert!(error.advice.as_deref().unwrap_or("").contains(advice), "{text}: {:?}", error.advice);
        }
    }
}
