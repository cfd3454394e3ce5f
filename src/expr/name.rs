//! Names of things: pieces joined by dots (or colons, for products of terms), written plain or quoted.
//!
//! A plain piece is `[A-Za-z_][A-Za-z0-9_]*`; any other is quoted as TOML quotes keys: `share.'2'`, `rate."soak time"`.

use std::fmt;

use super::{ExprError, lexer};

/// How a piece is joined to the one before it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Joiner {
    /// `.` (also that of the first piece)
    Dot,
    /// `:`, joining the factors of a product of terms
    Colon,
}

/// One piece of a name.
#[derive(Debug, Clone, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Piece {
    /// How it is joined to the piece before.
    pub joiner: Joiner,
    /// The text without quotes; `None` is the wildcard `*`.
    pub text: Option<String>,
}

/// A name such as `rate.kiln.middle:soak` or `share.'2'`, or a pattern such as `share.*`.
#[derive(Debug, Clone, PartialEq, Eq, Hash, PartialOrd, Ord, Default)]
pub struct Name {
    /// The pieces in order; at least one.
    pub pieces: Vec<Piece>,
}

impl Name {
    /// Reads a name or pattern as it is written: `rate.soak`, `'soak time'`, `share.*`.
    ///
    /// # Errors
    /// A span and a message when the text is not one name.
    pub fn parse(text: &str) -> Result<Name, ExprError> {
        lexer::name(text)
    }

    /// A name of one piece, from its text without quotes.
    pub fn single(text: impl Into<String>) -> Name {
        Name { pieces: vec![Piece { joiner: Joiner::Dot, text: Some(text.into()) }] }
    }

    /// A name from the texts of its pieces without quotes, joined by dots.
    pub fn of(pieces: &[&str]) -> Name {
        Name { pieces: pieces.iter().map(|p| Piece { joiner: Joiner::Dot, text: Some((*p).to_string()) }).collect() }
    }

    /// This name with one more piece after a dot.
    pub fn dot(mut self, text: impl Into<String>) -> Name {
        self.pieces.push(Piece { joiner: Joiner::Dot, text: Some(text.into()) });
        self
    }

    /// This name with one more piece after a colon.
    pub fn colon(mut self, text: impl Into<String>) -> Name {
        self.pieces.push(Piece { joiner: Joiner::Colon, text: Some(text.into()) });
        self
    }

    /// This name with all pieces of `other` after a dot.
    pub fn then(mut self, other: &Name) -> Name {
        self.pieces.extend(other.pieces.iter().cloned());
        self
    }

    /// The text of a name of one piece, without quotes.
    pub fn as_single(&self) -> Option<&str> {
        match self.pieces.as_slice() {
            [Piece { text: Some(text), .. }] => Some(text),
            _ => None,
        }
    }

    /// Whether some piece is `*`.
    pub fn is_pattern(&self) -> bool {
        self.stars() > 0
    }

    /// How many pieces are `*`.
    pub fn stars(&self) -> usize {
        self.pieces.iter().filter(|p| p.text.is_none()).count()
    }

    /// Whether this name fits the pattern: as many pieces, equal where the pattern is not `*`, joined alike. A `*`
    /// stands for exactly one piece, so `share.*` fits `share.north`, not `share.north.pass` or `share.north:soak`.
    pub fn matches(&self, pattern: &Name) -> bool {
        self.pieces.len() == pattern.pieces.len()
            && self.pieces.iter().zip(&pattern.pieces).all(|(mine, theirs)| {
                mine.joiner == theirs.joiner && (theirs.text.is_none() || mine.text == theirs.text)
            })
    }

    /// What the first `*` of the pattern stands for in this name; `None` if it does not fit.
    pub fn star_of(&self, pattern: &Name) -> Option<&str> {
        if !self.matches(pattern) {
            return None;
        }
        let at = pattern.pieces.iter().position(|p| p.text.is_none())?;
        self.pieces[at].text.as_deref()
    }

    /// This name with a `*` wherever the pattern has one; `None` if the two have not as many pieces.
    pub fn starred_as(&self, pattern: &Name) -> Option<Name> {
        let piece = |(mine, theirs): (&Piece, &Piece)| match theirs.text {
            None => Piece { joiner: mine.joiner, text: None },
            Some(_) => mine.clone(),
        };
        let pieces = self.pieces.iter().zip(&pattern.pieces).map(piece).collect();
        (self.pieces.len() == pattern.pieces.len()).then_some(Name { pieces })
    }

    /// This pattern with every `*` replaced by the piece.
    pub fn substitute(&self, star: &str) -> Name {
        let piece =
            |p: &Piece| Piece { joiner: p.joiner, text: Some(p.text.clone().unwrap_or_else(|| star.to_string())) };
        Name { pieces: self.pieces.iter().map(piece).collect() }
    }
}

/// Words that mean something else when they stand alone and plain.
const RESERVED: [&str; 4] = ["and", "or", "not", "pi"];

