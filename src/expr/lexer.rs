//! Text to tokens with their places. A whole name with all its pieces is one token, so that `share.*` is told from a
//! product here and nowhere else.

use super::blame::stray;
use super::name::{Joiner, Name, Piece};
use super::token::{Lexeme, Mark, Token};
use super::{ExprError, Span};

/// All tokens of the text; the last is `End`.
pub(super) fn tokens(text: &str) -> Result<Vec<Token>, ExprError> {
    let mut lexer = Lexer { text, at: 0, after_operand: false };
    let mut out = Vec::new();
    loop {
        let token = lexer.token()?;
        let end = token.kind == Lexeme::End;
        lexer.after_operand = !matches!(token.kind, Lexeme::Mark(m) if m != Mark::Close);
        out.push(token);
        if end {
            return Ok(out);
        }
    }
}

/// Reads the whole text as one name or pattern.
pub(super) fn name(text: &str) -> Result<Name, ExprError> {
    let all = Span { start: 0, end: text.len() };
    if text.trim() == "*" {
        return Ok(Name { pieces: vec![Piece { joiner: Joiner::Dot, text: None }] });
    }
    let tokens = tokens(text)?;
    match tokens.as_slice() {
        [Token { kind: Lexeme::Word(text) | Lexeme::Text(text), .. }, _] => Ok(Name::single(text)),
        [Token { kind: Lexeme::Name(name), .. }, _] => Ok(name.clone()),
        [_] => Err(ExprError::syntax(all, "a name is missing here")),
        _ => Err(ExprError::syntax(all, format!("{text} is not one name"))
            .advise("letters, digits and _ stand plain, anything else in quotes: share.'2', rate.'soak time'")),
    }
}

struct Lexer<'a> {
    text: &'a str,
    at: usize,
    /// Whether the token before ends an operand: then a `*` multiplies.
    after_operand: bool,
}

