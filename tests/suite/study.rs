//! Studies by file, by options alone and by both; what goes before what; where answers go.

use crate::harness::{Folder, run_in};

const ROWS: &str =
    "y,x,kiln\n1.2,0.5,north\n2.3,1.5,south\n2.9,2.5,north\n4.1,3.5,south\n5.2,4.5,north\n6.8,5.5,south\n";
const STUDY: &str = "[data]\nfile = \"d.csv\"\n[model]\nfamily = \"normal\"\nresponse = \"y\"\n[model.mean]\nterms = [\"x\"]\n\
                     [tested]\none = \"mean.x = 1\"\n[options]\nconfidence = 0.9\nformat = \"json\"\n";

fn folder() -> Folder {
    let folder = Folder::new();
    folder.write("d.csv", ROWS);
    folder.write("s.toml", STUDY);
    folder
}

#[test]
fn a_study_by_options_alone_gives_the_same_answer() {
    let folder = folder();
    let file = folder.run(&["fit", "s.toml", "--with", "title=\"\"", "--with", "title=t"]);
    let options = [
        "fit",
        "--data",
        "d.csv",
        "--family",
        "normal",
        "--response",
        "y",
        "--with",
        "model.mean.terms=[\"x\"]",
        "--with",
        "title=t",
        "--tested",
        "one: mean.x = 1",
        "--confidence",
        "0.9",
        "--format",
        "json",
    ];
    let alone = folder.run(&options);
    assert_eq!(file.status, 0, "{}", file.err);
    assert_eq!(alone.out, file.out, "{}", alone.err);
    let mut piped = options;
    piped[2] = "-";
    let piped = run_in(folder.path(), &piped, ROWS);
    assert_eq!(piped.out.replace("\"-\"", "\"d.csv\""), file.out, "{}", piped.err);
}

#[test]
fn the_command_line_goes_before_with_and_with_before_options() {
    let folder = folder();
    let width = |options: &[&str]| {
        let fit = folder.run(&[&["fit", "s.toml"], options].concat()).fit();
        let get = |figure| fit.estimate("restricted", "mean.intercept", figure).unwrap();
        (get("upper") - get("lower")) / get("se")
    };
    // Twice the normal quantile, from tables (recalled): 1.6449, 1.9600, 2.5758; four figures are enough to tell them apart.
    for (options, quantile) in [
        (vec![], 1.6449),
        (vec!["--with", "options.confidence=0.95"], 1.9600),
        (vec!["--confidence", "0.99", "--with", "options.confidence=0.95"], 2.5758),
    ] {
        assert!((width(&options) - 2.0 * quantile).abs() < 2e-4, "{options:?}");
    }
}

#[test]
fn paths_in_a_study_start_at_the_study() {
    let folder = folder();
    std::fs::create_dir(folder.path().join("sub")).unwrap();
    let there = folder.path().join("sub");
    let answer = run_in(&there, &["fit", "../s.toml"], "");
    assert_eq!(answer.status, 0, "{}", answer.err);
    folder.write("sub/e.csv", ROWS.replace("6.8", "7.8"));
    let other =
        run_in(&there, &["fit", "../s.toml", "--data", "e.csv", "--output", "out.json", "--trace", "t.csv"], "");
    assert_eq!((other.status, other.out.as_str()), (0, ""), "{}", other.err);
    let written = std::fs::read_to_string(there.join("out.json")).unwrap();
    assert!(written.contains("\"e.csv\"") && written != answer.out);
    let trace = std::fs::read_to_string(there.join("t.csv")).unwrap();
    assert!(trace.starts_with("iteration,log_likelihood,feasibility,stationarity,length,shift\n0,"), "{trace}");
    assert_eq!(std::fs::read_dir(&there).unwrap().count(), 3, "nothing temporary is left");
}

