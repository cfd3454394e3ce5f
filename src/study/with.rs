//! What the command line lays over the file: the study's keys as options, `--with`, restrictions.

use std::path::PathBuf;

use super::fault::Fault;
use super::node::{Entry, Node, Table, Value};
use super::read;
use super::source::{At, Source, Sources};

/// The parts of a command line that speak about the study, as written.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Overlay {
    /// Options that stand for a key, in the order given.
    pub keys: Vec<Given>,
    /// `--with KEY=VALUE`.
    pub with: Vec<String>,
    /// `--maintained 'NAME: EQUATION'`.
    pub maintained: Vec<String>,
    /// `--tested 'NAME: EQUATION'`.
    pub tested: Vec<String>,
    /// `--drop NAME`.
    pub drop: Vec<String>,
}

/// An option that stands for a key of the study.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Given {
    /// The option, such as `--response-lower`.
    pub option: &'static str,
    /// The key, such as `model.response_lower`.
    pub key: &'static str,
    /// Its value as written.
    pub value: String,
}

/// Options of the command line that stand for keys of `[data]` and `[model]`.
pub const KEYS: &[(&str, &str)] = &[
    ("--data", "data.file"),
    ("--family", "model.family"),
    ("--response", "model.response"),
    ("--response-lower", "model.response_lower"),
    ("--response-upper", "model.response_upper"),
    ("--weight", "data.weight"),
    ("--exposure", "model.exposure"),
    ("--trials", "model.trials"),
    ("--event", "model.event"),
    ("--per", "model.per"),
];

/// Lays the command line's keys over the tree: `--with` first, so that the options win.
pub fn lay(root: &mut Table, overlay: &Overlay, sources: &mut Sources) -> Result<(), Fault> {
    for text in &overlay.with {
        with(root, text, sources)?;
    }
    for given in &overlay.keys {
        let source = command_line(sources, given.option, &given.value);
        let node = option_value(given, source);
        let path: Vec<String> = given.key.split('.').map(str::to_owned).collect();
        set(root, &path, node.at, node)?;
    }
    Ok(())
}

/// A new source for an option and its value.
pub fn command_line(sources: &mut Sources, option: &str, text: &str) -> usize {
    let name = format!("command line, {option}");
    sources.push(Source { name, text: text.to_owned(), numbered: false, folder: PathBuf::new() })
}

/// The value of an option: a list or a table where one is written as such; for options of `[options]` and for the
/// trials whatever TOML makes of it; else the text itself.
fn option_value(given: &Given, source: usize) -> Node {
    let text = given.value.as_str();
    let free = given.key.starts_with("options.") || given.key == "model.trials";
    if free || text.starts_with(['[', '{']) {
        plain(text, source, 0)
    } else {
        Node { value: Value::Text(text.to_owned()), at: whole(source, 0, text) }
    }
}

/// A value read as TOML, else as text.
fn plain(text: &str, source: usize, offset: usize) -> Node {
    let trimmed = text.trim();
    let inner = offset + (text.len() - text.trim_start().len());
    match read::value(trimmed, source, inner) {
        Some(node) if !matches!(node.value, Value::Date) => node,
        _ => Node { value: Value::Text(trimmed.to_owned()), at: whole(source, inner, trimmed) },
    }
}

fn whole(source: usize, start: usize, text: &str) -> At {
    At { source, start, end: start + text.len(), quoted: false }
}

fn with(root: &mut Table, text: &str, sources: &mut Sources) -> Result<(), Fault> {
    let source = command_line(sources, "--with", text);
    let Some((key, value)) = text.split_once('=') else {
        return Err(Fault::at(whole(source, 0, text), "there is no = in it").advise("write --with KEY=VALUE"));
    };
    let at = At { quoted: false, ..whole(source, 0, key.trim_end()) };
    let path = path(key).ok_or_else(|| {
        Fault::at(at, "this is not a key of a study").advise("write dotted keys, such as model.rate.start=0.1")
    })?;
    set(root, &path, at, plain(value, source, key.len() + 1))
}

/// The pieces of a dotted key, quoted as TOML quotes them.
fn path(key: &str) -> Option<Vec<String>> {
    let mut table = read::document(&format!("{key} = 0"), 0).ok()?;
    let mut pieces = Vec::new();
    loop {
        let Entry { key, node, .. } = table.0.pop().filter(|_| table.0.is_empty())?;
        pieces.push(key);
        match node.value {
            Value::Table(inner) => table = inner,
            _ => return Some(pieces),
        }
    }
}

