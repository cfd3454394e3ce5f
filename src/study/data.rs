//! `[data]`: the file, how it is written, which rows and columns are wanted.

use super::fault::Fault;
use super::node::{Node, Table, Value};
use super::options::file;
use super::source::Sources;
use crate::data::{OnMissing, Request, Source, Unfold};

/// What a study says about its data. The columns wanted are for the model to say.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Data {
    /// Where the bytes come from; `None`: no data, one row of weight 1.
    pub source: Option<Source>,
    /// Everything but `wanted` and `pairs`.
    pub request: Request,
}

/// Keys of `[data]`.
pub const KEYS: &[&str] =
    &["file", "weight", "only", "on_missing", "missing", "delimiter", "decimal", "derive", "category", "unfold"];

/// Reads `[data]`.
pub fn data(table: &Table, sources: &Sources) -> Result<Data, Fault> {
    table.only("[data]", KEYS)?;
    let mut out = Data::default();
    let Some(name) = table.node("file") else {
        return match table.0.first() {
            None => Ok(out),
            Some(entry) => Err(Fault::at(entry.at, "there is no file that this could speak of")
                .advise("add file = \"NAME.csv\" under [data], or --data FILE")),
        };
    };
    let shown = name.text("file", "a file's name")?;
    out.source = Some(match shown.as_str() {
        "-" => Source::Stdin,
        _ => Source::File { path: file(name, "file", sources)?, shown },
    });
    let request = &mut out.request;
    let column = |key: &str| table.node(key).map(|n| n.text(key, "a column")).transpose();
    request.weight = column("weight")?;
    request.only = table.node("only").map(|n| n.text("only", "a condition")).transpose()?;
    if let Some(node) = table.node("on_missing") {
        request.on_missing = match node.text("on_missing", "\"stop\" or \"drop\"")?.as_str() {
            "stop" => OnMissing::Stop,
            "drop" => OnMissing::Drop,
            other => return Err(Fault::at(node.at, format!("on_missing is \"stop\" or \"drop\", not {other}"))),
        };
    }
    if let Some(node) = table.node("missing") {
        request.missing = match &node.value {
            Value::List(list) => list.iter().map(|n| label(n, "a mark")).collect::<Result<_, _>>()?,
            _ => vec![label(node, "missing")?],
        };
    }
    signs(table, request)?;
    if let Some(node) = table.node("derive") {
        for entry in &node.table("derive", "expressions, NAME = \"EXPRESSION\"")?.0 {
            request.derive.push((entry.key.clone(), super::model::piece(&entry.key, &entry.node)?));
        }
    }
    if let Some(node) = table.node("category") {
        for entry in &node.table("category", "levels, COLUMN = [\"FIRST\", \"SECOND\"] or []")?.0 {
            request.categories.push((entry.key.clone(), levels(&entry.key, &entry.node)?));
        }
    }
    if let Some(node) = table.node("unfold") {
        request.unfold = Some(unfold(node)?);
    }
    Ok(out)
}

fn signs(table: &Table, request: &mut Request) -> Result<(), Fault> {
    if let Some(node) = table.node("delimiter") {
        request.delimiter = match &node.value {
            Value::Text(text) if text == "tab" => '\t',
            Value::Text(text) => match (text.chars().next(), text.chars().nth(1)) {
                (Some(c), None) if c.is_ascii() && !c.is_ascii_alphanumeric() && !"\"\n\r.+-".contains(c) => c,
                _ => {
                    return Err(Fault::at(node.at, "delimiter must be one sign, such as , or ;")
                        .advise("for a tabulator write \"\\t\""));
                }
            },
            _ => return Err(node.wrong("delimiter", "a text of one sign")),
        };
    }
    if let Some(node) = table.node("decimal") {
        request.decimal = match node.text("decimal", "\".\" or \",\"")?.as_str() {
            "." => '.',
            "," => ',',
            other => return Err(Fault::at(node.at, format!("decimal is \".\" or \",\", not {other}"))),
        };
        if request.decimal == request.delimiter {
            return Err(Fault::at(node.at, "the sign between cells is the decimal sign too")
                .advise("say what stands between cells: delimiter = \";\""));
        }
    }
    Ok(())
}

/// A label: a text, or a number as it is written.
fn label(node: &Node, key: &str) -> Result<String, Fault> {
    match &node.value {
        Value::Text(text) => Ok(text.clone()),
        Value::Number(_, text) => Ok(text.clone()),
        _ => Err(node.wrong(key, "a text")),
    }
}

fn levels(column: &str, node: &Node) -> Result<Vec<String>, Fault> {
    let expected = "a list of levels, the first being the reference, or [] for those found";
    let Value::List(list) = &node.value else { return Err(node.wrong(column, expected)) };
    let mut out: Vec<String> = Vec::new();
    for member in list {
        let level = label(member, "a level")?;
        if out.contains(&level) {
            return Err(Fault::at(member.at, format!("two levels of {column} are called {level}")));
        }
        out.push(level);
    }
    if out.len() == 1 {
        return Err(Fault::at(node.at, format!("{column} has only one level"))
            .advise("name at least two, or [] for those found"));
    }
    Ok(out)
}

fn unfold(node: &Node) -> Result<Unfold, Fault> {
    let table = node.table("unfold", "columns, label and value")?;
    table.only("[data.unfold]", &["columns", "label", "value"])?;
    let need = |key: &str| {
        table.node(key).ok_or_else(|| {
            Fault::at(node.at, format!("[data.unfold] has no {key}"))
                .advise("it needs columns (the count columns), label and value (the names of the two columns made)")
        })
    };
    let columns = need("columns")?.texts("columns", "count columns")?;
    if columns.is_empty() {
        return Err(Fault::at(need("columns")?.at, "columns is empty").advise("name the count columns"));
    }
    let (label, value) = (need("label")?.text("label", "a name")?, need("value")?.text("value", "a name")?);
    Ok(Unfold { columns, label, value })
}