impl Lexer<'_> {
    fn rest(&self) -> &str {
        &self.text[self.at..]
    }

    fn peek(&self) -> Option<char> {
        self.rest().chars().next()
    }

    fn second(&self) -> Option<char> {
        self.rest().chars().nth(1)
    }

    fn bump(&mut self) -> Option<char> {
        let c = self.peek()?;
        self.at += c.len_utf8();
        Some(c)
    }

    fn since(&self, start: usize) -> Span {
        Span { start, end: self.at }
    }

    fn skip(&mut self, keep: impl Fn(char) -> bool) {
        while self.peek().is_some_and(&keep) {
            self.bump();
        }
    }

    fn token(&mut self) -> Result<Token, ExprError> {
        self.skip(char::is_whitespace);
        let start = self.at;
        let kind = match self.peek() {
            None => Lexeme::End,
            Some(c) if c.is_ascii_digit() => self.number()?,
            Some('.') if self.second().is_some_and(|c| c.is_ascii_digit()) => self.number()?,
            Some(c) if begins_piece(c) => self.name()?,
            Some('*') if !self.after_operand && matches!(self.second(), Some('.' | ':')) => self.name()?,
            Some(_) => Lexeme::Mark(self.mark()?),
        };
        Ok(Token { kind, span: self.since(start) })
    }

    fn number(&mut self) -> Result<Lexeme, ExprError> {
        let start = self.at;
        let digit = |c: char| c.is_ascii_digit();
        self.skip(digit);
        if self.peek() == Some('.') {
            self.bump();
            self.skip(digit);
        }
        if matches!(self.peek(), Some('e' | 'E')) {
            let sign = usize::from(matches!(self.second(), Some('+' | '-')));
            if self.rest()[1 + sign..].starts_with(digit) {
                self.at += 1 + sign;
                self.skip(digit);
            }
        }
        let written = &self.text[start..self.at];
        let span = self.since(start);
        if self.peek() == Some('.') {
            return Err(ExprError::syntax(Span { start, end: self.at + 1 }, "a number has one decimal point"));
        }
        let value: f64 = written.parse().map_err(|_| ExprError::syntax(span, format!("{written} is not a number")))?;
        let mantissa = written.split(['e', 'E']).next().unwrap_or(written);
        if value.is_infinite() {
            return Err(ExprError::syntax(span, format!("{written} is too large: numbers end at about 1.8e308")));
        }
        if value == 0.0 && mantissa.contains(|c| ('1'..='9').contains(&c)) {
            return Err(ExprError::syntax(span, format!("{written} is too small: it would be read as 0")));
        }
        Ok(Lexeme::Number(value))
    }

    /// A name with all its pieces, or a lone text in single quotes.
    fn name(&mut self) -> Result<Lexeme, ExprError> {
        let quote = self.peek();
        let mut pieces = vec![self.piece(Joiner::Dot)?];
        loop {
            let joiner = match self.peek() {
                Some('.') => Joiner::Dot,
                Some(':') if self.second().is_some_and(|c| begins_piece(c) || c == '*') => Joiner::Colon,
                _ => break,
            };
            let mark = self.at;
            self.bump();
            match self.peek() {
                Some('*') if joiner == Joiner::Colon => {
                    self.bump();
                    return Err(ExprError::syntax(self.since(mark), "a * stands after a dot, not after a colon"));
                }
                Some(c) if begins_piece(c) || c == '*' => pieces.push(self.piece(joiner)?),
                Some(c) if c.is_ascii_digit() => {
                    let digits = self.at;
                    self.skip(|c| c.is_ascii_alphanumeric() || c == '_');
                    let piece = &self.text[digits..self.at];
                    return Err(ExprError::syntax(self.since(mark), "a piece of a name cannot begin with a digit")
                        .advise(format!("quote it: .'{piece}'")));
                }
                Some(c) if c.is_alphabetic() => return Err(self.foreign_letters()),
                _ => {
                    return Err(ExprError::syntax(self.since(mark), "a piece of the name is missing after the dot")
                        .advise("the pieces of a name are joined without spaces: rate.soak"));
                }
            }
        }
        if self.peek().is_some_and(|c| c.is_alphabetic() && !c.is_ascii()) {
            return Err(self.foreign_letters());
        }
        match (pieces.as_mut_slice(), quote) {
            ([Piece { text: Some(text), .. }], Some('\'')) => Ok(Lexeme::Text(std::mem::take(text))),
            ([Piece { text: Some(_), .. }], Some('"')) => Ok(Lexeme::Name(Name { pieces })),
            ([Piece { text: Some(text), .. }], _) => Ok(Lexeme::Word(std::mem::take(text))),
            _ => Ok(Lexeme::Name(Name { pieces })),
        }
    }

    fn piece(&mut self, joiner: Joiner) -> Result<Piece, ExprError> {
        let start = self.at;
        let text = match self.peek() {
            Some('*') => {
                self.bump();
                if self.peek().is_some_and(|c| begins_piece(c) || c.is_ascii_digit()) {
                    return Err(ExprError::syntax(self.since(start), "a * in a name stands for one whole piece")
                        .advise("for a product put spaces round it: a * b"));
                }
                None
            }
            Some('\'') => Some(self.single_quoted()?),
            Some('"') => Some(self.double_quoted()?),
            _ => {
                self.skip(|c| c.is_ascii_alphanumeric() || c == '_');
                Some(self.text[start..self.at].to_string())
            }
        };
        Ok(Piece { joiner, text })
    }

    /// `'...'`, without escapes but for `''`, which is one quote.
    fn single_quoted(&mut self) -> Result<String, ExprError> {
        let start = self.at;
        self.bump();
        let mut out = String::new();
        while let Some(c) = self.bump() {
            if c != '\'' {
                out.push(c);
            } else if self.peek() == Some('\'') {
                self.bump();
                out.push('\'');
            } else {
                return Ok(out);
            }
        }
        Err(ExprError::syntax(Span { start, end: start + 1 }, "this quote is never closed"))
    }

    /// `"..."` with the escapes of TOML.
    fn double_quoted(&mut self) -> Result<String, ExprError> {
        let start = self.at;
        self.bump();
        let mut out = String::new();
        while let Some(c) = self.bump() {
            match c {
                '"' => return Ok(out),
                '\\' => out.push(self.escape()?),
                c => out.push(c),
            }
        }
        Err(ExprError::syntax(Span { start, end: start + 1 }, "this quote is never closed"))
    }

    fn escape(&mut self) -> Result<char, ExprError> {
        let start = self.at - 1;
        let letter = self.bump();
        let digits = match letter {
            Some('b') => return Ok('\u{8}'),
            Some('t') => return Ok('\t'),
            Some('n') => return Ok('\n'),
            Some('f') => return Ok('\u{c}'),
            Some('r') => return Ok('\r'),
            Some(c @ ('"' | '\\')) => return Ok(c),
            Some('u') => 4,
            Some('U') => 8,
            _ => 0,
        };
        let code: String = self.rest().chars().take(digits).collect();
        let value = u32::from_str_radix(&code, 16).ok().filter(|_| code.chars().all(|c| c.is_ascii_hexdigit()));
        match value.and_then(char::from_u32) {
            Some(c) if digits > 0 && code.len() == digits => {
                self.at += digits;
                Ok(c)
            }
            _ => Err(ExprError::syntax(self.since(start), "no such escape in double quotes")
                .advise("a backslash itself is written \\\\; in single quotes it needs no escape")),
        }
    }

    /// The error for letters beyond A-Z in a plain name, which may have begun before.
    fn foreign_letters(&mut self) -> ExprError {
        let before = self.text[..self.at].char_indices().rev();
        let start = before.take_while(|&(_, c)| c.is_alphanumeric() || c == '_').last().map_or(self.at, |(i, _)| i);
        self.skip(|c| c.is_alphanumeric() || c == '_');
        let word = &self.text[start..self.at];
        ExprError::syntax(self.since(start), format!("{word} has letters beyond A-Z and must be quoted"))
            .advise(format!("write \"{word}\" where it stands alone, .'{word}' after a dot"))
    }

    fn mark(&mut self) -> Result<Mark, ExprError> {
        let start = self.at;
        let c = self.bump().unwrap_or(' ');
        let next = self.peek();
        let pair = match (c, next) {
            ('<', Some('=')) => Some(Mark::AtMost),
            ('>', Some('=')) => Some(Mark::AtLeast),
            ('!', Some('=')) => Some(Mark::Unequal),
            _ => None,
        };
        if let Some(mark) = pair {
            self.bump();
            return Ok(mark);
        }
        let (message, advice) = match (c, next) {
            ('*', Some('*')) => ("** is not an operator", "a power is written a ^ b"),
            ('=', Some('=')) => ("== is not a relation", "equality is written with one ="),
            ('=', Some('<')) => ("=< is not a relation", "write <="),
            ('=', Some('>')) => ("=> is not a relation", "write >="),
            ('<', Some('>')) => ("<> is not a relation", "write !="),
            ('&', Some('&')) => ("&& is not an operator", "write and"),
            ('|', Some('|')) => ("|| is not an operator", "write or"),
            ('+', _) => return Ok(Mark::Plus),
            ('-', _) => return Ok(Mark::Minus),
            ('*', _) => return Ok(Mark::Star),
            ('/', _) => return Ok(Mark::Slash),
            ('^', _) => return Ok(Mark::Caret),
            ('(', _) => return Ok(Mark::Open),
            (')', _) => return Ok(Mark::Close),
            (',', _) => return Ok(Mark::Comma),
            ('<', _) => return Ok(Mark::Less),
            ('>', _) => return Ok(Mark::More),
            ('=', _) => return Ok(Mark::Equal),
            (c, _) if c.is_alphabetic() && c != '\u{3c0}' => {
                self.at = start;
                return Err(self.foreign_letters());
            }
            (c, _) => return Err(stray(c, self.since(start))),
        };
        self.bump();
        Err(ExprError::syntax(self.since(start), message).advise(advice))
    }
}

