//! Every command in the README runs and prints what the README says.

use crate::harness::{root, run_in};

/// A command with the lines said to follow it.
struct Said {
    command: String,
    lines: Vec<String>,
}

/// The commands of the ```console blocks: lines after `$ `, each with the output up to the next one.
fn commands(text: &str) -> Vec<Said> {
    let (mut inside, mut out): (bool, Vec<Said>) = (false, Vec::new());
    for line in text.lines() {
        if line.starts_with("```") {
            inside = line == "```console";
        } else if let (true, Some(command)) = (inside, line.strip_prefix("$ ")) {
            out.push(Said { command: command.to_owned(), lines: Vec::new() });
        } else if inside {
            out.last_mut().unwrap().lines.push(line.to_owned());
        }
    }
    out
}

/// Splits at spaces, keeping what stands in single quotes together.
fn words(command: &str) -> Vec<String> {
    let mut out = vec![String::new()];
    let mut quoted = false;
    for c in command.chars() {
        match c {
            '\'' => quoted = !quoted,
            ' ' if !quoted => out.push(String::new()),
            c => out.last_mut().unwrap().push(c),
        }
    }
    out.retain(|w| !w.is_empty());
    out
}

/// Whether the lines are said, where a line `...` stands for any number of lines.
fn matches(said: &[String], got: &[&str]) -> bool {
    match said.split_first() {
        None => got.is_empty(),
        Some((line, rest)) if line == "..." => (0..=got.len()).any(|k| matches(rest, &got[k..])),
        Some((line, rest)) => got.first().is_some_and(|g| g.trim_end() == line.trim_end()) && matches(rest, &got[1..]),
    }
}

#[test]
fn every_command_does_what_is_said() {
    let text = std::fs::read_to_string(root().join("README.md")).unwrap();
    let mut status = 0;
    let mut run = 0;
    for said in commands(&text) {
        if said.command == "echo $?" {
            assert_eq!(said.lines, [status.to_string()], "status of the command before");
            continue;
        }
        if said.command == "cargo test --release" {
            assert!(said.lines.is_empty(), "the test command is this very test");
            continue;
        }
        let words = words(&said.command);
        let words: Vec<&str> = words.iter().map(String::as_str).collect();
        let arguments = words
            .strip_prefix(&["cargo", "run", "--release", "--"])
            .or_else(|| words.strip_prefix(&["guyline"]))
            .unwrap_or_else(|| panic!("{} is no command of the program", said.command));
        let answer = run_in(root(), arguments, "");
        status = answer.status;
        run += 1;
        let both = answer.out + &answer.err;
        let got: Vec<&str> = both.lines().collect();
        // A command without lines is shown to be tried, not for what it prints.
        assert!(said.lines.is_empty() || matches(&said.lines, &got), "{}\nprints\n{both}", said.command);
    }
    assert!(run >= 5, "{run} commands were tried");
}

#[test]
fn the_first_two_commands_are_the_demo_and_the_tests() {
    let text = std::fs::read_to_string(root().join("README.md")).unwrap();
    let all = commands(&text);
    assert_eq!(all[0].command, "cargo run --release -- fit datasets/pallet.toml");
    assert_eq!(all[1].command, "cargo test --release");
}

#[test]
fn the_matcher_can_fail() {
    let said = ["a".to_owned(), "...".to_owned(), "b".to_owned()];
    assert!(matches(&said, &["a", "x", "y", "b"]));
    assert!(!matches(&said, &["a", "x", "y"]));
    assert!(!matches(&said, &["c", "b"]));
}
