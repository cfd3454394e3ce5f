//! The study as a tree of values, each with its place: what the file and the command line are merged into.

use super::fault::Fault;
use super::source::At;

/// A value with its place.
#[derive(Debug, Clone, PartialEq)]
pub struct Node {
    /// The value.
    pub value: Value,
    /// Where it stands.
    pub at: At,
}

/// The kinds of value.
#[derive(Debug, Clone, PartialEq)]
pub enum Value {
    /// A text.
    Text(String),
    /// A number, and how it was written.
    Number(f64, String),
    /// True or false.
    Truth(bool),
    /// A list.
    List(Vec<Node>),
    /// A table, in the order of the file.
    Table(Table),
    /// A date or time: nothing in a study is one.
    Date,
}

/// A table: keys in the order of the file.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Table(pub Vec<Entry>);

/// A key with its value.
#[derive(Debug, Clone, PartialEq)]
pub struct Entry {
    /// The key without quotes.
    pub key: String,
    /// Where the key stands.
    pub at: At,
    /// Its value.
    pub node: Node,
}

impl Table {
    /// The entry of this key.
    pub fn get(&self, key: &str) -> Option<&Entry> {
        self.0.iter().find(|e| e.key == key)
    }

    /// The value of this key.
    pub fn node(&self, key: &str) -> Option<&Node> {
        self.get(key).map(|e| &e.node)
    }

    /// Sets a key, in place of what it held.
    pub fn set(&mut self, key: &str, at: At, node: Node) {
        match self.0.iter_mut().find(|e| e.key == key) {
            Some(entry) => (entry.at, entry.node) = (at, node),
            None => self.0.push(Entry { key: key.to_owned(), at, node }),
        }
    }

    /// Refuses keys that are not among these. `whose` names the table in the message.
    pub fn only(&self, whose: &str, keys: &[&str]) -> Result<(), Fault> {
        match self.0.iter().find(|e| !keys.contains(&e.key.as_str())) {
            None => Ok(()),
            Some(e) => Err(unknown(e, whose, keys)),
        }
    }
}

/// The fault of a key that nothing reads.
pub fn unknown(entry: &Entry, whose: &str, keys: &[&str]) -> Fault {
    let advice = match crate::expr::nearest(&entry.key, keys.iter().copied()) {
        Some(near) => format!("nearest name: {near}"),
        None => format!("{whose} takes {}", listed(keys)),
    };
    Fault::at(entry.at, format!("{whose} has no key {}", entry.key)).advise(advice)
}

/// `a, b and c`.
pub fn listed(words: &[&str]) -> String {
    match words {
        [] => String::new(),
        [one] => (*one).to_owned(),
        [first @ .., last] => format!("{} and {last}", first.join(", ")),
    }
}

impl Node {
    /// The kind in words, with an article.
    pub fn kind(&self) -> &'static str {
        match self.value {
            Value::Text(_) => "a text",
            Value::Number(..) => "a number",
            Value::Truth(_) => "true or false",
            Value::List(_) => "a list",
            Value::Table(_) => "a table",
            Value::Date => "a date",
        }
    }

    /// The fault of a value of the wrong kind.
    pub fn wrong(&self, key: &str, expected: &str) -> Fault {
        Fault::at(self.at, format!("{key} must be {expected}, not {}", self.kind()))
    }

    /// A text that is not empty.
    pub fn text(&self, key: &str, expected: &str) -> Result<String, Fault> {
        match &self.value {
            Value::Text(text) if text.trim().is_empty() => {
                Err(Fault::at(self.at, format!("{key} is empty"))
                    .advise(format!("give {expected}, or leave the key out")))
            }
            Value::Text(text) => Ok(text.clone()),
            _ => Err(self.wrong(key, expected)),
        }
    }

    /// A finite number.
    pub fn number(&self, key: &str) -> Result<f64, Fault> {
        match &self.value {
            Value::Number(value, _) if value.is_finite() => Ok(*value),
            Value::Number(..) => Err(Fault::at(self.at, format!("{key} must be a finite number"))),
            _ => Err(self.wrong(key, "a number")),
        }
    }

    /// A whole number of at least `least`.
    pub fn whole(&self, key: &str, least: u64) -> Result<u64, Fault> {
        let expected = format!("a whole number of at least {least}");
        match &self.value {
            Value::Number(value, written) => written
                .parse::<u64>()
                .ok()
                .or_else(|| (value.fract() == 0.0 && *value >= 0.0 && *value < 9e15).then_some(*value as u64))
                .filter(|v| *v >= least)
                .ok_or_else(|| Fault::at(self.at, format!("{key} must be {expected}, not {written}"))),
            _ => Err(self.wrong(key, &expected)),
        }
    }

    /// True or false.
    pub fn truth(&self, key: &str) -> Result<bool, Fault> {
        match self.value {
            Value::Truth(truth) => Ok(truth),
            _ => Err(self.wrong(key, "true or false")),
        }
    }

    /// A table.
    pub fn table(&self, key: &str, holds: &str) -> Result<&Table, Fault> {
        match &self.value {
            Value::Table(table) => Ok(table),
            _ => Err(self.wrong(key, &format!("a table of {holds}"))),
        }
    }

    /// A list of texts; one text alone is a list of one.
    pub fn texts(&self, key: &str, of: &str) -> Result<Vec<String>, Fault> {
        match &self.value {
            Value::Text(_) => Ok(vec![self.text(key, of)?]),
            Value::List(list) => list.iter().map(|n| n.text(key, of)).collect(),
            _ => Err(self.wrong(key, &format!("a list of {of}"))),
        }
    }
}
