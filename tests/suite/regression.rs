//! One test a fault that was found and mended.

use crate::harness::Folder;

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
