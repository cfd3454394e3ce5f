//! Snapshots of what a user reads. `GUYLINE_SNAPSHOTS=write cargo test --test suite reports` writes them anew; read the
//! difference before committing it.

use crate::harness::{root, run_in};

fn check(name: &str, arguments: &[&str]) {
    let answer = run_in(root(), arguments, "");
    let text = format!("$ guyline {}\n{}{}[status {}]\n", arguments.join(" "), answer.out, answer.err, answer.status);
    let path = root().join("tests/suite/snapshots").join(format!("{name}.txt"));
    if std::env::var("GUYLINE_SNAPSHOTS").is_ok_and(|v| v == "write") {
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(&path, &text).unwrap();
    }
    let kept = std::fs::read_to_string(&path).unwrap_or_default();
    if text != kept {
        let at = text
            .lines()
            .zip(kept.lines())
            .position(|(a, b)| a != b)
            .unwrap_or(text.lines().count().min(kept.lines().count()));
        let line = |s: &str| s.lines().nth(at).unwrap_or("(end)").to_owned();
        panic!("{name}, line {}:\n  now  {}\n  kept {}", at + 1, line(&text), line(&kept));
    }
}

#[test]
fn fits_of_the_demos() {
    for study in ["pallet", "pallet_bins", "flaws", "strength", "linkage", "party", "alcohol"] {
        check(&format!("fit_{study}"), &["fit", &format!("datasets/{study}.toml")]);
    }
}

#[test]
fn other_formats() {
    check("fit_flaws_json", &["fit", "datasets/flaws.toml", "--format", "json"]);
    check("fit_flaws_csv", &["fit", "datasets/flaws.toml", "--format", "csv"]);
}

#[test]
fn checks_of_the_demos() {
    for study in ["pallet", "flaws", "strength"] {
        check(&format!("check_{study}"), &["check", &format!("datasets/{study}.toml")]);
    }
}

#[test]
fn families() {
    check("families", &["families"]);
    check("families_normal", &["families", "normal"]);
    check("families_mixture", &["families", "mixture"]);
}

#[test]
fn help() {
    check("help", &["--help"]);
    for command in ["fit", "check", "families"] {
        check(&format!("help_{command}"), &[command, "--help"]);
    }
}

#[test]
fn messages() {
    check(
        "message_unknown_name",
        &["fit", "datasets/pallet.toml", "--tested", "two_to_one_again: share.norht = 2 * share.south"],
    );
    check("message_no_file", &["fit", "datasets/palet.toml"]);
    check("gate_closed", &["fit", "datasets/pallet.toml", "--gate", "0.05", "--quiet"]);
}
