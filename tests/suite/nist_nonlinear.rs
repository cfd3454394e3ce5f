//! The 27 nonlinear regressions of the Statistical Reference Datasets (`tests/data/nist/nonlinear`, National Institute of
//! Standards and Technology), each from both published starts, as `normal` with a curve on the mean and as `custom`, one
//! start a fit. Certified values have eleven digits.

use crate::harness::{Folder, root};

/// Correct digits that every coefficient must have, and the residual sum of squares.
const COEFFICIENTS: f64 = 6.0;
const SQUARES: f64 = 8.0;
/// Of certified standard deviations, where the information is that of the curve: the search stops at a scaled gradient of
/// 1e-7 at worst, and in the worst of these problems the information has a condition of 1e10.
const DEVIATIONS: f64 = 5.0;

const RATIONAL_3: &str = "(b1 + b2 * x + b3 * x^2 + b4 * x^3) / (1 + b5 * x + b6 * x^2 + b7 * x^3)";
const THREE_DECAYS: &str = "b1 * exp(-b2 * x) + b3 * exp(-b4 * x) + b5 * exp(-b6 * x)";
const TWO_BELLS: &str = "b1 * exp(-b2 * x) + b3 * exp(-(x - b4)^2 / b5^2) + b6 * exp(-(x - b7)^2 / b8^2)";

/// The models as the files write them, in the program's language.
const PROBLEMS: &[(&str, &str)] = &[
    ("Bennett5", "b1 * (b2 + x)^(-1 / b3)"),
    ("BoxBOD", "b1 * (1 - exp(-b2 * x))"),
    ("Chwirut1", "exp(-b1 * x) / (b2 + b3 * x)"),
    ("Chwirut2", "exp(-b1 * x) / (b2 + b3 * x)"),
    ("DanWood", "b1 * x^b2"),
    (
        "ENSO",
        "b1 + b2 * cos(2 * pi * x / 12) + b3 * sin(2 * pi * x / 12) + b5 * cos(2 * pi * x / b4) \
         + b6 * sin(2 * pi * x / b4) + b8 * cos(2 * pi * x / b7) + b9 * sin(2 * pi * x / b7)",
    ),
    ("Eckerle4", "b1 / b2 * exp(-0.5 * ((x - b3) / b2)^2)"),
    ("Gauss1", TWO_BELLS),
    ("Gauss2", TWO_BELLS),
    ("Gauss3", TWO_BELLS),
    ("Hahn1", RATIONAL_3),
    ("Kirby2", "(b1 + b2 * x + b3 * x^2) / (1 + b4 * x + b5 * x^2)"),
    ("Lanczos1", THREE_DECAYS),
    ("Lanczos2", THREE_DECAYS),
    ("Lanczos3", THREE_DECAYS),
    ("MGH09", "b1 * (x^2 + x * b2) / (x^2 + x * b3 + b4)"),
    ("MGH10", "b1 * exp(b2 / (x + b3))"),
    ("MGH17", "b1 + b2 * exp(-x * b4) + b3 * exp(-x * b5)"),
    ("Misra1a", "b1 * (1 - exp(-b2 * x))"),
    ("Misra1b", "b1 * (1 - (1 + b2 * x / 2)^(-2))"),
    ("Misra1c", "b1 * (1 - (1 + 2 * b2 * x)^(-0.5))"),
    ("Misra1d", "b1 * b2 * x / (1 + b2 * x)"),
    ("Nelson", "b1 - b2 * x1 * exp(-b3 * x2)"),
    ("Rat42", "b1 / (1 + exp(b2 - b3 * x))"),
    ("Rat43", "b1 / (1 + exp(b2 - b3 * x))^(1 / b4)"),
    ("Roszman1", "b1 - b2 * x - atan(b3 / (x - b4)) / pi"),
    ("Thurber", RATIONAL_3),
];

/// A file, read.
struct Problem {
    curve: &'static str,
    response: &'static str,
    derive: &'static str,
    data: String,
    rows: f64,
    /// For each coefficient: first start, second start, certified value, certified standard deviation.
    coefficients: Vec<[f64; 4]>,
    squares: f64,
}

