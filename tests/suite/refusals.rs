//! What is said of wrong input, word by word and kind by kind; that nothing is left behind and nothing panics.

use crate::harness::{Answer, Folder};

const ROWS: &str = "y,x,kiln,w\n1.2,0.5,north,1\n2.3,1.5,south,2\n2.9,2.5,north,1\n4.1,3.5,south,3\n5.2,4.5,north,2\n";
const HEAD: &str = "[data]\nfile = \"d.csv\"\n";
const NORMAL: &str = "[model]\nfamily = \"normal\"\nresponse = \"y\"\n";
const TESTED: &str = "[tested]\nzero = \"mean = 0\"\n";

fn run(data: &str, study: &str, options: &[&str]) -> Answer {
    let folder = Folder::new();
    folder.write("d.csv", data);
    folder.write("s.toml", study);
    folder.run(&[&["fit", "s.toml"], options].concat())
}

/// The status is right, the message holds these parts, nothing stands on standard output, nothing panicked.
fn refused(what: &str, answer: &Answer, status: i32, parts: &[&str]) {
    assert!(!answer.err.contains("panicked"), "{what}: {}", answer.err);
    assert_eq!(answer.status, status, "{what}: {}{}", answer.err, answer.out);
    assert!(answer.out.is_empty(), "{what}: {}", answer.out);
    for part in parts {
        assert!(answer.err.contains(part), "{what}: lacks {part:?}:\n{}", answer.err);
    }
}

fn normal() -> String {
    format!("{HEAD}{NORMAL}{TESTED}")
}

#[test]
fn data_that_cannot_be_used() {
    let with = |change: &dyn Fn(&str) -> String| change(ROWS);
    for (what, data, study, parts) in [
        (
            "missing column",
            ROWS.into(),
            format!("{HEAD}[model]\nfamily = \"normal\"\nresponse = \"z\"\n"),
            vec!["z", "d.csv"],
        ),
        ("near miss", ROWS.into(), format!("{HEAD}{NORMAL}[model.mean]\nterms = [\"kilm\"]\n"), vec!["kilm", "kiln"]),
        ("empty file", String::new(), normal(), vec!["d.csv", "empty"]),
        ("header only", "y,x,kiln,w\n".into(), normal(), vec!["d.csv", "row"]),
        ("text in numbers", with(&|r| r.replace("2.9", "much")), normal(), vec!["line 4", "column y", "much"]),
        (
            "negative weight",
            with(&|r| r.replace("south,3", "south,-3")),
            format!("{HEAD}weight = \"w\"\n{NORMAL}{TESTED}"),
            vec!["line 5", "column w", "-3"],
        ),
        (
            "all weights zero",
            "y,w\n1,0\n2,0\n3,0\n".into(),
            format!("{HEAD}weight = \"w\"\n{NORMAL}{TESTED}"),
            vec!["weight"],
        ),
        ("infinite value", with(&|r| r.replace("2.9", "inf")), normal(), vec!["line 4", "column y", "inf"]),
        ("missing cell", with(&|r| r.replace("2.9", "")), normal(), vec!["line 4", "column y", "on_missing"]),
        ("ragged rows", with(&|r| r.replace("2.9,2.5,north,1", "2.9,2.5")), normal(), vec!["line 4"]),
        (
            "a fraction among counts",
            "n\n1\n2.5\n".into(),
            format!("{HEAD}[model]\nfamily = \"poisson\"\nresponse = \"n\"\n"),
            vec!["line 3", "column n", "2.5"],
        ),
        (
            "ends the wrong way round",
            "a,b\n1,2\n4,3\n".into(),
            format!("{HEAD}[model]\nfamily = \"normal\"\nresponse_lower = \"a\"\nresponse_upper = \"b\"\n"),
            vec!["line 3"],
        ),
    ] {
        refused(what, &run(&data, &study, &[]), 3, &parts);
    }
}

