//! Writes the invented data sets of `datasets/`: `cargo run --example generate` from the project's root.
//!
//! The seeds are fixed, so the bytes are too; a test compares them with the committed files.

mod tiles;

fn main() -> std::io::Result<()> {
    for (name, text) in tiles::files() {
        std::fs::write(std::path::Path::new("datasets").join(name), text)?;
    }
    Ok(())
}
