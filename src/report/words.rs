//! Pieces of prose: wrapping, lists, chances in words.

/// Widest line of text output.
pub const WIDTH: usize = 96;

/// Words wrapped to [`WIDTH`], every line indented, further lines by two more when `hang` is set. A word longer than a
/// line stands alone on it.
pub fn wrap(text: &str, indent: usize, hang: bool) -> String {
    let mut out = String::new();
    let mut line = " ".repeat(indent);
    let mut empty = true;
    for word in text.split_whitespace() {
        if !empty && line.chars().count() + 1 + word.chars().count() > WIDTH {
            out.push_str(&line);
            out.push('\n');
            line = " ".repeat(indent + if hang { 2 } else { 0 });
            empty = true;
        }
        if !empty {
            line.push(' ');
        }
        line.push_str(word);
        empty = false;
    }
    if !empty {
        out.push_str(&line);
        out.push('\n');
    }
    out
}

/// `a`, `a and b`, `a, b and c`; beyond `most` the rest is counted.
pub fn list(items: &[&str], most: usize) -> String {
    match items {
        [] => String::new(),
        [one] => (*one).to_string(),
        many if many.len() > most.max(1) => {
            format!("{} and {} more", many[..most.max(1)].join(", "), many.len() - most.max(1))
        }
        [first @ .., last] => format!("{} and {last}", first.join(", ")),
    }
}

/// The text as a sentence: a capital, unless it begins with a name (anything but a lower-case word), and a full stop.
pub fn sentence(text: &str) -> String {
    let mut out = text.trim().to_string();
    let first = out.split_whitespace().next().unwrap_or_default();
    if first.chars().all(|c| c.is_ascii_lowercase()) {
        out = out.get(..1).map(str::to_uppercase).unwrap_or_default() + out.get(1..).unwrap_or_default();
    }
    if !out.is_empty() && !out.ends_with(['.', '!', '?']) {
        out.push('.');
    }
    out
}

/// How often chance alone does it: `38 times in 100`, `17 times in 10,000`, `less than once in a million`.
pub fn how_often(p: f64) -> String {
    if p < 1e-6 {
        return "less than once in a million".into();
    }
    let (base, name) = [(100.0, "100"), (1_000.0, "1,000"), (10_000.0, "10,000"), (100_000.0, "100,000")]
        .into_iter()
        .find(|(base, _)| p * base >= 9.5)
        .unwrap_or((1_000_000.0, "1,000,000"));
    match (p * base).round() {
        n if n >= base => "practically always".into(),
        n if n <= 1.0 => format!("about once in {name}"),
        n => format!("about {n} times in {name}"),
    }
}

/// What the data say to a hypothesis with this probability, in words without a threshold of decision.
pub fn stance(p: f64) -> &'static str {
    match p {
        p if p >= 0.1 => "Nothing in the data speaks against them.",
        p if p >= 0.01 => "There is some tension between them and the data.",
        p if p >= 0.0001 => "The data speak against them.",
        _ => "The data speak strongly against them.",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn wraps_and_keeps_every_word() {
        let text = "word ".repeat(60) + &"x".repeat(150);
        let wrapped = wrap(&text, 4, true);
        assert_eq!(wrapped.split_whitespace().collect::<Vec<_>>(), text.split_whitespace().collect::<Vec<_>>());
        assert!(wrapped.lines().all(|l| l.len() <= WIDTH || l.trim().len() == 150));
        assert!(wrapped.lines().skip(1).all(|l| l.starts_with("      ")));
        assert_eq!(wrap("", 2, false), "");
    }

    #[test]
    fn chances() {
        assert_eq!(how_often(0.38), "about 38 times in 100");
        assert_eq!(how_often(0.054), "about 54 times in 1,000");
        assert_eq!(how_often(0.0017), "about 17 times in 10,000");
        assert_eq!(how_often(0.999), "practically always");
        assert_eq!(how_often(1e-9), "less than once in a million");
        assert_eq!(how_often(1.2e-6), "about once in 1,000,000");
    }

    #[test]
    fn lists() {
        assert_eq!(list(&["a", "b", "c"], 5), "a, b and c");
        assert_eq!(list(&["a", "b", "c"], 2), "a, b and 1 more");
        assert_eq!(list(&["a"], 0), "a");
    }
}