#[test]
fn the_gate_closes_below_its_level() {
    let folder = folder();
    let p = folder.run(&["fit", "s.toml"]).fit().number("/tests/score/p").unwrap();
    assert!(p > 1e-6 && p < 0.999, "{p}");
    let gate =
        |alpha: f64, more: &[&str]| folder.run(&[&["fit", "s.toml", "--gate", &alpha.to_string()], more].concat());
    assert_eq!(gate(p * 0.99, &[]).status, 0);
    let closed = gate((p * 1.01).min(0.9999), &[]);
    assert_eq!(closed.status, 1);
    assert!(closed.err.contains("gate") && !closed.out.is_empty());
    assert!(gate((p * 1.01).min(0.9999), &["--quiet"]).err.is_empty());
    // A restriction that follows from a maintained one leaves nothing to test: a gate without a p.
    let none = gate(0.05, &["--maintained", "mean.x = 1"]);
    assert_eq!(none.status, 4, "{}", none.err);
}

#[test]
fn threads_and_timings_change_nothing_in_the_answer() {
    let folder = folder();
    let one = folder.run(&["fit", "s.toml", "--threads", "1"]);
    let two = folder.run(&["fit", "s.toml", "--threads", "2", "--timings"]);
    assert_eq!(one.out, two.out);
    assert!(one.err.is_empty(), "{}", one.err);
    assert!(two.err.contains("reading") && two.err.contains("passes over the data"), "{}", two.err);
}

#[test]
fn check_says_what_would_be_fitted_and_what_looks_wrong() {
    let folder = folder();
    let rows: String = (0..24).map(|i| format!("{},{},{}\n", 1.0 + 0.1 * f64::from(i % 7), i % 3 + 1, i + 1)).collect();
    folder.write("d.csv", format!("y,x,n\n{rows}"));
    let answer = folder.run(&[
        "check",
        "s.toml",
        "--weight",
        "n",
        "--tested",
        "two: 2 * mean.x = 2",
        "--maintained",
        "no: mean.x = 3",
    ]);
    assert_eq!(answer.status, 0, "{}", answer.err);
    for part in [
        "normal",
        "mean.x",
        "mean.intercept",
        "sd",
        "24 rows",
        "put to the test",
        "[data.category]",
        "row numbers",
        "contradicts",
    ] {
        assert!(answer.out.contains(part), "lacks {part}:\n{}", answer.out);
    }
    assert!(answer.err.is_empty(), "{}", answer.err);
}

#[test]
fn families_are_listed_and_described() {
    let folder = Folder::new();
    let all = folder.run(&["families", "--format", "json"]);
    let list: serde_json::Value = serde_json::from_str(&all.out).unwrap();
    let names: Vec<&str> = list.as_array().unwrap().iter().map(|f| f["name"].as_str().unwrap()).collect();
    for name in ["normal", "poisson", "binomial", "exponential", "categorical", "mixture", "custom"] {
        assert!(names.contains(&name), "{name}");
        let one = folder.run(&["families", name]);
        assert!(
            one.status == 0 && one.out.contains("log density") && one.out.contains("source"),
            "{name}: {}",
            one.out
        );
    }
    for f in list.as_array().unwrap() {
        for key in ["name", "response", "parameters", "formula", "information", "source"] {
            assert!(!f[key].is_null(), "{} {key}", f["name"]);
        }
    }
}

#[test]
fn completions_name_the_commands_and_options() {
    let folder = Folder::new();
    for shell in ["bash", "zsh", "fish", "powershell", "elvish"] {
        let answer = folder.run(&["completions", shell]);
        assert_eq!(answer.status, 0, "{}", answer.err);
        for part in ["families", "check", "gate"] {
            assert!(answer.out.contains(part), "{shell} lacks {part}");
        }
    }
}

/// The program waits for its data on standard input, which stays open, when the interruption comes.
#[cfg(unix)]
#[test]
fn an_interruption_has_its_own_status() {
    use std::process::{Command, Stdio};
    let mut child = Command::new(env!("CARGO_BIN_EXE_guyline"))
        .args(["fit", "--data", "-", "--family", "normal", "--response", "y"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let pipe = child.stdin.take();
    // Long enough to start on a busy machine; the handler is the first thing the program sets.
    std::thread::sleep(std::time::Duration::from_secs(2));
    let sent = Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    assert!(sent.success());
    let done = child.wait_with_output().unwrap();
    drop(pipe);
    assert_eq!(done.status.code(), Some(130));
    assert!(done.stdout.is_empty());
    assert_eq!(String::from_utf8_lossy(&done.stderr), "interrupted\n");
}