/// Whether a piece may be written without quotes.
pub fn is_plain(text: &str) -> bool {
    !text.is_empty()
        && !text.starts_with(|c: char| c.is_ascii_digit())
        && text.bytes().all(|b| b.is_ascii_alphanumeric() || b == b'_')
}

/// A piece as it is written within a longer name: plain where it can be, in single quotes else, in double quotes where
/// single ones cannot hold it.
pub fn quoted(text: &str) -> String {
    if is_plain(text) {
        text.to_string()
    } else if text.contains(|c: char| c == '\'' || c.is_control()) {
        double_quoted(text)
    } else {
        format!("'{text}'")
    }
}

fn double_quoted(text: &str) -> String {
    let mut out = String::from("\"");
    for c in text.chars() {
        match c {
            '"' => out.push_str("\\\""),
            '\\' => out.push_str("\\\\"),
            '\n' => out.push_str("\\n"),
            '\t' => out.push_str("\\t"),
            '\r' => out.push_str("\\r"),
            c if c.is_control() => out.push_str(&format!("\\u{:04X}", c as u32)),
            c => out.push(c),
        }
    }
    out.push('"');
    out
}

/// Writes the name as input accepts it, with quotes only where they are needed. A name of one odd piece is written in
/// double quotes, because a text in single quotes standing alone is a label.
impl fmt::Display for Name {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(text) = self.as_single() {
            let plain = is_plain(text) && !RESERVED.contains(&text);
            return if plain { f.write_str(text) } else { f.write_str(&double_quoted(text)) };
        }
        for (i, piece) in self.pieces.iter().enumerate() {
            if i > 0 {
                f.write_str(if piece.joiner == Joiner::Dot { "." } else { ":" })?;
            }
            match &piece.text {
                Some(text) => f.write_str(&quoted(text))?,
                None => f.write_str("*")?,
            }
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::Name;

    fn name(text: &str) -> Name {
        Name::parse(text).unwrap()
    }

    #[test]
    fn writes_canonically() {
        for (written, shown) in [
            ("rate", "rate"),
            ("rate.kiln.middle:soak", "rate.kiln.middle:soak"),
            ("share.'2'", "share.'2'"),
            ("share.\"2\"", "share.'2'"),
            ("\"share\".'north'", "share.north"),
            ("rate.\"soak time\"", "rate.'soak time'"),
            ("rate.\"it's\"", "rate.\"it's\""),
            ("rate.'say \"so\"'", "rate.'say \"so\"'"),
            ("rate.\"a\\tb\\\\\"", "rate.\"a\\tb\\\\\""),
            ("'soak time'", "\"soak time\""),
            ("\"pi\"", "\"pi\""),
            ("pi.x", "pi.x"),
            ("share.*.pass", "share.*.pass"),
            ("*.shape", "*.shape"),
            ("*", "*"),
            ("rate.''", "rate.''"),
        ] {
            assert_eq!(name(written).to_string(), shown);
            assert_eq!(name(shown), name(written), "{shown}");
        }
    }

    #[test]
    fn refuses_what_is_no_name() {
        for text in ["", "a b", "a.", "a.2", "a + b", "2", "a..b", "a:*", ".a", "a.*b", "'open"] {
            assert!(Name::parse(text).is_err(), "{text}");
        }
    }

    #[test]
    fn a_star_is_one_whole_piece() {
        let share = name("share.*");
        assert!(name("share.north").matches(&share));
        assert!(name("share.'2'").matches(&share));
        assert!(!name("share").matches(&share));
        assert!(!name("share.north.pass").matches(&share));
        assert!(!name("share.north:soak").matches(&share));
        assert!(!name("rate.north").matches(&share));
        assert!(!name("share:north").matches(&share));
        assert!(name("share.north.pass").matches(&name("share.*.pass")));
        assert!(name("share.north.pass").matches(&name("share.*.*")));
        assert!(!name("share.north.fail").matches(&name("share.*.pass")));
        assert!(name("rate.kiln.middle:soak").matches(&name("rate.kiln.*:soak")));
        assert_eq!(name("share.'2'.pass").star_of(&name("share.*.pass")), Some("2"));
        assert_eq!(name("acme.shape").star_of(&name("*.shape")), Some("acme"));
        assert_eq!(name("acme.scale").star_of(&name("*.shape")), None);
        assert_eq!(name("acme.shape").star_of(&name("acme.shape")), None);
        assert_eq!(name("*.shape").substitute("a b"), name("'a b'.shape"));
        assert_eq!(name("rate.kiln.middle").starred_as(&name("rate.kilm.*")), Some(name("rate.kiln.*")));
        assert_eq!(name("rate.kiln").starred_as(&name("rate.kilm.*")), None);
    }

    #[test]
    fn is_built_from_raw_pieces() {
        assert_eq!(
            Name::of(&["rate", "kiln", "middle"]).colon("soak time").to_string(),
            "rate.kiln.middle:'soak time'"
        );
        assert_eq!(Name::single("rate").dot("2"), name("rate.'2'"));
        assert_eq!(Name::single("north").then(&name("rate.soak")), name("north.rate.soak"));
        assert_eq!(Name::single("two words").as_single(), Some("two words"));
    }
}