fn begins_piece(c: char) -> bool {
    c.is_ascii_alphabetic() || matches!(c, '_' | '\'' | '"')
}

#[cfg(test)]
mod tests {
    use super::tokens;
    use crate::expr::token::{Lexeme, Mark};
    use crate::expr::{Name, Span};

    fn kinds(text: &str) -> Vec<Lexeme> {
        let mut kinds: Vec<Lexeme> = tokens(text).unwrap().into_iter().map(|t| t.kind).collect();
        assert_eq!(kinds.pop(), Some(Lexeme::End));
        kinds
    }

    #[test]
    fn numbers() {
        for (text, value) in [
            ("1", 1.0),
            (".5", 0.5),
            ("2.", 2.0),
            ("1e-3", 1e-3),
            ("1.5E+2", 150.0),
            ("0", 0.0),
            ("0e-999", 0.0),
            ("1.e2", 100.0),
            ("5e-324", 5e-324),
        ] {
            assert_eq!(kinds(text), [Lexeme::Number(value)], "{text}");
        }
        for text in ["1e400", "1e-400", "1.2.3"] {
            assert!(tokens(text).is_err(), "{text}");
        }
        assert_eq!(kinds("2e"), [Lexeme::Number(2.0), Lexeme::Word("e".into())]);
        assert_eq!(kinds("nan"), [Lexeme::Word("nan".into())]);
    }

