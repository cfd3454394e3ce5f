//! TOML text to the tree of values, with faults in our own words.

use toml::de::{DeTable, DeValue};

use super::fault::Fault;
use super::node::{Entry, Node, Table, Value};
use super::source::At;

type Spanned<T> = toml::Spanned<T>;

/// Parses a whole file, which is source number `source`.
///
/// # Errors
/// The first fault of the text: an unclosed quote, a key given twice, a value that is none.
pub fn document(text: &str, source: usize) -> Result<Table, Fault> {
    let (root, errors) = DeTable::parse_recoverable(text);
    match errors.first() {
        Some(error) => Err(fault(text, source, error, root.get_ref())),
        None => table(text, source, root.get_ref()),
    }
}

/// Parses one value; `offset` is where `text` starts in source number `source`. `None` when it is not TOML.
pub fn value(text: &str, source: usize, offset: usize) -> Option<Node> {
    let found = DeValue::parse(text).ok()?;
    let mut node = node(text, source, &found).ok()?;
    shift(&mut node, offset);
    Some(node)
}

fn shift(node: &mut Node, by: usize) {
    (node.at.start, node.at.end) = (node.at.start + by, node.at.end + by);
    match &mut node.value {
        Value::List(list) => list.iter_mut().for_each(|n| shift(n, by)),
        Value::Table(table) => table.0.iter_mut().for_each(|e| {
            (e.at.start, e.at.end) = (e.at.start + by, e.at.end + by);
            shift(&mut e.node, by);
        }),
        _ => {}
    }
}

fn table(text: &str, source: usize, found: &DeTable<'_>) -> Result<Table, Fault> {
    let mut entries = Vec::with_capacity(found.len());
    for (key, value) in found.iter() {
        let span = key.span();
        let at = At { source, start: span.start, end: span.end, quoted: false };
        entries.push(Entry { key: key.get_ref().to_string(), at, node: node(text, source, value)? });
    }
    // The crate sorts keys by name; the order of the file counts here.
    entries.sort_by_key(|e| e.at.start);
    Ok(Table(entries))
}

fn node(text: &str, source: usize, found: &Spanned<DeValue<'_>>) -> Result<Node, Fault> {
    let span = found.span();
    let quoted = matches!(found.get_ref(), DeValue::String(_));
    let at = At { source, start: span.start, end: span.end, quoted };
    let value = match found.get_ref() {
        DeValue::String(s) => Value::Text(s.to_string()),
        DeValue::Integer(i) => match i64::from_str_radix(i.as_str(), i.radix()) {
            Ok(exact) => Value::Number(exact as f64, exact.to_string()),
            Err(_) => Value::Number(number(at, i.as_str())?, i.as_str().to_owned()),
        },
        DeValue::Float(f) => Value::Number(number(at, f.as_str())?, f.as_str().to_owned()),
        DeValue::Boolean(b) => Value::Truth(*b),
        DeValue::Datetime(_) => Value::Date,
        DeValue::Array(a) => Value::List(a.iter().map(|n| node(text, source, n)).collect::<Result<_, _>>()?),
        DeValue::Table(t) => Value::Table(table(text, source, t)?),
    };
    Ok(Node { value, at })
}

fn number(at: At, text: &str) -> Result<f64, Fault> {
    text.parse::<f64>().map_err(|_| {
        Fault::at(At { quoted: false, ..at }, "this is not a number").advise("write numbers as 3, 1.5 or 2e-3")
    })
}

/// Start of the crate's message, what we say, and what to do.
const WORDS: &[(&str, &str, &str)] = &[
    ("invalid multi-line", "a text of several lines is not closed", "close it with the three quotes that open it"),
    ("invalid basic string", "a text is not closed", "close it with \" on the same line"),
    ("invalid literal string", "a text is not closed", "close it with ' on the same line"),
    (
        "unclosed table",
        "a table's head is not closed",
        "end it with ]; a name with spaces or signs needs quotes: [model.'soak time']",
    ),
    ("unclosed array", "a list is not closed", "end it with ]"),
    ("unclosed inline table", "a table is not closed", "end it with }"),
    ("missing comma", "a comma or the closing bracket is missing", "separate the members by commas and close the list"),
    (
        "string values must be quoted",
        "there is no value that can be read here",
        "put texts in quotes; write numbers as 3, 1.5 or 2e-3",
    ),
    ("invalid float", "this is neither a number nor a text", "put texts in quotes; write numbers as 3, 1.5 or 2e-3"),
    ("invalid integer", "this is neither a number nor a text", "put texts in quotes; write numbers as 3, 1.5 or 2e-3"),
    ("key with no value", "a key without a value", "write KEY = VALUE; a key with spaces or signs needs quotes"),
    (
        "invalid unquoted key",
        "this sign cannot stand in a plain key",
        "put keys in quotes unless they are letters, digits, _ and -",
    ),
    ("unquoted keys cannot be empty", "a key is missing", "write KEY = VALUE; a key with spaces or signs needs quotes"),
    ("unexpected key or value", "something follows the value", "write one key a line"),
    ("missing escaped value", "a backslash in a text starts an escape", "write \\\\, or put the text in single quotes"),
];

