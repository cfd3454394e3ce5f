//! The same problem said differently has the same answer.
//!
//! Agreement is to 1e-9 relative (absolute for numbers below one): each side is solved to a scaled gradient of 1e-7 by a
//! quadratically convergent iteration, so that what is left is rounding, some hundred thousand times below that.

use crate::harness::{Fit, Folder, Source, csv, near};

const SAME: f64 = 1e-9;

fn same(what: &str, a: Option<f64>, b: Option<f64>) {
    let (Some(a), Some(b)) = (a, b) else { panic!("{what}: {a:?} and {b:?}") };
    assert!(near(a, b, SAME, SAME), "{what}: {a} and {b}");
}

/// What no way of writing may change (Wald may, and so may a multiplier's scale).
fn same_tests(what: &str, a: &Fit, b: &Fit) {
    for fit in [a, b] {
        assert_eq!((fit.status, fit.verdict()), (0, "strict maximum"), "{what}: {}", fit.err);
    }
    for pointer in [
        "/restricted/log_likelihood",
        "/unrestricted/log_likelihood",
        "/tests/score/chi_square",
        "/tests/score/df",
        "/tests/lr/chi_square",
    ] {
        same(&format!("{what}: {pointer}"), a.number(pointer), b.number(pointer));
    }
}

fn same_estimates(what: &str, a: &Fit, b: &Fit) {
    same_tests(what, a, b);
    for block in ["restricted", "unrestricted"] {
        let list = a.list(&format!("/{block}/estimates"));
        assert!(!list.is_empty());
        for e in list {
            let name = e["name"].as_str().unwrap();
            for figure in ["value", "se"] {
                same(
                    &format!("{what}: {block} {name} {figure}"),
                    a.estimate(block, name, figure),
                    b.estimate(block, name, figure),
                );
            }
        }
    }
}

fn same_figures(what: &str, a: &Fit, b: &Fit, figures: &[&str]) {
    for figure in figures {
        let (a, b) = (a.tested(figure), b.tested(figure));
        assert!(!a.is_empty());
        for (x, y) in a.iter().zip(&b) {
            same(&format!("{what}: {figure}"), *x, *y);
        }
    }
}

/// Flaws of 60 inspections by kiln, soak and area.
fn flaws(soak_unit: f64) -> Vec<(&'static str, Vec<String>)> {
    let mut source = Source(3);
    let (mut kiln, mut soak, mut area, mut count) = (vec![], vec![], vec![], vec![]);
    for i in 0..60 {
        let hours = (20.0 + 40.0 * source.next()).round() / 10.0;
        let square = (30.0 + 60.0 * source.next()).round() / 10.0;
        let mean = square * (0.4 + 0.1 * hours) * [1.0, 0.8, 0.5][i % 3];
        kiln.push(["north", "middle", "south"][i % 3].to_owned());
        soak.push((hours * soak_unit).to_string());
        area.push(square.to_string());
        count.push((mean + 2.0 * mean.sqrt() * (source.next() - 0.5)).round().max(0.0).to_string());
    }
    vec![("kiln", kiln), ("soak", soak), ("area", area), ("flaws", count)]
}

fn flaw_study(tested: &str) -> String {
    format!(
        "[data]\nfile = \"data.csv\"\n[data.category]\nkiln = [\"north\", \"middle\", \"south\"]\n[model]\nfamily = \"poisson\"\n\
         response = \"flaws\"\nexposure = \"area\"\n[model.rate]\nterms = [\"kiln\", \"soak\"]\n[tested]\n{tested}\n"
    )
}

fn fit(columns: &[(&str, Vec<String>)], study: &str) -> Fit {
    fit_with(columns, study, &[])
}

fn fit_with(columns: &[(&str, Vec<String>)], study: &str, options: &[&str]) -> Fit {
    let folder = Folder::new();
    folder.write("data.csv", csv(columns));
    folder.fit(study, options)
}