    #[test]
    fn a_star_multiplies_or_stands_for_a_piece() {
        let name = |text: &str| Lexeme::Name(Name::parse(text).unwrap());
        let star = Lexeme::Mark(Mark::Star);
        let word = |text: &str| Lexeme::Word(text.into());
        assert_eq!(kinds("a*b"), [word("a"), star.clone(), word("b")]);
        assert_eq!(kinds("2.*b"), [Lexeme::Number(2.0), star.clone(), word("b")]);
        assert_eq!(kinds("a*.5"), [word("a"), star.clone(), Lexeme::Number(0.5)]);
        assert_eq!(kinds("a.**2"), [name("a.*"), star.clone(), Lexeme::Number(2.0)]);
        assert_eq!(kinds("*.a * *.b"), [name("*.a"), star.clone(), name("*.b")]);
        assert!(tokens("a**b").is_err());
        assert_eq!(kinds("share.*.pass"), [name("share.*.pass")]);
    }

    #[test]
    fn quotes() {
        assert_eq!(kinds("'north'"), [Lexeme::Text("north".into())]);
        assert_eq!(kinds("'it''s'"), [Lexeme::Text("it's".into())]);
        assert_eq!(kinds("''"), [Lexeme::Text(String::new())]);
        assert_eq!(kinds("\"soak time\""), [Lexeme::Name(Name::single("soak time"))]);
        assert_eq!(kinds("\"a\\u00e9\\\"\""), [Lexeme::Name(Name::single("a\u{e9}\""))]);
        assert_eq!(kinds("'soak time'.x"), [Lexeme::Name(Name::of(&["soak time", "x"]))]);
        for text in ["'open", "\"open", "\"\\q\"", "\"\\u12\"", "\"\\uD800\""] {
            assert!(tokens(text).is_err(), "{text}");
        }
    }

    #[test]
    fn places_are_bytes() {
        let spans: Vec<Span> = tokens(" 'h\u{f6}he' <= 1.5").unwrap().into_iter().map(|t| t.span).collect();
        let span = |start, end| Span { start, end };
        assert_eq!(spans, [span(1, 8), span(9, 11), span(12, 15), span(15, 15)]);
    }
}
