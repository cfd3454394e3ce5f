//! Tables of counts: symmetry, independence, equilibrium, given shares.

use super::{estimate, fit, printed, same, test};

fn two_way(rows: &[&str], columns: &[&str], counts: &[&[f64]]) -> String {
    let mut out = "one,two,n\n".to_owned();
    for (r, line) in rows.iter().zip(counts) {
        for (c, n) in columns.iter().zip(*line) {
            out += &format!("{r},{c},{n}\n");
        }
    }
    out
}

/// Study of a two-way table; the columns' levels in order.
fn study(rows: &[&str], columns: &[&str], tested: &str) -> String {
    format!(
        "weight = \"n\"\n[data.category]\none = {rows:?}\ntwo = {columns:?}\n[model]\nfamily = \"categorical\"\n\
         response = [\"one\", \"two\"]\n[tested]\n{tested}"
    )
}

/// Unaided distance vision of 7,477 women, right and left eye (Stuart 1953, Biometrika 40; from memory). Bowker (1948),
/// Journal of the American Statistical Association 43; Bishop, Fienberg and Holland (1975) print 19.11 on 6 (from memory).
#[test]
fn symmetry_of_a_square_table() {
    let grades = ["highest", "second", "third", "lowest"];
    let n: [&[f64]; 4] = [
        &[1520.0, 266.0, 124.0, 66.0],
        &[234.0, 1512.0, 432.0, 78.0],
        &[117.0, 362.0, 1772.0, 205.0],
        &[36.0, 82.0, 179.0, 492.0],
    ];
    let total: f64 = n.iter().flat_map(|r| r.iter()).sum();
    let (mut tested, mut bowker, mut ratio) = (String::new(), 0.0, 0.0);
    for i in 0..4 {
        for j in i + 1..4 {
            let (a, b) = (grades[i], grades[j]);
            tested += &format!("s{i}{j} = \"share.{a}.{b} = share.{b}.{a}\"\n");
            bowker += (n[i][j] - n[j][i]).powi(2) / (n[i][j] + n[j][i]);
            let half = 0.5 * (n[i][j] + n[j][i]);
            ratio += 2.0 * (n[i][j] * (n[i][j] / half).ln() + n[j][i] * (n[j][i] / half).ln());
        }
    }
    let fit = fit(&two_way(&grades, &grades, &n), &study(&grades, &grades, &tested), &[]);
    test(&fit, "score", 6.0, bowker);
    test(&fit, "lr", 6.0, ratio);
    printed("Bowker", bowker, 19.11, 0.01);
    for (i, j) in [(0, 1), (2, 1), (0, 3)] {
        estimate(&fit, &format!("share.{}.{}", grades[i], grades[j]), (n[i][j] + n[j][i]) / (2.0 * total));
    }
}

/// Colour of eyes and hair of 5,387 children of Caithness (Fisher 1940, Annals of Eugenics 10; from memory, and the total is
/// as published). Pearson's statistic, as Rao (1948) shows, is the score test; 1240 on 12 (from memory).
#[test]
fn independence_in_a_table() {
    let eyes = ["blue", "light", "medium", "dark"];
    let hair = ["fair", "red", "middle", "deep", "black"];
    let n: [&[f64]; 4] = [
        &[326.0, 38.0, 241.0, 110.0, 3.0],
        &[688.0, 116.0, 584.0, 188.0, 4.0],
        &[343.0, 84.0, 909.0, 412.0, 26.0],
        &[98.0, 48.0, 403.0, 681.0, 85.0],
    ];
    let total: f64 = n.iter().flat_map(|r| r.iter()).sum();
    assert_eq!(total, 5387.0);
    let by_column = |j: usize| n.iter().map(|r| r[j]).sum::<f64>();
    let mut tested = String::new();
    let (mut pearson, mut ratio) = (0.0, 0.0);
    for i in 0..4 {
        for j in 0..5 {
            let e = n[i].iter().sum::<f64>() * by_column(j) / total;
            pearson += (n[i][j] - e).powi(2) / e;
            ratio += 2.0 * n[i][j] * (n[i][j] / e).ln();
            if i > 0 && j > 0 {
                let (r, c) = (eyes[i], hair[j]);
                let line = format!("share.{r}.{c} * share.blue.fair = share.{r}.fair * share.blue.{c}");
                tested += &format!("r{i}{j} = \"{line}\"\n");
            }
        }
    }
    let fit = fit(&two_way(&eyes, &hair, &n), &study(&eyes, &hair, &tested), &[]);
    test(&fit, "score", 12.0, pearson);
    test(&fit, "lr", 12.0, ratio);
    printed("Pearson", pearson, 1240.0, 1.0);
    estimate(&fit, "share.dark.black", n[3].iter().sum::<f64>() * by_column(4) / (total * total));
}