fn read(name: &'static str, curve: &'static str) -> Problem {
    let text = std::fs::read_to_string(root().join(format!("tests/data/nist/nonlinear/{name}.dat"))).unwrap();
    let lines: Vec<&str> = text.lines().collect();
    let numbers = |l: &str| -> Vec<f64> { l.split_whitespace().map(|w| w.parse().unwrap()).collect() };
    // Coefficients stand from line 41 on, the data from line 61 on: so the head of every file says.
    let after = |l: &&str| l.trim_start().strip_prefix('b').and_then(|l| l.split_once('=')).map(|l| numbers(l.1));
    let coefficients = lines[40..58].iter().filter_map(after).map(|v| v.try_into().unwrap()).collect();
    let squares = lines.iter().find_map(|l| l.strip_prefix("Residual Sum of Squares:")).unwrap().trim();
    let rows: Vec<&&str> = lines[60..].iter().filter(|l| !l.trim().is_empty()).collect();
    let columns = if name == "Nelson" { "y,x1,x2" } else { "y,x" };
    let cells = |l: &&&str| l.split_whitespace().collect::<Vec<_>>().join(",") + "\n";
    Problem {
        curve,
        response: if name == "Nelson" { "log_y" } else { "y" },
        derive: if name == "Nelson" { "[data.derive]\nlog_y = \"log(y)\"\n" } else { "" },
        data: format!("{columns}\n{}", rows.iter().map(cells).collect::<String>()),
        rows: rows.len() as f64,
        coefficients,
        squares: squares.parse().unwrap(),
    }
}

#[derive(Clone, Copy, PartialEq)]
enum Way {
    Curve,
    Custom,
}

impl Problem {
    /// `sd` starts where the program puts it as a curve, at 1 as a custom density.
    fn study(&self, way: Way, start: usize) -> String {
        let mut out = format!("[data]\nfile = \"data.csv\"\n{}[model]\n", self.derive);
        out += &match way {
            Way::Curve => format!("family = \"normal\"\nresponse = \"{}\"\n", self.response),
            Way::Custom => format!(
                "family = \"custom\"\nlog_density = \"-log(sd) - (({} - ({})) / sd)^2 / 2 - log(2 * pi) / 2\"\n\
                 sd = {{ start = 1, range = \"(0, inf)\" }}\n",
                self.response, self.curve
            ),
        };
        for (k, c) in self.coefficients.iter().enumerate() {
            out += &format!("b{} = {{ start = {:?} }}\n", k + 1, c[start]);
        }
        if way == Way::Curve {
            out += &format!("[model.mean]\ncurve = \"{}\"\n", self.curve);
        }
        out
    }
}

/// Correct significant digits, as NIST counts them: -log10 of the relative error.
fn digits(got: f64, want: f64) -> f64 {
    if got == want { 17.0 } else { -((got - want) / want).abs().log10() }
}

/// What one fit came to: verdict, fewest digits of a coefficient, of the residual sum of squares, of a standard deviation.
struct Found {
    verdict: String,
    coefficients: f64,
    squares: f64,
    deviations: Option<f64>,
}

fn solve(problem: &Problem, way: Way, start: usize) -> Found {
    let folder = Folder::new();
    folder.write("data.csv", &problem.data);
    let fit = folder.fit(&problem.study(way, start), &["--starts", "1"]);
    let strict = fit.verdict() == "strict maximum";
    let number = |name: &str| {
        if strict {
            fit.estimate("restricted", name, "value").unwrap()
        } else {
            fit.value["restricted"]["certificate"]["point"][name].as_f64().unwrap()
        }
    };
    let p = problem.coefficients.len();
    let mut order: Vec<usize> = (0..p).collect();
    if problem.curve == THREE_DECAYS {
        // The three decays are one another's like: their order is the order of their rates, as certified.
        let mut decays = [0, 2, 4];
        decays.sort_by(|&a, &b| number(&format!("b{}", a + 2)).total_cmp(&number(&format!("b{}", b + 2))));
        order = decays.iter().flat_map(|&k| [k, k + 1]).collect();
    }
    let fewest = |figure: &dyn Fn(usize) -> f64, certified: usize, factor: f64| {
        let each = order.iter().zip(&problem.coefficients).map(|(&k, c)| digits(figure(k), factor * c[certified]));
        each.fold(17.0, f64::min)
    };
    let coefficients = fewest(&|k| number(&format!("b{}", k + 1)), 2, 1.0);
    // Certified ones divide by n - p, those of maximum likelihood by n.
    let factor = ((problem.rows - p as f64) / problem.rows).sqrt();
    let se = |k: usize| fit.estimate("restricted", &format!("b{}", k + 1), "se").unwrap_or(f64::NAN);
    let deviations = (strict && way == Way::Curve).then(|| fewest(&se, 3, factor));
    Found {
        verdict: fit.verdict().to_owned(),
        coefficients,
        squares: digits(number("sd").powi(2) * problem.rows, problem.squares),
        deviations,
    }
}

/// All fits of a problem: start 1 and 2 as a curve, start 1 and 2 as custom.
fn all(name: &'static str, curve: &'static str) -> [Found; 4] {
    let problem = read(name, curve);
    [(Way::Curve, 0), (Way::Curve, 1), (Way::Custom, 0), (Way::Custom, 1)].map(|(way, s)| solve(&problem, way, s))
}

