//! Counts and comparisons: rates, dispersion, extra zeros, contests, ordered labels.

use super::{estimate, fit, printed, same, test};

/// Deaths by horse kick in fourteen corps over twenty years (Bortkiewicz 1898, Das Gesetz der kleinen Zahlen; from memory,
/// and the total is 196 as published). Equal rates of fourteen samples: the index of dispersion (Fisher 1925, Statistical
/// Methods for Research Workers, section 16).
#[test]
fn equal_rates_of_fourteen_corps() {
    let deaths = [16.0, 16.0, 12.0, 12.0, 8.0, 11.0, 17.0, 12.0, 7.0, 13.0, 15.0, 25.0, 24.0, 8.0];
    assert_eq!(deaths.iter().sum::<f64>(), 196.0);
    let rows = deaths.iter().enumerate().map(|(k, n)| format!("c{k},{n},20\n"));
    let data = format!("corps,deaths,years\n{}", rows.collect::<String>());
    let study = "[model]\nfamily = \"poisson\"\nresponse = \"deaths\"\nexposure = \"years\"\nper = \"corps\"\n\
                 [tested]\nsame = \"equal(*.rate)\"\n";
    let fit = fit(&data, study, &[]);
    let dispersion = deaths.iter().map(|n: &f64| (n - 14.0).powi(2) / 14.0).sum();
    test(&fit, "score", 13.0, dispersion);
    test(&fit, "lr", 13.0, deaths.iter().map(|n: &f64| 2.0 * n * (n / 14.0).ln()).sum());
    estimate(&fit, "c3.rate", 0.7);
}

/// A given ratio of two Poisson rates: given their sum, one count is binomial (Przyborowski and Wilenski 1940, Biometrika 31).
#[test]
fn a_ratio_of_two_rates() {
    let data = "kiln,flaws,area\nnorth,41,12.5\nsouth,14,9\n";
    let study = "[model]\nfamily = \"poisson\"\nresponse = \"flaws\"\nexposure = \"area\"\nper = \"kiln\"\n\
                 [tested]\ndouble = \"north.rate = 1.5 * south.rate\"\n";
    let fit = fit(data, study, &[]);
    let p = 1.5 * 12.5 / (1.5 * 12.5 + 9.0);
    let z = (41.0 - 55.0 * p) / f64::sqrt(55.0 * p * (1.0 - p));
    test(&fit, "score", 1.0, z * z);
    estimate(&fit, "south.rate", 55.0 / (1.5 * 12.5 + 9.0));
}

/// Extra zeros: van den Broek (1995), Biometrics 51: score test of a Poisson law against one with more zeros. Invented.
#[test]
fn no_extra_zeros() {
    let counts = [(0.0, 41.0), (1.0, 29.0), (2.0, 17.0), (3.0, 8.0), (4.0, 3.0), (6.0, 1.0)];
    let data = counts.iter().fold("flaws,n\n".to_owned(), |out, (y, n)| format!("{out}{y},{n}\n"));
    let study = "weight = \"n\"\n[model]\nfamily = \"mixture\"\nresponse = \"flaws\"\n\
                 [[model.component]]\nname = \"whole\"\nfamily = \"point\"\nknown = { at = 0 }\n\
                 [[model.component]]\nname = \"rest\"\nfamily = \"poisson\"\n[tested]\nnone = \"share.whole = 0\"\n";
    let fit = fit(&data, study, &["--information", "expected"]);
    let n: f64 = counts.iter().map(|c| c.1).sum();
    let mean = counts.iter().map(|(y, n)| y * n).sum::<f64>() / n;
    let p = f64::exp(-mean);
    let want = (counts[0].1 - n * p).powi(2) / (n * p * (1.0 - p) - n * mean * p * p);
    estimate(&fit, "rest.rate", mean);
    test(&fit, "score", 1.0, want);
}

/// A round robin in which each of t items meets each other r times: equal strengths, by the wins alone. Durbin (1951),
/// British Journal of Psychology, Statistical Section 4; David (1988), The Method of Paired Comparisons, ch. 3. Invented.
#[test]
fn equal_strengths_in_a_round_robin() {
    // wins of the first of a pair in 6 contests
    let pairs = [
        ("red", "blue", 4),
        ("red", "grey", 5),
        ("red", "buff", 3),
        ("blue", "grey", 4),
        ("blue", "buff", 1),
        ("grey", "buff", 2),
    ];
    let (t, r) = (4.0, 6.0);
    let mut data = "won,lost,n\n".to_owned();
    let mut wins = std::collections::BTreeMap::new();
    for (a, b, w) in pairs {
        data += &format!("{a},{b},{w}\n{b},{a},{}\n", 6 - w);
        *wins.entry(a).or_insert(0.0) += f64::from(w);
        *wins.entry(b).or_insert(0.0) += f64::from(6 - w);
    }
    let study = "weight = \"n\"\n[model]\nfamily = \"paired_comparison\"\nresponse = [\"won\", \"lost\"]\n\
                 [tested]\nsame = \"equal(strength.*)\"\n";
    let fit = fit(&data, study, &[]);
    let want = wins.values().map(|a: &f64| (a - r * (t - 1.0) / 2.0).powi(2)).sum::<f64>() * 4.0 / (r * t);
    test(&fit, "score", 3.0, want);
    estimate(&fit, "strength.red", 0.0);
}

/// Tonsils of carriers and others of a streptococcus (Holmes and Williams 1954, Journal of Hygiene 52; from memory), the example
/// of McCullagh (1980), Journal of the Royal Statistical Society B 42, who prints an effect of 0.603. The score test of no
/// effect is Wilcoxon's with midranks: H of Kruskal and Wallis (1952) times n / (n - 1).
#[test]
fn no_effect_in_an_ordered_logit() {
    let (others, carriers) = ([497.0, 560.0, 269.0], [19.0, 29.0, 24.0]);
    let size = ["present", "enlarged", "great"];
    let mut data = "size,carrier,n\n".to_owned();
    for k in 0..3 {
        data += &format!("{0},0,{1}\n{0},1,{2}\n", size[k], others[k], carriers[k]);
    }
    let study = "weight = \"n\"\n[data.category]\nsize = [\"present\", \"enlarged\", \"great\"]\n[model]\n\
                 family = \"ordered_logit\"\nresponse = \"size\"\n[model.location]\nterms = [\"carrier\"]\n\
                 [tested]\nnone = \"location.carrier = 0\"\n";
    let fit = fit(&data, study, &[]);
    let (n0, n1): (f64, f64) = (others.iter().sum(), carriers.iter().sum());
    let n = n0 + n1;
    let (mut before, mut rank, mut ties) = (0.0, 0.0, 0.0);
    for k in 0..3 {
        let all: f64 = others[k] + carriers[k];
        rank += carriers[k] * (before + (all + 1.0) / 2.0);
        ties += all.powi(3) - all;
        before += all;
    }
    let distance = rank - n1 * (n + 1.0) / 2.0;
    let variance = n0 * n1 / 12.0 * (n + 1.0 - ties / (n * (n - 1.0)));
    test(&fit, "score", 1.0, distance.powi(2) / variance * n / (n - 1.0));
    let effect = fit.estimate("unrestricted", "location.carrier", "value").unwrap();
    printed("effect", effect, 0.603, 0.001);
    same("cut", fit.estimate("restricted", "cut.present", "value"), (516.0f64 / (n - 516.0)).ln());
}
