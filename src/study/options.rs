//! `[options]`: how the study is fitted and how the answer is given. All defaults live here.

use std::path::PathBuf;

use super::fault::Fault;
use super::node::{Node, Table, Value, listed};
use super::source::Sources;
use crate::expr::nearest;
use crate::infer::Tests;
use crate::likelihood::Information;

/// How an answer is written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Format {
    /// Prose.
    #[default]
    Text,
    /// One JSON document.
    Json,
    /// One line a fit.
    Csv,
}

/// Everything about a run that is not the model.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Kind of information; `None` takes the family's default.
    pub information: Option<Information>,
    /// Tests wanted.
    pub tests: Tests,
    /// Coverage of the intervals.
    pub confidence: f64,
    /// Starting points; `None` leaves it to the solver.
    pub starts: Option<usize>,
    /// Seed of the spread starts.
    pub seed: u64,
    /// Where the iterations are written.
    pub trace: Option<PathBuf>,
    /// How the answer is written.
    pub format: Format,
    /// Where the answer is written; `None` is standard output.
    pub output: Option<PathBuf>,
    /// Whether messages that are no errors are kept back.
    pub quiet: bool,
    /// Threads; `None` takes what the machine has.
    pub threads: Option<usize>,
    /// Whether the seconds spent are told.
    pub timings: bool,
    /// Level under which the gate closes.
    pub gate: Option<f64>,
}

impl Default for Settings {
    fn default() -> Self {
        Settings {
            information: None,
            tests: Tests::ALL,
            confidence: 0.95,
            starts: None,
            seed: 1,
            trace: None,
            format: Format::Text,
            output: None,
            quiet: false,
            threads: None,
            timings: false,
            gate: None,
        }
    }
}

/// Keys of `[options]`.
pub const KEYS: &[&str] = &[
    "information",
    "tests",
    "confidence",
    "starts",
    "seed",
    "trace",
    "format",
    "output",
    "quiet",
    "threads",
    "timings",
    "gate",
    "drop",
];

/// Reads `[options]` over the defaults.
pub fn settings(table: &Table, sources: &Sources) -> Result<Settings, Fault> {
    let mut out = Settings::default();
    for entry in &table.0 {
        let (key, node) = (entry.key.as_str(), &entry.node);
        match key {
            "information" => {
                let words = Information::ALL.map(Information::text);
                out.information = Some(choice(node, key, &words, &Information::ALL)?);
            }
            "tests" => out.tests = tests(node)?,
            "confidence" => out.confidence = fraction(node, key)?,
            "starts" => out.starts = Some(node.whole(key, 1)?.min(1 << 20) as usize),
            "seed" => out.seed = node.whole(key, 0)?,
            "trace" => out.trace = Some(file(node, key, sources)?),
            "format" => {
                out.format = choice(node, key, &["text", "json", "csv"], &[Format::Text, Format::Json, Format::Csv])?;
            }
            "output" => out.output = Some(file(node, key, sources)?),
            "quiet" => out.quiet = node.truth(key)?,
            "threads" => out.threads = Some(node.whole(key, 1)?.min(4096) as usize),
            "timings" => out.timings = node.truth(key)?,
            "gate" => out.gate = Some(fraction(node, key)?),
            "drop" => {}
            _ => {
                let study = super::with::KEYS.iter().find(|(option, _)| option[2..].replace('-', "_") == key);
                return Err(match study {
                    Some((_, place)) => {
                        Fault::at(entry.at, format!("{key} is no option but the key {place}")).advise("move it there")
                    }
                    None => super::node::unknown(entry, "[options]", KEYS),
                });
            }
        }
    }
    if let (Some(_), false, Some(node)) = (out.gate, out.tests.score, table.node("gate")) {
        return Err(Fault::at(node.at, "the gate reads the score test, and that is not among the tests wanted")
            .advise("add score to tests, or take the gate out"));
    }
    Ok(out)
}

/// The names under `drop`.
pub fn drop(table: &Table) -> Result<Vec<(String, super::source::At)>, Fault> {
    let Some(node) = table.node("drop") else { return Ok(Vec::new()) };
    match &node.value {
        Value::List(list) => list.iter().map(|n| Ok((n.text("drop", "names of restrictions")?, n.at))).collect(),
        _ => Ok(vec![(node.text("drop", "names of restrictions")?, node.at)]),
    }
}

/// A file's path: relative to the folder of the source that names it.
pub fn file(node: &Node, key: &str, sources: &Sources) -> Result<PathBuf, Fault> {
    let text = node.text(key, "a file's name")?;
    let folder = sources.get(node.at.source).map(|s| s.folder.clone()).unwrap_or_default();
    Ok(folder.join(text))
}

fn choice<T: Copy>(node: &Node, key: &str, words: &[&str], values: &[T]) -> Result<T, Fault> {
    let text = node.text(key, &format!("one of {}", listed(words)))?;
    if let Some(value) = words.iter().position(|w| *w == text).and_then(|i| values.get(i)) {
        return Ok(*value);
    }
    Err(Fault::at(node.at, format!("{key} cannot be {text}")).advise(match nearest(&text, words.iter().copied()) {
        Some(near) => format!("nearest name: {near}"),
        None => format!("it is one of {}", listed(words)),
    }))
}

fn fraction(node: &Node, key: &str) -> Result<f64, Fault> {
    let value = node.number(key)?;
    if value > 0.0 && value < 1.0 {
        return Ok(value);
    }
    Err(Fault::at(node.at, format!("{key} must lie between 0 and 1, not at {value}")).advise(if key == "gate" {
        "0.05, for example"
    } else {
        "0.95, for example"
    }))
}

fn tests(node: &Node) -> Result<Tests, Fault> {
    let expected = "score, lr, wald, or some of them";
    let words: Vec<String> = match &node.value {
        Value::Text(_) => node.text("tests", expected)?.split(',').map(|w| w.trim().to_owned()).collect(),
        _ => node.texts("tests", expected)?,
    };
    let mut out = Tests { score: false, lr: false, wald: false };
    for word in &words {
        match word.as_str() {
            "score" => out.score = true,
            "lr" => out.lr = true,
            "wald" => out.wald = true,
            other => {
                return Err(
                    Fault::at(node.at, format!("no test is called {other}")).advise(format!("tests are {expected}"))
                );
            }
        }
    }
    if words.is_empty() {
        return Err(Fault::at(node.at, "tests is empty").advise(format!("name {expected}")));
    }
    Ok(out)
}
