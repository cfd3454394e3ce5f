//! One test a fault that was found and mended.

use crate::harness::{Folder, near};

/// A hypothesis under which the data cannot have happened was called `flat`, with the parameters it does not touch to blame.
#[test]
fn data_that_cannot_happen_under_the_hypothesis() {
    for equation in ["north.rate = 0", "north.rate^2 = 0"] {
        let folder = Folder::new();
        folder.write("d.csv", "kiln,flaws\nnorth,3\nnorth,2\nsouth,1\nsouth,4\n");
        let tested = format!("none: {equation}");
        let options =
            ["--data", "d.csv", "--family", "poisson", "--response", "flaws", "--per", "kiln", "--tested", &tested];
        let answer = folder.run(&[&["fit"], &options[..]].concat());
        assert_eq!(answer.status, 4, "{}", answer.out);
        assert!(answer.out.contains("verdict is 'stopped'"), "{}", answer.out);
        assert!(answer.err.contains("`north.rate` = 0, where the data have probability zero"), "{}", answer.err);
    }
}

/// Deviances alone lost the logarithm of a probability within rounding of 0 or 1: the search saw minus infinity.
#[test]
fn a_probability_next_to_one_keeps_its_logarithm() {
    let folder = Folder::new();
    for (trials, scale) in [(1.0, 1.0), (5000.0, 5000.0)] {
        let mut rows = String::from("y,n,x\n");
        for (y, x) in [(0.0, 0.0), (1.0, 0.0), (1.0, 50.0), (0.0, 50.0), (1.0, 60.0), (1.0, 70.0)] {
            rows += &format!("{},{trials},{x}\n", y * scale);
        }
        folder.write("d.csv", rows);
        let f = folder.fit(
            "[data]\nfile='d.csv'\n[model]\nfamily='binomial'\nresponse='y'\ntrials='n'\n[model.probability]\nterms=['x']\n[tested]\na='probability.intercept=0'\nb='probability.x=0.8'\n",
            &[],
        );
        // every row lies at an end: l is the sum of log(1 + exp(-eta)) and, for the failure at 50, of -eta beside it
        let each: f64 = [0.0, 0.0, 40.0, 40.0, 48.0, 56.0].iter().map(|e: &f64| (-e).exp().ln_1p()).sum();
        let l = f.number("/restricted/log_likelihood").unwrap();
        assert!(near(l, -scale * (each + 40.0), 1e-12, 0.0), "{l} {}", f.err);
    }
}
