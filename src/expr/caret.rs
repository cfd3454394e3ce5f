//! The picture of a faulty text: the line, and carets under the place.

use super::{ExprError, Span};

/// The line of the text in which the span starts, indented by four, and under it carets below the span (one at least; up
/// to the end of the line when the span goes on). Spans outside the text are moved to its end. No newline at the end.
pub fn caret(text: &str, span: Span) -> String {
    let start = boundary(text, span.start);
    let from = text[..start].rfind('\n').map_or(0, |i| i + 1);
    let line = text[from..].lines().next().unwrap_or("");
    let start = (start - from).min(line.len());
    let end = (boundary(text, span.end.max(span.start)) - from).clamp(start, line.len());
    // Tabs stay tabs, so that the carets stand under the place however wide the terminal draws them.
    let mut under = String::new();
    for c in line[..start].chars() {
        if c == '\t' { under.push('\t') } else { under.extend(std::iter::repeat_n(' ', width(c))) }
    }
    let carets = line[start..end].chars().map(|c| if c == '\t' { 1 } else { width(c) }).sum::<usize>().max(1);
    under.extend(std::iter::repeat_n('^', carets));
    format!("    {line}\n    {under}")
}

/// The picture of an error with its advice, each line indented by four; the message itself is the error's `Display`.
pub fn picture(text: &str, error: &ExprError) -> String {
    match &error.advice {
        Some(advice) => format!("{}\n    {advice}", caret(text, error.span)),
        None => caret(text, error.span),
    }
}

/// The nearest character boundary at or before the place.
fn boundary(text: &str, at: usize) -> usize {
    let mut at = at.min(text.len());
    while !text.is_char_boundary(at) {
        at -= 1;
    }
    at
}

/// Columns a character takes in a terminal: none for marks on the letter before, two for the wide blocks of the Unicode
/// standard's annex 11 (East Asian width; the blocks, not each exception in them).
fn width(c: char) -> usize {
    match c as u32 {
        0x0300..=0x036F | 0x200B..=0x200F | 0x20D0..=0x20FF | 0xFE00..=0xFE0F | 0xFEFF => 0,
        0x1100..=0x115F
        | 0x2E80..=0xA4CF
        | 0xAC00..=0xD7A3
        | 0xF900..=0xFAFF
        | 0xFE30..=0xFE6F
        | 0xFF00..=0xFF60
        | 0xFFE0..=0xFFE6
        | 0x1F300..=0x1F64F
        | 0x1F900..=0x1F9FF
        | 0x20000..=0x3FFFD => 2,
        _ => 1,
    }
}

#[cfg(test)]
mod tests {
    use super::{caret, picture};
    use crate::expr::{ExprError, Span};

    fn at(start: usize, end: usize) -> Span {
        Span { start, end }
    }

    #[test]
    fn carets_stand_under_the_place() {
        assert_eq!(caret("a = rate.soke", at(4, 13)), "    a = rate.soke\n        ^^^^^^^^^");
        assert_eq!(caret("a +", at(3, 3)), "    a +\n       ^");
        assert_eq!(caret("", at(0, 0)), "    \n    ^");
        assert_eq!(caret("a", at(9, 12)), "    a\n     ^");
    }

    #[test]
    fn several_lines_tabs_and_wide_characters() {
        assert_eq!(caret("a\nb + c\nd", at(6, 7)), "    b + c\n        ^");
        assert_eq!(caret("a + (\nb\n", at(4, 7)), "    a + (\n        ^");
        assert_eq!(caret("a\r\nb + c\r\n", at(7, 8)), "    b + c\n        ^");
        assert_eq!(caret("\ta + b", at(5, 6)), "    \ta + b\n    \t    ^");
        // Two characters of three bytes and two columns each.
        assert_eq!(caret("'\u{7a91}\u{7a91}' + b", at(11, 12)), "    '\u{7a91}\u{7a91}' + b\n             ^");
        assert_eq!(caret("\u{7a91}", at(0, 3)), "    \u{7a91}\n    ^^");
        // A span that cuts a character does not panic.
        assert_eq!(caret("\u{7a91}x", at(1, 2)), "    \u{7a91}x\n    ^");
        assert_eq!(caret("e\u{301} + b", at(6, 7)), "    e\u{301} + b\n        ^");
    }

    #[test]
    fn the_picture_ends_in_the_advice() {
        let error = ExprError::syntax(at(0, 1), "no").advise("nearest name: b");
        assert_eq!(picture("a", &error), "    a\n    ^\n    nearest name: b");
    }
}
