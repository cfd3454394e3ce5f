//! The texts a study comes from (the file, and each option of the command line), and how a place in one is shown.

use std::path::PathBuf;

use crate::expr::{Span, caret};

/// One text.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Source {
    /// What messages call it: the file as the user wrote it, or `command line, --tested`.
    pub name: String,
    /// The text.
    pub text: String,
    /// Whether messages count its lines.
    pub numbered: bool,
    /// Folder that relative paths in it start from; empty is the working folder.
    pub folder: PathBuf,
}

/// Bytes `start..end` of one of the sources.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct At {
    /// Which source.
    pub source: usize,
    /// First byte.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
    /// Whether the bytes are a TOML string with its quotes.
    pub quoted: bool,
}

/// All sources of a study.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Sources(Vec<Source>);

/// A fault as a reader sees it: where, what, the text with carets below, what to do.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Shown {
    /// `pallet.toml, line 24`, or `command line, --tested`.
    pub place: String,
    /// What is wrong.
    pub message: String,
    /// The line of text and the carets under it, indented by four.
    pub picture: Option<String>,
    /// What to do, or the nearest name.
    pub advice: Option<String>,
}

impl std::fmt::Display for Shown {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.place.is_empty() {
            write!(f, "{}", self.message)?;
        } else {
            write!(f, "{}: {}", self.place, self.message)?;
        }
        if let Some(picture) = &self.picture {
            write!(f, "\n{picture}")?;
        }
        if let Some(advice) = &self.advice {
            write!(f, "\n    {advice}")?;
        }
        Ok(())
    }
}

/// Widest line shown in full; of a longer one the part round the carets is shown.
const WIDTH: usize = 110;

impl Sources {
    /// Adds a source; its index is what [`At`] holds.
    pub fn push(&mut self, source: Source) -> usize {
        self.0.push(source);
        self.0.len() - 1
    }

    /// The source of this index.
    pub fn get(&self, index: usize) -> Option<&Source> {
        self.0.get(index)
    }

    /// Line and column (from 1, in characters) of a place.
    pub fn position(&self, at: At) -> (usize, usize) {
        let Some(source) = self.get(at.source) else { return (1, 1) };
        let (start, number) = line_start(&source.text, at.start);
        (number, source.text[start..floor(&source.text, at.start)].chars().count() + 1)
    }

    /// A message at a place, with the text and the carets.
    pub fn show(&self, at: Option<At>, message: &str, advice: Option<&str>) -> Shown {
        let mut shown = Shown { message: message.to_owned(), advice: advice.map(str::to_owned), ..Shown::default() };
        let Some((source, at)) = at.and_then(|at| Some((self.get(at.source)?, at))) else { return shown };
        shown.place = source.name.clone();
        if source.numbered {
            shown.place = format!("{}, line {}", source.name, self.position(at).0);
        }
        shown.picture = picture(&source.text, at.start, at.end);
        shown
    }
}

/// Start of the line that holds byte `at`, and its number from 1.
fn line_start(text: &str, at: usize) -> (usize, usize) {
    let before = &text[..floor(text, at)];
    (before.rfind('\n').map_or(0, |i| i + 1), before.matches('\n').count() + 1)
}

/// The largest character boundary not past `at`.
fn floor(text: &str, at: usize) -> usize {
    let mut at = at.min(text.len());
    while !text.is_char_boundary(at) {
        at -= 1;
    }
    at
}

fn picture(text: &str, start: usize, end: usize) -> Option<String> {
    let start = floor(text, start);
    let (from, _) = line_start(text, start);
    let line = text[from..].lines().next().unwrap_or("");
    if line.trim().is_empty() {
        return None;
    }
    let (start, end) = ((start - from).min(line.len()), (floor(text, end).max(start) - from).min(line.len()));
    let indent = (line.len() - line.trim_start().len()).min(start);
    let (mut left, mut right) = (indent, line.trim_end().len().max(start));
    if right - left > WIDTH {
        left = left.max(floor(line, start.saturating_sub(WIDTH / 3)));
        right = right.min(floor(line, left + WIDTH)).max(start);
    }
    let (head, tail) = (if left > indent { "..." } else { "" }, if right < line.trim_end().len() { "..." } else { "" });
    let shift = |at: usize| at.clamp(left, right) - left + head.len();
    Some(caret(&format!("{head}{}{tail}", &line[left..right]), Span { start: shift(start), end: shift(end) }))
}