/// Sets the value at a path, making tables on the way. A member of a list of tables is meant by its place from 1 or by
/// its `name`.
fn set(table: &mut Table, path: &[String], at: At, node: Node) -> Result<(), Fault> {
    let Some((first, rest)) = path.split_first() else { return Ok(()) };
    if rest.is_empty() {
        table.set(first, at, node);
        return Ok(());
    }
    if table.get(first).is_none() {
        table.set(first, at, Node { value: Value::Table(Table::default()), at });
    }
    let Some(entry) = table.0.iter_mut().find(|e| e.key == *first) else { return Ok(()) };
    match &mut entry.node.value {
        Value::Table(inner) => set(inner, rest, at, node),
        Value::List(members) => {
            let position = members.iter().position(|m| is_named(m, &rest[0]));
            let index = position.or_else(|| rest[0].parse::<usize>().ok().and_then(|i| i.checked_sub(1)));
            match index.and_then(|i| members.get_mut(i)).map(|m| &mut m.value) {
                Some(Value::Table(inner)) => set(inner, &rest[1..], at, node),
                _ => Err(Fault::at(at, format!("{first} has no member {}", rest[0]))
                    .advise("mean a member by its name, or by its place from 1")),
            }
        }
        _ => Err(Fault::at(at, format!("{first} is a plain value in the study, not a table"))
            .advise("set the key itself, without a dot after it")),
    }
}

fn is_named(member: &Node, name: &str) -> bool {
    let Value::Table(table) = &member.value else { return false };
    matches!(table.node("name").map(|n| &n.value), Some(Value::Text(t)) if t == name)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn laid(file: &str, overlay: &Overlay) -> Result<Table, Fault> {
        let mut sources = Sources::default();
        sources.push(Source { text: file.into(), ..Source::default() });
        let mut root = read::document(file, 0)?;
        lay(&mut root, overlay, &mut sources)?;
        Ok(root)
    }

    fn value(root: &Table, path: &[&str]) -> Value {
        let mut node = root.node(path[0]).unwrap();
        for piece in &path[1..] {
            let Value::Table(table) = &node.value else { panic!("{piece}") };
            node = table.node(piece).unwrap();
        }
        node.value.clone()
    }

    fn given(with: &[&str]) -> Overlay {
        Overlay { with: with.iter().map(|s| s.to_string()).collect(), ..Overlay::default() }
    }

    #[test]
    fn values_are_toml_or_text_and_split_at_the_first_equals() {
        let root = laid("", &given(&["data.only=area >= 2", "a.'b c'.d = [1]", "tested.x=a = b", "n=0x10"])).unwrap();
        assert_eq!(value(&root, &["data", "only"]), Value::Text("area >= 2".into()));
        assert!(matches!(value(&root, &["a", "b c", "d"]), Value::List(_)));
        assert_eq!(value(&root, &["tested", "x"]), Value::Text("a = b".into()));
        assert_eq!(value(&root, &["n"]), Value::Number(16.0, "16".into()));
    }

    #[test]
    fn options_win_over_with_and_with_over_the_file() {
        let mut overlay = given(&["model.family=poisson", "model.response=z"]);
        overlay.keys.push(Given { option: "--family", key: "model.family", value: "normal".into() });
        let root = laid("[model]\nfamily = 'binomial'\nresponse = 'y'\n", &overlay).unwrap();
        assert_eq!(value(&root, &["model", "family"]), Value::Text("normal".into()));
        assert_eq!(value(&root, &["model", "response"]), Value::Text("z".into()));
    }

    #[test]
    fn members_of_lists_are_meant_by_name_or_place() {
        let file = "[[model.component]]\nname='a'\n[[model.component]]\nname='b'\n";
        let root = laid(file, &given(&["model.component.b.known.mean=2", "model.component.1.family=x"])).unwrap();
        let Value::List(list) = value(&root, &["model", "component"]) else { panic!() };
        assert!(matches!(&list[1].value, Value::Table(t) if t.get("known").is_some()));
        assert!(matches!(&list[0].value, Value::Table(t) if t.get("family").is_some()));
        assert!(laid(file, &given(&["model.component.3.family=x"])).is_err());
        assert!(laid(file, &given(&["nothing"])).is_err());
        assert!(laid(file, &given(&["a b=1"])).is_err());
        assert!(laid("title='x'", &given(&["title.b=1"])).is_err());
    }
}
