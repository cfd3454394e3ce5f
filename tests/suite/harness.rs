//! Runs the built program in folders of its own and reads its answers.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::sync::atomic::{AtomicUsize, Ordering};

use serde_json::Value;

/// The project's root.
pub fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// A folder that goes when it is dropped.
pub struct Folder(PathBuf);

impl Folder {
    pub fn new() -> Folder {
        static COUNT: AtomicUsize = AtomicUsize::new(0);
        let name = format!("guyline-suite-{}-{}", std::process::id(), COUNT.fetch_add(1, Ordering::Relaxed));
        let path = std::env::temp_dir().join(name);
        std::fs::create_dir_all(&path).unwrap();
        Folder(path)
    }

    pub fn path(&self) -> &Path {
        &self.0
    }

    /// Writes a file and gives back its path.
    pub fn write(&self, name: &str, text: impl AsRef<[u8]>) -> PathBuf {
        let path = self.0.join(name);
        std::fs::write(&path, text).unwrap();
        path
    }

    /// Runs the program here.
    pub fn run(&self, arguments: &[&str]) -> Answer {
        run_in(&self.0, arguments, "")
    }

    /// Writes the study, fits it and reads the JSON; panics with the messages when there is none.
    pub fn fit(&self, study: &str, options: &[&str]) -> Fit {
        self.write("study.toml", study);
        self.run(&[&["fit", "study.toml", "--format", "json"], options].concat()).fit()
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

/// Runs the program in a folder with this standard input.
pub fn run_in(folder: &Path, arguments: &[&str], input: &str) -> Answer {
    let mut child = Command::new(env!("CARGO_BIN_EXE_guyline"))
        .args(arguments)
        .current_dir(folder)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let mut pipe = child.stdin.take().unwrap();
    let text = input.to_owned();
    let feed = std::thread::spawn(move || {
        let _ = pipe.write_all(text.as_bytes()); // the program may end before it reads all
    });
    let done = child.wait_with_output().unwrap();
    feed.join().unwrap();
    Answer {
        status: done.status.code().unwrap_or(-1),
        out: String::from_utf8(done.stdout).unwrap(),
        err: String::from_utf8(done.stderr).unwrap(),
    }
}

/// What a run said.
pub struct Answer {
    pub status: i32,
    pub out: String,
    pub err: String,
}

impl Answer {
    /// The fit in the JSON; panics when there is none.
    pub fn fit(self) -> Fit {
        match serde_json::from_str(&self.out) {
            Ok(value) => Fit { value, status: self.status, err: self.err },
            Err(fault) => panic!("status {}, no JSON ({fault})\n{}{}", self.status, self.out, self.err),
        }
    }
}

/// The JSON of `fit`.
pub struct Fit {
    pub value: Value,
    pub status: i32,
    pub err: String,
}

impl Fit {
    /// What stands at a pointer such as `/restricted/log_likelihood`, as a number.
    pub fn number(&self, pointer: &str) -> Option<f64> {
        self.value.pointer(pointer).and_then(Value::as_f64)
    }

    pub fn verdict(&self) -> &str {
        self.value.pointer("/restricted/certificate/verdict").and_then(Value::as_str).unwrap_or("none")
    }

    /// A figure (`value`, `se`, `lower`, `upper`) of an estimate in a block (`restricted`, `unrestricted`).
    pub fn estimate(&self, block: &str, name: &str, figure: &str) -> Option<f64> {
        self.list(&format!("/{block}/estimates")).iter().find(|e| e["name"] == name)?[figure].as_f64()
    }

    /// A figure of every multiplier of the restricted fit for which `keep` holds of the role, in order.
    pub fn multipliers(&self, keep: impl Fn(&str) -> bool, figure: &str) -> Vec<Option<f64>> {
        let all = self.list("/restricted/multipliers");
        all.iter().filter(|m| keep(m["role"].as_str().unwrap())).map(|m| m[figure].as_f64()).collect()
    }

    pub fn tested(&self, figure: &str) -> Vec<Option<f64>> {
        self.multipliers(|role| role == "tested", figure)
    }

    pub fn list(&self, pointer: &str) -> &[Value] {
        self.value.pointer(pointer).and_then(Value::as_array).map_or(&[], |a| a)
    }

    pub fn warned(&self, code: &str) -> bool {
        self.list("/warnings").iter().any(|w| w["code"] == code)
    }

    /// All warnings in one text, for searching a name in it.
    pub fn warnings(&self) -> String {
        self.list("/warnings").iter().map(|w| format!("{}: {}\n", w["code"], w["message"])).collect()
    }
}

/// Whether two numbers agree to a relative or an absolute tolerance.
pub fn near(a: f64, b: f64, relative: f64, absolute: f64) -> bool {
    (a - b).abs() <= (relative * b.abs()).max(absolute)
}

/// A small linear congruential source: the data need only look unordered.
pub struct Source(pub u64);

impl Source {
    pub fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }
}

/// Writes columns as CSV.
pub fn csv(columns: &[(&str, Vec<String>)]) -> String {
    let mut out = columns.iter().map(|c| c.0).collect::<Vec<_>>().join(",") + "\n";
    for row in 0..columns[0].1.len() {
        out += &(columns.iter().map(|c| c.1[row].as_str()).collect::<Vec<_>>().join(",") + "\n");
    }
    out
}
