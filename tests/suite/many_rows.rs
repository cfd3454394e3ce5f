//! Starts on many rows are led over a part of them first; the answer is that of all rows.

use std::fmt::Write;

use crate::harness::{Folder, near};

/// Uniform numbers by Weyl's sequence of the golden ratio and of the square root of two.
fn uniform(i: usize, ratio: f64) -> f64 {
    (0.5 + (i + 1) as f64 * ratio).fract()
}

#[test]
fn a_part_of_the_rows_leads_to_the_answer_of_all() {
    let mut data = String::from("x,y\n");
    for i in 0..70_000 {
        let (x, u) = (10.0 * uniform(i, 0.618_033_988_749_895), uniform(i, std::f64::consts::SQRT_2));
        // logistic noise by its quantile function
        let noise = 0.3 * (u / (1.0 - u)).ln();
        writeln!(data, "{x:.5},{:.5}", 7.0 * (1.0 - (-0.4 * x).exp()) + 3.0 + noise).unwrap();
    }
    let study = r#"
[data]
file = "d.csv"
[model]
family = "custom"
log_density = "-log(s) - ((y - a * (1 - exp(-b * x)) - c) / s)^2 / 2 - log(2 * pi) / 2"
a = { start = 6 }
b = { start = 0.5 }
c = { start = 2 }
s = { start = 1.5, range = "(0, inf)" }
[tested]
ceiling = "a + c = 10"
"#;
    let folder = Folder::new();
    folder.write("d.csv", data);
    let one = folder.fit(study, &["--starts", "1"]);
    let many = folder.fit(study, &[]);
    assert_eq!(many.verdict(), "strict maximum");
    for name in ["a", "b", "c", "s"] {
        let figure = |f: &crate::harness::Fit, block: &str| f.estimate(block, name, "value").unwrap();
        for block in ["restricted", "unrestricted"] {
            // both are Newton's answers at rounding level
            assert!(near(figure(&many, block), figure(&one, block), 1e-9, 1e-9), "{block} {name}");
        }
    }
    let starts = many.number("/restricted/certificate/starts").unwrap();
    let best = many.number("/restricted/certificate/starts_at_best").unwrap();
    assert!(starts == 20.0 && best >= 10.0, "{best} of {starts}");
    // twenty searches over all rows would take some hundred passes
    let passes = many.number("/restricted/certificate/passes").unwrap();
    assert!(passes < 60.0, "{passes} passes");
}