#[test]
fn studies_that_are_wrong() {
    let study = normal();
    let file = |more: &str| format!("{study}{more}");
    for (what, text, options, parts) in [
        (
            "unknown parameter",
            file("other = \"man = 1\"\n"),
            vec![],
            vec![
                "s.toml, line 8: no parameter is called man",
                "other = \"man = 1\"",
                "         ^^^",
                "nearest name: mean",
            ],
        ),
        ("no equation", file("other = \"mean\"\n"), vec![], vec!["s.toml, line 8", "^"]),
        ("an inequality", file("other = \"mean <= sd\"\n"), vec![], vec!["s.toml, line 8", "range"]),
        ("an unknown key", file("[options]\nstrats = 3\n"), vec![], vec!["s.toml, line 9", "nearest name: starts"]),
        ("a truncated study", study[..study.len() - 8].into(), vec![], vec!["s.toml, line 7", "not closed"]),
        ("no TOML at all", "PK\u{3}\u{4}".into(), vec![], vec!["s.toml, line 1"]),
        ("an empty study", String::new(), vec![], vec!["s.toml", "empty"]),
        (
            "two restrictions of one name",
            format!("{study}[maintained]\nzero = \"sd = 1\"\n"),
            vec![],
            vec!["zero", "line 7", "line 9"],
        ),
        (
            "a key given twice",
            format!("{study}zero = \"sd = 1\"\n"),
            vec![],
            vec!["line 8", "zero is given twice", "line 7"],
        ),
        (
            "a quantity with a parameter's name",
            file("[quantities]\nsd = \"mean\"\n"),
            vec![],
            vec!["sd", "a parameter"],
        ),
        ("an unknown family", study.replace("normal", "normall"), vec![], vec!["line 4", "normall", "normal"]),
        (
            "a gate without a hypothesis",
            format!("{HEAD}{NORMAL}"),
            vec!["--gate", "0.05"],
            vec!["--gate", "no tested restriction"],
        ),
        (
            "a gate that dropped its hypothesis",
            study.clone(),
            vec!["--gate", "0.05", "--drop", "zero"],
            vec!["no tested restriction"],
        ),
        ("a gate without its test", study.clone(), vec!["--gate", "0.05", "--tests", "lr"], vec!["--gate", "score"]),
        ("a gate out of range", study.clone(), vec!["--gate", "2"], vec!["command line, --gate", "between 0 and 1"]),
        ("an unknown option", study.clone(), vec!["--strats", "3"], vec!["--strats"]),
        ("an option of a later version", study.clone(), vec!["--bootstrap", "99"], vec!["--bootstrap"]),
        (
            "a wrong kind of information",
            study.clone(),
            vec!["--information", "fisher"],
            vec!["command line, --information", "expected"],
        ),
        ("nothing to drop", study.clone(), vec!["--drop", "zro"], vec!["--drop", "nearest name: zero"]),
        (
            "a wrong restriction of the command line",
            study.clone(),
            vec!["--tested", "b: mean = sdd"],
            vec!["--tested", "^^^", "nearest name: sd"],
        ),
        (
            "a custom density without a start",
            format!(
                "{HEAD}[model]\nfamily = \"custom\"\nlog_density = \"-(y - a)^2\"\na = {{ range = \"(0, inf)\" }}\n"
            ),
            vec![],
            vec!["a", "start"],
        ),
        (
            "a custom density with an unknown name",
            format!("{HEAD}[model]\nfamily = \"custom\"\nlog_density = \"-(y - b)^2\"\na = {{ start = 1 }}\n"),
            vec![],
            vec!["line 5", "b", "^"],
        ),
        ("a parameter the family has not", format!("{HEAD}{NORMAL}[model.mean_]\nstart = 1\n"), vec![], vec!["mean_"]),
    ] {
        refused(what, &run(ROWS, &text, &options), 2, &parts);
    }
    let folder = Folder::new();
    folder.write("d.csv", ROWS);
    refused("a table for a study", &folder.run(&["fit", "d.csv"]), 2, &["d.csv, line 1", "--data d.csv"]);
    refused("nothing to fit", &folder.run(&["fit"]), 2, &["--data", "--family"]);
    refused("no command", &folder.run(&[]), 2, &["fit", "check", "families"]);
    refused("an unknown command", &folder.run(&["fti"]), 2, &["fti"]);
    refused("an unknown family", &folder.run(&["families", "norml"]), 2, &["nearest name: normal"]);
}

#[test]
fn files_that_cannot_be_read_or_written() {
    let folder = Folder::new();
    folder.write("d.csv", ROWS);
    folder.write("s.toml", normal());
    refused("no study", &folder.run(&["fit", "none.toml"]), 5, &["none.toml"]);
    refused("a folder for a study", &folder.run(&["fit", "."]), 5, &["."]);
    refused("no data", &folder.run(&["fit", "s.toml", "--data", "none.csv"]), 5, &["none.csv"]);
    refused("no folder to write to", &folder.run(&["fit", "s.toml", "--output", "no/a.json"]), 5, &["no/a.json"]);
    refused("no folder for the trace", &folder.run(&["fit", "s.toml", "--trace", "no/a.csv"]), 5, &["no/a.csv"]);
    // The study is wrong before its file is missing: 2 goes before 5.
    refused("both", &folder.run(&["fit", "s.toml", "--data", "none.csv", "--starts", "0"]), 2, &["--starts"]);
    let left: Vec<_> = std::fs::read_dir(folder.path()).unwrap().map(|e| e.unwrap().file_name()).collect();
    assert_eq!(left.len(), 2, "{left:?}");
}

#[test]
fn a_fit_with_no_free_direction_is_a_fit() {
    let fixed = format!("{HEAD}{NORMAL}[tested]\na = \"mean = 3\"\nb = \"sd = 2\"\n");
    let answer = run(ROWS, &fixed, &["--format", "json"]).fit();
    assert_eq!((answer.status, answer.verdict()), (0, "strict maximum"), "{}", answer.err);
    assert_eq!(answer.number("/tests/score/df"), Some(2.0));
}

#[test]
fn a_contradiction_in_itself_is_the_studys_fault() {
    let constant = run(ROWS, &format!("{}one = \"mean - mean = 1\"\n", normal()), &[]);
    refused("a contradiction in itself", &constant, 2, &["s.toml, line 8", "one", "contradicts itself"]);
}

#[test]
fn a_reader_that_leaves_early_is_no_fault() {
    use std::process::{Command, Stdio};
    let mut child = Command::new(env!("CARGO_BIN_EXE_guyline"))
        .args(["families", "--format", "json"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let done = child.wait_with_output().unwrap();
    assert_eq!(done.status.code(), Some(0));
    assert!(done.stderr.is_empty(), "{}", String::from_utf8_lossy(&done.stderr));
}
