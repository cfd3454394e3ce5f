//! The committed data sets are what the generator writes, and every one has its study.

use std::path::Path;

fn folder() -> std::path::PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("datasets")
}

#[test]
fn the_generator_writes_the_committed_bytes() {
    for (name, text) in crate::tiles::files() {
        assert!(
            std::fs::read_to_string(folder().join(name)).unwrap() == text,
            "{name}: run `cargo run --example generate`"
        );
    }
}

#[test]
fn every_file_has_a_study_that_says_where_it_comes_from() {
    for entry in std::fs::read_dir(folder()).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_some_and(|e| e == "csv") {
            let study = std::fs::read_to_string(path.with_extension("toml")).unwrap();
            assert!(
                study.starts_with("# Invented data:") || study.starts_with("# Published data:"),
                "{}",
                path.display()
            );
        }
    }
}