/// Hardy-Weinberg equilibrium of three alleles: Pearson's statistic against products of allele shares by counting, on 3
/// degrees of freedom (Weir 1996, Genetic Data Analysis II, ch. 3). Invented counts.
#[test]
fn equilibrium_of_three_alleles() {
    let cells = [("aa", 21.0), ("ab", 63.0), ("ac", 30.0), ("bb", 41.0), ("bc", 58.0), ("cc", 17.0)];
    let data = cells.iter().fold("cell,n\n".to_owned(), |out, (c, n)| format!("{out}{c},{n}\n"));
    let study = "weight = \"n\"\n[model]\nfamily = \"categorical\"\nresponse = \"cell\"\n[tested]\n\
                 ab = \"share.ab^2 = 4 * share.aa * share.bb\"\nac = \"share.ac^2 = 4 * share.aa * share.cc\"\n\
                 bc = \"share.bc^2 = 4 * share.bb * share.cc\"\n";
    let fit = fit(&data, study, &[]);
    let n: f64 = cells.iter().map(|c| c.1).sum();
    let allele = |a: char| cells.iter().map(|(c, n)| c.matches(a).count() as f64 * n).sum::<f64>() / (2.0 * n);
    let mut pearson = 0.0;
    for (cell, seen) in cells {
        let mut letters = cell.chars();
        let (a, b) = (letters.next().unwrap(), letters.next().unwrap());
        let share = if a == b { allele(a).powi(2) } else { 2.0 * allele(a) * allele(b) };
        estimate(&fit, &format!("share.{cell}"), share);
        pearson += (seen - n * share).powi(2) / (n * share);
    }
    test(&fit, "score", 3.0, pearson);
}

/// Shares known but for one parameter, as in Fisher's (1925) fertile-plant table: maximum likelihood under two linear
/// restrictions is the positive root of a quadratic. 1997, 906, 904, 32 (Fisher, Statistical Methods for Research Workers,
/// table of starchy and sugary maize; from memory), shares (2 + t)/4, (1 - t)/4, (1 - t)/4, t/4; t = 0.0357 printed.
#[test]
fn linkage_of_maize() {
    let cells = [("sg", 1997.0), ("sw", 906.0), ("ug", 904.0), ("uw", 32.0)];
    let data = cells.iter().fold("cell,n\n".to_owned(), |out, (c, n)| format!("{out}{c},{n}\n"));
    let study = "weight = \"n\"\n[model]\nfamily = \"categorical\"\nresponse = \"cell\"\n\
                 [quantities]\nt = \"4 * share.uw\"\n[tested]\nalike = \"share.sw = share.ug\"\n\
                 sum = \"share.sg + share.sw = 3/4\"\n";
    let fit = fit(&data, study, &[]);
    let [a, b, c, d] = cells.map(|c| c.1);
    let n: f64 = a + b + c + d;
    // n t^2 - (a - 2 b - 2 c - d) t - 2 d = 0
    let p: f64 = a - 2.0 * b - 2.0 * c - d;
    let t = (p + (p * p + 8.0 * n * d).sqrt()) / (2.0 * n);
    let got = fit.list("/restricted/quantities")[0]["value"].as_f64();
    same("t", got, t);
    printed("t", t, 0.0357, 0.0001);
    let expected = [(2.0 + t) / 4.0, (1.0 - t) / 4.0, (1.0 - t) / 4.0, t / 4.0];
    let pearson = cells.iter().zip(expected).map(|((_, o), e)| (o - n * e).powi(2) / (n * e)).sum();
    test(&fit, "score", 2.0, pearson);
}

/// A covariate with two levels in a multinomial logit: the score test of its coefficients is Pearson's statistic of the
/// table (Day and Byar 1979, Biometrics 35, for two labels; Agresti 2002, Categorical Data Analysis, ch. 7). Invented.
#[test]
fn no_effect_in_a_multinomial_logit() {
    let n: [&[f64]; 2] = [&[34.0, 21.0, 45.0], &[18.0, 30.0, 27.0]];
    let data = two_way(&["north", "south"], &["whole", "chipped", "broken"], &n);
    let study = "weight = \"n\"\n[data.category]\none = [\"north\", \"south\"]\ntwo = [\"whole\", \"chipped\", \"broken\"]\n\
                 [model]\nfamily = \"categorical\"\nresponse = \"two\"\n[model.share]\nterms = [\"one\"]\n\
                 [tested]\nnone = \"share.chipped.one.south = share.broken.one.south = 0\"\n";
    let fit = fit(&data, study, &[]);
    let total: f64 = n.iter().flat_map(|r| r.iter()).sum();
    let mut pearson = 0.0;
    for row in n {
        for j in 0..3 {
            let e = row.iter().sum::<f64>() * (n[0][j] + n[1][j]) / total;
            pearson += (row[j] - e).powi(2) / e;
        }
    }
    test(&fit, "score", 2.0, pearson);
    estimate(&fit, "share.broken.intercept", (72.0f64 / 52.0).ln());
}