/// The table of the README's evidence: digits claimed there, by problem.
fn claimed() -> Vec<(String, Vec<f64>)> {
    let readme = std::fs::read_to_string(root().join("README.md")).unwrap();
    let cells = |l: &str| -> Vec<String> { l.trim_matches('|').split('|').map(|c| c.trim().to_owned()).collect() };
    let rows = readme.lines().map(cells).filter(|c| PROBLEMS.iter().any(|p| p.0 == c[0]));
    rows.map(|c| (c[0].clone(), c[1..].iter().map(|x| x.parse().unwrap()).collect())).collect()
}

#[test]
fn coefficients_and_squares_have_their_digits_and_those_the_readme_claims() {
    let claimed = claimed();
    let mut faults = Vec::new();
    for &(name, curve) in PROBLEMS {
        let found = all(name, curve);
        let squares = found.iter().map(|f| f.squares).fold(17.0, f64::min);
        let whole = |x: f64| x.floor() as i64;
        let cells: Vec<String> = found.iter().map(|f| format!("{}", whole(f.coefficients))).collect();
        println!("| {name} | {} | {} |", cells.join(" | "), whole(squares));
        if name == "Lanczos1" {
            continue; // a test of its own
        }
        for (k, f) in found.iter().enumerate() {
            let place = format!("{name}, fit {k}");
            if f.verdict != "strict maximum" {
                faults.push(format!("{place}: {}", f.verdict));
            }
            if !(f.coefficients >= COEFFICIENTS && f.squares >= SQUARES) {
                faults.push(format!("{place}: {:.1} and {:.1} digits", f.coefficients, f.squares));
            }
            if f.deviations.is_some_and(|d| d.is_nan() || d < DEVIATIONS) {
                faults.push(format!("{place}: {:?} digits of the standard deviations", f.deviations));
            }
        }
        let mut measured: Vec<f64> = found.iter().map(|f| f.coefficients).collect();
        measured.push(squares);
        let claim = claimed.iter().find(|c| c.0 == name).map(|c| &c.1);
        if !claim.is_some_and(|c| c.len() == 5 && c.iter().zip(&measured).all(|(c, m)| c <= m)) {
            faults.push(format!("{name}: the README claims {claim:?}, measured {measured:.1?}"));
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

/// Restrictions are kept on the way from a start far off: b1 fixed by one gives what b1 known gives.
#[test]
fn the_way_from_a_far_start_keeps_to_restrictions() {
    let curve = PROBLEMS.iter().find(|p| p.0 == "Misra1a").unwrap().1;
    let problem = read("Misra1a", curve);
    let folder = Folder::new();
    folder.write("data.csv", &problem.data);
    let free = problem.study(Way::Curve, 0);
    let known = free.replace("b1 = { start = 500.0 }", "b1 = { known = 230 }");
    assert_ne!(free, known);
    let known = folder.fit(&known, &["--starts", "1"]);
    let imposed = folder.fit(&free, &["--starts", "1", "--maintained", "twice: 2 * b1 = 460"]);
    assert_eq!((known.verdict(), imposed.verdict()), ("strict maximum", "strict maximum"));
    for name in ["b2", "sd"] {
        let [a, b] = [&known, &imposed].map(|f| f.estimate("restricted", name, "value").unwrap());
        assert!(digits(a, b) > 9.0, "{name}: {a} and {b}");
    }
}

/// Two factors of which the curve has only the product: no coordinates make that identified.
#[test]
fn what_the_curve_cannot_tell_apart_stays_flat() {
    let folder = Folder::new();
    folder.write("data.csv", "x,y\n1,2.1\n2,3.9\n3,6.2\n4,7.7\n5,10.4\n");
    let study = "[data]\nfile = \"data.csv\"\n[model]\nfamily = \"normal\"\nresponse = \"y\"\na = { start = 3 }\nb = { start = 4 }\n\
                 [model.mean]\ncurve = \"exp(a) * exp(b) * x\"\n";
    let fit = folder.fit(study, &["--starts", "1"]);
    assert_eq!(fit.verdict(), "flat", "{}", fit.err);
}

/// Data made from the curve itself and rounded to fourteen digits: the certified residual sum of squares is 1.4e-25, so that
/// doubles hold two digits of each residual, and no gradient can be had to a certificate's precision.
#[test]
fn a_perfect_fit_is_found_but_not_certified() {
    let problem = PROBLEMS.iter().find(|p| p.0 == "Lanczos1").unwrap();
    for found in all(problem.0, problem.1) {
        assert_ne!(found.verdict, "strict maximum");
        assert!(found.coefficients >= COEFFICIENTS, "{:.1} digits", found.coefficients);
    }
}
