//! The study: a TOML file and the command line laid over it, read into the types of the floors below. Every value
//! keeps its place, so that a fault found on any floor can be shown where it was written.

mod component;
pub mod data;
pub mod fault;
mod model;
pub mod names;
mod node;
pub mod options;
mod parameter;
pub mod place;
mod read;
pub mod restrictions;
pub mod source;
pub mod with;

pub use data::Data;
pub use fault::StudyError;
pub use options::{Format, Settings};
pub use place::Places;
pub use restrictions::Quantity;
pub use source::Shown;
pub use with::{Given, Overlay};

use std::path::{Path, PathBuf};

use crate::likelihood::Model;
use crate::restriction::Draft;
use fault::Fault;
use node::{Node, Table, Value};
use source::{Source, Sources};

/// A study, read and checked as far as it can be without its data.
#[derive(Debug, Clone)]
pub struct Study {
    /// Its title; the file's name without ending where it gives none.
    pub title: String,
    /// The data wanted.
    pub data: Data,
    /// The model.
    pub model: Model,
    /// Restrictions: maintained, tested, then those of the command line.
    pub restrictions: Vec<Draft>,
    /// Names under `--drop` that are no whole restriction; they may be links of a chain.
    pub drop: Vec<String>,
    /// Expressions whose value is wanted.
    pub quantities: Vec<Quantity>,
    /// How to fit and how to answer.
    pub settings: Settings,
    /// Where everything stands.
    pub places: Places,
}

/// The tables of a study.
const KEYS: &[&str] = &["title", "data", "model", "quantities", "maintained", "tested", "options"];

impl Study {
    /// Reads the file, if one is named, and lays the command line over it.
    ///
    /// # Errors
    /// [`StudyError::File`] when the file cannot be read; [`StudyError::Wrong`] with place, picture and advice when the
    /// study or the command line is wrong.
    pub fn read(path: Option<&Path>, overlay: &Overlay) -> Result<Study, StudyError> {
        let Some(path) = path else { return Study::from_text("", "", PathBuf::new(), overlay) };
        let name = path.display().to_string();
        let bytes = std::fs::read(path).map_err(|why| StudyError::File { path: name.clone(), why })?;
        let folder = path.parent().map(Path::to_path_buf).unwrap_or_default();
        match std::str::from_utf8(&bytes) {
            Ok(text) => Study::from_text(text, &name, folder, overlay).map_err(|e| of_a_table(path, e)),
            Err(e) => {
                let line = bytes[..e.valid_up_to()].iter().filter(|b| **b == b'\n').count() + 1;
                Err(StudyError::Wrong(Shown {
                    place: format!("{name}, line {line}"),
                    message: "the file is not UTF-8 text".into(),
                    advice: Some("a study is TOML in UTF-8; save it so (was a data file given as the study?)".into()),
                    picture: None,
                }))
            }
        }
    }

    /// Reads a study from its text. `name` is what messages call it, `folder` where its relative paths start.
    ///
    /// # Errors
    /// [`StudyError::Wrong`] with place, picture and advice.
    pub fn from_text(text: &str, name: &str, folder: PathBuf, overlay: &Overlay) -> Result<Study, StudyError> {
        let mut sources = Sources::default();
        sources.push(Source { name: name.to_owned(), text: text.to_owned(), numbered: true, folder });
        let mut places = Places::new(sources);
        build(text, name, overlay, &mut places).map_err(|fault| {
            let mut shown = fault.show(&places.sources);
            if fault.at.is_none() {
                shown.place = if name.is_empty() { "command line".into() } else { name.to_owned() };
            }
            StudyError::Wrong(shown)
        })
    }

    /// How many of the restrictions have this role.
    pub fn count(&self, role: crate::restriction::Role) -> usize {
        self.restrictions.iter().filter(|d| d.role == role).count()
    }
}

/// A CSV file given as a study is told so.
fn of_a_table(path: &Path, error: StudyError) -> StudyError {
    let table =
        path.extension().is_some_and(|e| ["csv", "tsv", "txt", "dat"].iter().any(|t| e.eq_ignore_ascii_case(t)));
    match error {
        StudyError::Wrong(shown) if table => {
            let advice = format!("a study is a TOML file; data are given as --data {}", path.display());
            StudyError::Wrong(Shown { advice: Some(advice), ..shown })
        }
        other => other,
    }
}