#[test]
fn rows_in_another_order() {
    let study = flaw_study("ratio = \"rate.kiln.south = 2 * rate.kiln.middle\"\nslope = \"rate.soak = 0.15\"");
    let straight = flaws(1.0);
    let shuffled: Vec<_> =
        straight.iter().map(|(n, c)| (*n, (0..60).map(|i| c[(i * 37 + 11) % 60].clone()).collect())).collect();
    let (a, b) = (fit(&straight, &study), fit(&shuffled, &study));
    same_estimates("order", &a, &b);
    same_figures("order", &a, &b, &["value", "se", "z", "p", "gap"]);
}

#[test]
fn a_column_in_another_unit() {
    // Hours as 64ths of an hour: exact in binary, so that only the scale differs.
    let study = |k: f64| flaw_study(&format!("ratio = \"rate.kiln.south = 5 * {k} * rate.soak\""));
    let (a, b) = (fit(&flaws(1.0), &study(-1.0)), fit(&flaws(64.0), &study(-64.0)));
    same_tests("unit", &a, &b);
    same_figures("unit", &a, &b, &["value", "se", "z"]);
    for figure in ["value", "se"] {
        let get = |f: &Fit| f.estimate("restricted", "rate.soak", figure);
        same("unit: soak", get(&a), get(&b).map(|v| 64.0 * v));
    }
}

#[test]
fn a_column_in_a_wildly_other_unit() {
    let study = |k: f64| flaw_study(&format!("ratio = \"rate.kiln.south = 5 * {k} * rate.soak\""));
    let power = 2f64.powi(40);
    let (a, b) = (fit(&flaws(1.0), &study(-1.0)), fit(&flaws(power), &study(-power)));
    same_tests("wild unit", &a, &b);
    same_figures("wild unit", &a, &b, &["value", "z"]);
}

#[test]
fn a_counted_table_and_its_rows() {
    let counts = [
        ("north", "1", 9),
        ("north", "0", 31),
        ("middle", "1", 6),
        ("middle", "0", 27),
        ("south", "1", 3),
        ("south", "0", 40),
    ];
    let column = |k: usize, whole: bool| -> Vec<String> {
        let cell = |c: &(&str, &str, usize)| [c.0.to_owned(), c.1.to_owned(), c.2.to_string()][k].clone();
        counts.iter().flat_map(|c| std::iter::repeat_n(cell(c), if whole { 1 } else { c.2 })).collect()
    };
    let study = |weight: &str| {
        format!(
            "[data]\nfile = \"data.csv\"\n{weight}\n[data.category]\nkiln = [\"north\", \"middle\", \"south\"]\n[model]\nfamily = \"binomial\"\n\
             response = \"cracked\"\n[model.probability]\nterms = [\"kiln\"]\nlink = \"logit\"\n[tested]\nodds = \"probability.kiln.south = 2 * probability.kiln.middle\"\n"
        )
    };
    let table = fit(
        &[("kiln", column(0, true)), ("cracked", column(1, true)), ("tiles", column(2, true))],
        &study("weight = \"tiles\""),
    );
    let rows = fit(&[("kiln", column(0, false)), ("cracked", column(1, false))], &study(""));
    same_estimates("counted", &table, &rows);
    same_figures("counted", &table, &rows, &["value", "se", "z", "p", "gap"]);
    same("weight", table.number("/data/weight_total"), rows.number("/data/weight_total"));
}

#[test]
fn one_restriction_in_three_forms() {
    let study = |tested: &str| {
        format!(
            "[data]\nfile = \"data.csv\"\n[model]\nfamily = \"poisson\"\nresponse = \"flaws\"\nexposure = \"area\"\nper = \"kiln\"\n[tested]\nfixed = \"{tested}\"\n"
        )
    };
    let data = flaws(1.0);
    let linear = fit(&data, &study("north.rate = 2 * south.rate"));
    for form in ["north.rate / south.rate = 2", "log(north.rate) - log(south.rate) = log(2)"] {
        let other = fit(&data, &study(form));
        same_estimates(form, &linear, &other);
        same_figures(form, &linear, &other, &["z", "p"]);
    }
}