fn fault(text: &str, source: usize, error: &toml::de::Error, root: &DeTable<'_>) -> Fault {
    let span = error.span().unwrap_or(text.len()..text.len());
    let at = At { source, start: span.start, end: span.end, quoted: false };
    let message = error.message();
    if message.starts_with("duplicate key") {
        let key = text.get(span.clone()).unwrap_or("a key");
        let first = head_before(text, span.start)
            .or_else(|| first_use(root, key.trim_matches(['"', '\'']), span.start))
            .map(|start| text[..start].matches('\n').count() + 1)
            .map_or(String::new(), |line| format!(", first on line {line}"));
        return Fault::at(at, format!("{key} is given twice{first}")).advise("keep one of the two, or join the tables");
    }
    match WORDS.iter().find(|w| message.starts_with(w.0)) {
        Some((_, what, advice)) => Fault::at(at, *what).advise(*advice),
        None => Fault::at(at, format!("this is not valid TOML: {message}")),
    }
}

/// Where the same table's head stands before the one that holds byte `at`; the tree keeps only the later of the two.
fn head_before(text: &str, at: usize) -> Option<usize> {
    let from = text.get(..at)?.rfind('\n').map_or(0, |i| i + 1);
    let head = |line: &str| {
        let line: String = line.split('#').next().unwrap_or("").chars().filter(|c| !c.is_whitespace()).collect();
        line.starts_with('[').then(|| line.trim_matches(['[', ']']).to_owned())
    };
    let wanted = head(text[from..].lines().next()?)?;
    let mut start = 0;
    for line in text[..from].split_inclusive('\n') {
        if head(line).as_ref() == Some(&wanted) {
            return Some(start);
        }
        start += line.len();
    }
    None
}

/// Where a key of this name stands last before byte `before`: the one the second use collides with, or near it.
fn first_use(table: &DeTable<'_>, key: &str, before: usize) -> Option<usize> {
    let mut best = None;
    for (name, value) in table.iter() {
        let here = (name.get_ref() == key && name.span().start < before).then_some(name.span().start);
        let below = match value.get_ref() {
            DeValue::Table(t) => first_use(t, key, before),
            DeValue::Array(a) => {
                a.iter().filter_map(|n| n.get_ref().as_table()).filter_map(|t| first_use(t, key, before)).max()
            }
            _ => None,
        };
        best = best.max(here).max(below);
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tables_keep_the_order_of_the_file() {
        let t = document("[model]\nzeta = {start=1}\n[model.alpha]\nstart = 2\n[data]\nfile='x'\n", 0).unwrap();
        let keys: Vec<_> = t.0.iter().map(|e| e.key.as_str()).collect();
        assert_eq!(keys, ["model", "data"]);
        let Value::Table(model) = &t.node("model").unwrap().value else { panic!() };
        let keys: Vec<_> = model.0.iter().map(|e| e.key.as_str()).collect();
        assert_eq!(keys, ["zeta", "alpha"]);
    }

    #[test]
    fn broken_texts_say_what_to_do() {
        for (text, says, line) in [
            ("[model]\nfamily = \"x\n", "a text is not closed", 2),
            ("[model", "a table's head is not closed", 1),
            ("a = [1, 2", "a list is not closed", 1),
            ("a = \n", "no value", 1),
            ("a = 1\nb=2\na = 2\n", "a is given twice, first on line 1", 3),
            ("[m]\nx=1\n[n]\n[m]\ny=2\n", "m is given twice, first on line 1", 4),
            ("a = nope", "neither a number nor a text", 1),
            ("a b = 3", "a key without a value", 1),
            ("a = 0x", "not a number", 1),
            ("a = \"\\q\"", "a backslash", 1),
            ("a = 1 b = 2", "something follows", 1),
        ] {
            let fault = document(text, 0).unwrap_err();
            assert!(fault.message.contains(says), "{text:?}: {}", fault.message);
            let before = &text[..fault.at.unwrap().start.min(text.len())];
            assert_eq!(before.matches('\n').count() + 1, line, "{text:?}");
            assert!(fault.advice.is_some());
        }
    }

    #[test]
    fn values_of_the_command_line_keep_their_place() {
        let node = value("[1, 'b']", 3, 5).unwrap();
        assert_eq!(node.at.start, 5);
        let Value::List(list) = node.value else { panic!() };
        assert_eq!(list[1].at, At { source: 3, start: 9, end: 12, quoted: true });
        assert!(value("area > 0", 0, 0).is_none());
    }
}
