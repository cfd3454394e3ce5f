//! The house's floors: who imports whom, which outside crate lives where, how long a file is.

use std::path::{Path, PathBuf};

use crate::harness::root;

/// Floors from the ground up, with what each may import and the outside crates it alone (or with the others named) uses.
const FLOORS: &[(&str, &[&str])] = &[
    ("math", &[]),
    ("expr", &["math"]),
    ("data", &["expr"]),
    ("family", &["math", "expr"]),
    ("likelihood", &["math", "expr", "data", "family"]),
    ("restriction", &["math", "expr"]),
    ("solve", &["math", "likelihood", "restriction"]),
    ("infer", &["math", "expr", "data", "family", "likelihood", "restriction", "solve"]),
    ("study", &["math", "expr", "data", "family", "likelihood", "restriction", "solve", "infer"]),
    ("report", &["infer", "solve"]),
    ("cli", &["math", "expr", "data", "family", "likelihood", "restriction", "solve", "infer", "study", "report"]),
];

/// Outside crates and the floors that may name them.
const CRATES: &[(&str, &[&str])] = &[
    ("nalgebra", &["math"]),
    ("rand_chacha", &["math"]),
    ("statrs", &["math"]),
    ("csv", &["data"]),
    ("rayon", &["likelihood"]),
    ("argmin", &["solve"]),
    ("toml", &["study"]),
    ("serde", &["study"]),
    ("serde_json", &["report"]),
    ("clap", &["cli"]),
];

/// Files past 450 lines, each with the reason it is owed.
const LONG: &[(&str, &str)] =
    &[("expr/graph.rs", "every way to make a node keeps the same normal form; apart they would drift")];

fn files(folder: &Path, out: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            files(&path, out);
        } else if path.extension().is_some_and(|e| e == "rs") {
            out.push(path);
        }
    }
}

/// Every source file as (path from src, text without comments and without its unit tests).
fn sources() -> Vec<(String, String)> {
    let mut paths = Vec::new();
    files(&root().join("src"), &mut paths);
    paths.sort();
    let tests = test_files(&paths);
    paths
        .iter()
        .filter(|p| !tests.iter().any(|t| p.starts_with(t)))
        .map(|p| {
            let text = std::fs::read_to_string(p).unwrap();
            let body = text.split("#[cfg(test)]\nmod tests {").next().unwrap();
            let code = body.lines().filter(|l| !l.trim_start().starts_with("//")).collect::<Vec<_>>().join("\n");
            (p.strip_prefix(root().join("src")).unwrap().to_string_lossy().replace('\\', "/"), code)
        })
        .collect()
}

/// Files and folders that hold unit tests only: declared as `#[cfg(test)] mod NAME;`.
fn test_files(paths: &[PathBuf]) -> Vec<PathBuf> {
    let mut out = Vec::new();
    for path in paths {
        let text = std::fs::read_to_string(path).unwrap();
        let home = if path.file_name().is_some_and(|n| n == "mod.rs" || n == "lib.rs") {
            path.parent().unwrap().to_owned()
        } else {
            path.with_extension("")
        };
        for rest in text.split("#[cfg(test)]\nmod ").skip(1) {
            let name: String = rest.chars().take_while(|c| c.is_ascii_alphanumeric() || *c == '_').collect();
            if rest[name.len()..].starts_with(';') {
                out.extend([home.join(format!("{name}.rs")), home.join(&name)]);
            }
        }
    }
    out
}

fn floor(path: &str) -> &str {
    path.split('/').next().unwrap()
}

/// The words that follow each `crate::` (one, or those in its braces).
fn named_after_crate(code: &str) -> Vec<String> {
    let mut out = Vec::new();
    for (at, _) in code.match_indices("crate::") {
        if at > 0 && (code.as_bytes()[at - 1].is_ascii_alphanumeric() || code.as_bytes()[at - 1] == b'_') {
            continue;
        }
        let rest = &code[at + "crate::".len()..];
        let list = if let Some(inside) = rest.strip_prefix('{') {
            top_level_words(inside)
        } else {
            vec![rest.chars().take_while(|c| c.is_ascii_alphanumeric() || *c == '_').collect()]
        };
        out.extend(list);
    }
    out
}

/// First words of the comma-separated items up to the closing brace.
fn top_level_words(text: &str) -> Vec<String> {
    let (mut depth, mut word, mut fresh, mut out) = (0, String::new(), true, Vec::new());
    for c in text.chars() {
        match c {
            '{' => depth += 1,
            '}' if depth == 0 => break,
            '}' => depth -= 1,
            ',' if depth == 0 => {
                out.push(std::mem::take(&mut word));
                fresh = true;
            }
            c if depth == 0 && fresh && (c.is_ascii_alphanumeric() || c == '_') => word.push(c),
            c if depth == 0 && !c.is_whitespace() => fresh = false,
            _ => {}
        }
    }
    out.push(word);
    out.retain(|w| !w.is_empty());
    out
}

#[test]
fn a_floor_imports_only_the_floors_below_it() {
    let mut faults = Vec::new();
    for (path, code) in sources() {
        let Some((own, below)) = FLOORS.iter().find(|f| f.0 == floor(&path)) else { continue };
        for name in named_after_crate(&code) {
            if name != *own && !below.contains(&name.as_str()) {
                faults.push(format!("{path} names crate::{name}"));
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn every_floor_is_in_the_table() {
    for (path, _) in sources() {
        let known = ["lib.rs", "main.rs"].contains(&path.as_str()) || FLOORS.iter().any(|f| f.0 == floor(&path));
        assert!(known, "{path} is on no floor");
    }
}

#[test]
fn outside_crates_stay_on_their_floors() {
    let mut faults = Vec::new();
    for (path, code) in sources() {
        for (name, floors) in CRATES {
            let used = code.match_indices(&format!("{name}::")).any(|(at, _)| {
                let before = code[..at].chars().next_back().unwrap_or(' ');
                !before.is_ascii_alphanumeric() && before != '_' && before != ':'
            });
            if used && !floors.contains(&floor(&path)) {
                faults.push(format!("{path} uses {name}"));
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn only_the_command_line_prints() {
    for (path, code) in sources() {
        for word in ["println!", "eprintln!", "print!(", "eprint!(", "dbg!("] {
            assert!(!code.contains(word) || floor(&path) == "cli", "{path} has {word}");
        }
    }
}

#[test]
fn no_globs_and_no_shapeless_rooms() {
    for (path, code) in sources() {
        for line in
            code.lines().filter(|l| l.trim_start().starts_with("use ") || l.trim_start().starts_with("pub use "))
        {
            assert!(!line.contains("::*"), "{path}: {line}");
        }
        assert!(!path.contains("util") && !path.contains("prelude"), "{path}");
    }
}

#[test]
fn a_long_file_owes_a_reason() {
    let mut paths = Vec::new();
    files(&root().join("src"), &mut paths);
    let mut faults = Vec::new();
    for p in paths {
        let lines = std::fs::read_to_string(&p).unwrap().lines().count();
        let name = p.strip_prefix(root().join("src")).unwrap().to_string_lossy().into_owned();
        if lines > 450 && !LONG.iter().any(|l| l.0 == name && !l.1.is_empty()) {
            faults.push(format!("{name} has {lines} lines"));
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

/// The scanner itself: a test of floors that cannot see an import would pass for ever.
#[test]
fn the_scanner_sees_imports() {
    let code = "use crate::{math::{Matrix, Vector}, expr};\nfn f() -> crate::solve::Fit { my_crate::x() }";
    assert_eq!(named_after_crate(code), ["math", "expr", "solve"]);
}