#[test]
fn one_restriction_on_shares_in_three_forms() {
    let study = |tested: &str| {
        let file = crate::harness::root().join("datasets/pallet.csv");
        let text = std::fs::read_to_string(crate::harness::root().join("datasets/pallet.toml")).unwrap();
        text.replace("pallet.csv", file.to_str().unwrap()).replace("share.north = 2 * share.south", tested)
    };
    let linear = Folder::new().fit(&study("share.north = 2 * share.south"), &[]);
    for form in ["share.north / share.south = 2", "log(share.north) - log(share.south) = log(2)"] {
        let other = Folder::new().fit(&study(form), &[]);
        same_tests(form, &linear, &other);
        same_figures(form, &linear, &other, &["z", "p"]);
    }
}

#[test]
fn a_redundant_restriction_changes_nothing() {
    let data = flaws(1.0);
    let plain = "a = \"rate.kiln.middle = rate.kiln.south\"\nb = \"rate.soak = 0.1\"";
    let alone = fit(&data, &flaw_study(plain));
    let more =
        fit(&data, &flaw_study(&format!("{plain}\nc = \"rate.kiln.middle + rate.soak = rate.kiln.south + 0.1\"")));
    same_estimates("redundant", &alone, &more);
    assert!(more.warnings().contains('c'), "the redundant one is named: {}", more.warnings());
}

#[test]
fn a_linear_restriction_substituted_into_the_model() {
    let mut source = Source(9);
    let (mut one, mut two, mut y) = (vec![], vec![], vec![]);
    for _ in 0..40 {
        let (a, b) = ((source.next() * 64.0).round() / 8.0, (source.next() * 64.0).round() / 8.0);
        one.push(a.to_string());
        two.push(b.to_string());
        y.push((3.0 + 1.1 * a + 0.8 * b + 2.0 * source.next()).to_string());
    }
    let data = [("one", one), ("two", two), ("y", y)];
    let study = |derive: &str, terms: &str, tested: &str| {
        format!(
            "[data]\nfile = \"data.csv\"\n{derive}\n[model]\nfamily = \"normal\"\nresponse = \"y\"\n[model.mean]\nterms = {terms}\n{tested}\n"
        )
    };
    let tested = fit(&data, &study("", "[\"one\", \"two\"]", "[tested]\nalike = \"mean.one = mean.two\""));
    let inside = fit(&data, &study("[data.derive]\nboth = \"one + two\"", "[\"both\"]", ""));
    same("l", tested.number("/restricted/log_likelihood"), inside.number("/restricted/log_likelihood"));
    for figure in ["value", "se"] {
        for (a, b) in
            [("mean.one", "mean.both"), ("mean.two", "mean.both"), ("mean.intercept", "mean.intercept"), ("sd", "sd")]
        {
            same(a, tested.estimate("restricted", a, figure), inside.estimate("restricted", b, figure));
        }
    }
}

#[test]
fn a_multiple_of_a_maintained_restriction_added() {
    let label = ["a", "b", "c", "d"].map(str::to_owned).to_vec();
    let data = [("label", label), ("n", ["31", "22", "40", "17"].map(str::to_owned).to_vec())];
    let study = |tested: &str| {
        format!(
            "[data]\nfile = \"data.csv\"\nweight = \"n\"\n[model]\nfamily = \"categorical\"\nresponse = \"label\"\n[tested]\nalike = \"{tested}\"\n"
        )
    };
    let expected = &["--information", "expected"];
    let plain = fit_with(&data, &study("share.a = share.b"), expected);
    let mixed = fit_with(&data, &study("share.a - share.b + 3 * (sum(share.*) - 1) = 0"), expected);
    same_estimates("multiple", &plain, &mixed);
    same_figures("multiple", &plain, &mixed, &["value", "se", "z", "p", "gap"]);
    // The maintained multiplier takes up the difference: mu is the slope with the tested right-hand side kept.
    let mu = |f: &Fit| f.multipliers(|role| role == "family", "value")[0];
    let lambda = plain.tested("value")[0].unwrap();
    same("mu", mu(&plain), mu(&mixed).map(|m| m + 3.0 * lambda));
}