/// Where byte `wanted` of the decoded text stands in `raw`, a TOML string with its quotes.
pub fn encoded(raw: &str, wanted: usize) -> usize {
    let long = raw.starts_with("\"\"\"") || raw.starts_with("'''");
    let mut at = if long { 3 } else { 1 };
    if long {
        // The line end right after the opening quotes is no part of the text.
        at += raw[at.min(raw.len())..]
            .find(|c| c != '\r')
            .filter(|&i| raw[at + i..].starts_with('\n'))
            .map_or(0, |i| i + 1);
    }
    if raw.starts_with('\'') {
        return (at + wanted).min(raw.len());
    }
    let mut decoded = 0;
    while at < raw.len() {
        let rest = &raw[at..];
        let mut chars = rest.chars();
        let (Some(first), second) = (chars.next(), chars.next()) else { break };
        let (bytes, makes) = match (first, second) {
            ('\\', Some(c)) if c.is_whitespace() => {
                (1 + rest[1..].find(|c: char| !c.is_whitespace()).unwrap_or(rest.len() - 1), 0)
            }
            ('\\', Some('u')) => escape(rest, 4),
            ('\\', Some('U')) => escape(rest, 8),
            ('\\', Some('x')) => escape(rest, 2),
            ('\\', Some(_)) => (2, 1),
            (c, _) => (c.len_utf8(), c.len_utf8()),
        };
        if decoded >= wanted && makes > 0 {
            break;
        }
        at += bytes;
        decoded += makes;
    }
    at.min(raw.len())
}

fn escape(rest: &str, digits: usize) -> (usize, usize) {
    let code = rest.get(2..2 + digits).and_then(|t| u32::from_str_radix(t, 16).ok()).and_then(char::from_u32);
    (2 + digits, code.map_or(1, char::len_utf8))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn one(text: &str) -> Sources {
        let mut sources = Sources::default();
        sources.push(Source { name: "a.toml".into(), text: text.into(), numbered: true, folder: PathBuf::new() });
        sources
    }

    #[test]
    fn carets_stand_under_the_span() {
        let text = "[tested]\n  same = \"rate.soke = 2\"\n";
        let start = text.find("rate.soke").unwrap();
        let at = At { source: 0, start, end: start + 9, quoted: false };
        let shown = one(text).show(Some(at), "no parameter is called rate.soke", Some("nearest name: rate.soak"));
        assert_eq!(
            shown.to_string(),
            "a.toml, line 2: no parameter is called rate.soke\n    same = \"rate.soke = 2\"\n            ^^^^^^^^^\n    nearest name: rate.soak"
        );
    }

    #[test]
    fn long_lines_are_cut_round_the_carets() {
        let text = format!("{} here {}", "a ".repeat(200), "b ".repeat(200));
        let start = text.find("here").unwrap();
        let shown = picture(&text, start, start + 4).unwrap();
        let (line, carets) = shown.split_once('\n').unwrap();
        assert!(line.chars().count() < 130, "{line}");
        assert_eq!(&line[carets.find('^').unwrap()..carets.len()], "here");
    }

    #[test]
    fn decoded_bytes_are_found_in_the_raw_text() {
        for (raw, decoded) in [
            ("\"abc\"", "abc"),
            ("'abc'", "abc"),
            ("\"a\\tbc\"", "a\tbc"),
            ("\"\\u00e9c\"", "éc"),
            ("\"\"\"\nabc\"\"\"", "abc"),
            ("\"\"\"\\\n   abc\"\"\"", "abc"),
        ] {
            let c = decoded.find('c').unwrap();
            assert_eq!(&raw[encoded(raw, c)..encoded(raw, c + 1).min(encoded(raw, c) + 1)], "c", "{raw}");
        }
    }

    #[test]
    fn no_place_past_the_end_is_a_panic() {
        let sources = one("é\n");
        for start in 0..6 {
            sources.show(Some(At { source: 0, start, end: start + 1, quoted: false }), "m", None);
        }
    }
}