fn build(text: &str, name: &str, overlay: &Overlay, places: &mut Places) -> Result<Study, Fault> {
    let mut root = read::document(text, 0)?;
    with::lay(&mut root, overlay, &mut places.sources)?;
    if root.0.is_empty() {
        return Err(if name.is_empty() {
            Fault::of_all("there is nothing to fit")
                .advise("name a study file, or give --data FILE --family NAME --response COLUMN")
        } else {
            Fault::of_all("the study is empty").advise("it needs at least [data] with file and [model] with family")
        });
    }
    known(&root)?;
    note("", &root, places);
    let empty = Table::default();
    let part = |key: &str, holds: &str| root.node(key).map_or(Ok(&empty), |n| n.table(key, holds));
    let model = model::model(part("model", "settings")?)?;
    let options = part("options", "settings")?;
    let settings = options::settings(options, &places.sources)?;
    let data = data::data(part("data", "settings")?, &places.sources)?;
    let mut dropped = options::drop(options)?;
    dropped.extend(restrictions::dropped(&overlay.drop, &mut places.sources));
    let read = restrictions::read(&root, overlay, &dropped, places)?;
    one_name(&root, &model)?;
    let title = match root.node("title") {
        Some(node) => node.text("title", "a text")?,
        None => Path::new(name).file_stem().map(|s| s.to_string_lossy().into_owned()).unwrap_or_default(),
    };
    let (restrictions, drop, quantities) = (read.drafts, read.drop, read.quantities);
    Ok(Study { title, data, model, restrictions, drop, quantities, settings, places: places.clone() })
}

/// Refuses unknown tables, and says where a stray key belongs.
fn known(root: &Table) -> Result<(), Fault> {
    let Some(entry) = root.0.iter().find(|e| !KEYS.contains(&e.key.as_str())) else { return Ok(()) };
    let key = entry.key.as_str();
    let home = [("data", data::KEYS), ("model", model::KEYS), ("options", options::KEYS)]
        .iter()
        .find(|(_, keys)| keys.contains(&key))
        .map(|h| h.0);
    Err(match home {
        Some(home) => {
            Fault::at(entry.at, format!("{key} stands outside its table")).advise(format!("it belongs under [{home}]"))
        }
        None => node::unknown(entry, "a study", KEYS),
    })
}

/// Notes the place of every value. A component's `known.mean` is also `mean.known` and `mean`, as the model speaks of it.
fn note(prefix: &str, table: &Table, places: &mut Places) {
    for entry in &table.0 {
        let place = if prefix.is_empty() { entry.key.clone() } else { format!("{prefix}.{}", entry.key) };
        note_node(&place, &entry.node, places);
        if prefix.starts_with("model.component.")
            && let Value::Table(inner) = &entry.node.value
        {
            for e in &inner.0 {
                places.note(format!("{prefix}.{}.{}", e.key, entry.key), e.node.at);
                places.note(format!("{prefix}.{}", e.key), e.at);
            }
        }
    }
}

fn note_node(place: &str, node: &Node, places: &mut Places) {
    places.note(place, node.at);
    match &node.value {
        Value::Table(table) => note(place, table, places),
        Value::List(list) => {
            for (i, member) in list.iter().enumerate() {
                note_node(&format!("{place}.{i}"), member, places);
            }
        }
        _ => {}
    }
}

/// Quantities share their names with parameters and pieces: all can stand in an expression.
fn one_name(root: &Table, model: &Model) -> Result<(), Fault> {
    let Some(Node { value: Value::Table(quantities), .. }) = root.node("quantities") else { return Ok(()) };
    for entry in &quantities.0 {
        let parameter = model.parameters.iter().any(|p| p.name == entry.key);
        if parameter || model.lets.iter().any(|l| l.0 == entry.key) {
            let other = if parameter { "a parameter" } else { "a piece in [model.let]" };
            return Err(Fault::at(entry.at, format!("two things are called {}: a quantity and {other}", entry.key))
                .advise("rename one of them"));
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests;
