//! The same study and data give the same bytes, whatever the number of threads.

use std::fmt::Write;

use crate::harness::{Folder, root, run_in};

fn compare(folder: &std::path::Path, study: &str) {
    for format in ["text", "json", "csv"] {
        let run = |threads: &str| {
            let a = run_in(folder, &["fit", study, "--format", format, "--threads", threads], "");
            assert_eq!(a.status, 0, "{study}, {threads} threads: {}", a.err);
            a.out + &a.err
        };
        let one = run("1");
        assert!(!one.is_empty());
        for threads in ["2", "3", "7"] {
            assert!(run(threads) == one, "{study}, {format}: {threads} threads differ from one");
        }
    }
}

#[test]
fn the_demos() {
    for study in ["pallet.toml", "flaws.toml", "strength.toml"] {
        compare(&root().join("datasets"), study);
    }
}

/// More rows than one chunk of work, so that several threads have something to do.
#[test]
fn many_rows() {
    let folder = Folder::new();
    let (mut state, mut data) = (5u64, String::from("y,x\n"));
    for _ in 0..50_000 {
        let mut next = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 40) as f64 / (1u64 << 24) as f64
        };
        let (x, u) = (next(), next());
        let _ = writeln!(data, "{},{x}", u32::from(u < 0.3 + 0.4 * x));
    }
    folder.write("data.csv", data);
    folder.write(
        "study.toml",
        "[data]\nfile = \"data.csv\"\n[model]\nfamily = \"binomial\"\nresponse = \"y\"\n[model.probability]\nterms = [\"x\"]\nlink = \"logit\"\n\
         [tested]\nslope = \"probability.x = 1.7\"\n",
    );
    compare(folder.path(), "study.toml");
}
