//! Normal distribution of several columns: means, standard deviations and correlations.

use super::Link;
use super::composite::{Composite, Drawn, Group, Layout, Made, Piece, Reads, Summary, plus, written};
use crate::math::{Random, Range};

/// The family.
pub const MULTIVARIATE_NORMAL: Composite = Composite {
    name: "multivariate_normal",
    response: "several columns of numbers",
    reads: Reads::Numbers,
    groups: &[
        Group {
            name: "mean",
            pattern: "COLUMN",
            range: Range::ALL,
            links: &[Link::Identity, Link::Log],
            intercept: true,
            known: None,
            meaning: "expected value of the column",
        },
        Group {
            name: "sd",
            pattern: "COLUMN",
            range: Range::POSITIVE,
            links: &[Link::Log, Link::Identity],
            intercept: true,
            known: None,
            meaning: "standard deviation of the column",
        },
        Group {
            name: "corr",
            pattern: "COLUMN.COLUMN",
            range: Range { low: -1.0, high: 1.0, low_closed: false, high_closed: false },
            links: &[],
            intercept: true,
            known: None,
            meaning: "correlation of two columns, in the order of the response",
        },
    ],
    maintained: "",
    formula: "-log(sd.COLUMN) - ... - log(det R) / 2 - z' R^-1 z / 2 - p log(2 pi) / 2 with z = (y - mean) / sd and R of corr.COLUMN.COLUMN",
    information: "means: R^-1 / (sd sd'); with Q = R^-1, (sd.A, sd.A): (1 + Q_AA) / sd.A^2, (sd.A, sd.B): R_AB Q_AB / (sd.A sd.B), (sd.A, corr.A.B): Q_AB / sd.A, (corr.A.B, corr.C.D): Q_AC Q_BD + Q_AD Q_BC; closed form",
    source: "Anderson, An Introduction to Multivariate Statistical Analysis, ch. 3; Magnus and Neudecker, Matrix Differential Calculus, ch. 15",
    make,
    start,
    sample,
    concave: false,
};

fn make(layout: &Layout) -> Made {
    let p = layout.pieces.len();
    let name = |k: usize| layout.pieces[k].to_string();
    let mean = |k: usize| written("mean", &layout.pieces[k]);
    let sd = |k: usize| written("sd", &layout.pieces[k]);
    let pair = |i: usize, j: usize| layout.pieces[i.min(j)].clone().then(&layout.pieces[i.max(j)]);
    let corr = |i: usize, j: usize| if i == j { "1".into() } else { written("corr", &pair(i, j)) };
    let mut made = Made::default();
    for k in 0..p {
        let meaning = format!("expected value of {}", name(k));
        made.parameters.push(Piece { group: 0, key: layout.pieces[k].clone(), meaning });
    }
    for k in 0..p {
        let meaning = format!("standard deviation of {}", name(k));
        made.parameters.push(Piece { group: 1, key: layout.pieces[k].clone(), meaning });
    }
    for i in 0..p {
        for j in i + 1..p {
            let meaning = format!("correlation of {} and {}", name(i), name(j));
            made.parameters.push(Piece { group: 2, key: pair(i, j), meaning });
        }
    }
    // R = L L', M = L^-1, Q = M' M
    let (l, m, q) = (
        |i: usize, j: usize| format!("l.'{i}'.'{j}'"),
        |i: usize, j: usize| format!("m.'{i}'.'{j}'"),
        |i: usize, j: usize| format!("q.'{}'.'{}'", i.min(j), i.max(j)),
    );
    for i in 0..p {
        for j in 0..i {
            let less: String = (0..j).map(|k| format!(" - {} * {}", l(i, k), l(j, k))).collect();
            made.lets.push((l(i, j), format!("({}{less}) / {}", corr(i, j), l(j, j))));
        }
        let less: String = (0..i).map(|k| format!(" - {}^2", l(i, k))).collect();
        made.lets.push((l(i, i), format!("sqrt(1{less})")));
    }
    for i in 0..p {
        made.lets.push((m(i, i), format!("1 / {}", l(i, i))));
        for j in (0..i).rev() {
            let sum = plus((j..i).map(|k| format!("{} * {}", l(i, k), m(k, j))));
            made.lets.push((m(i, j), format!("-({sum}) / {}", l(i, i))));
        }
    }
    for i in 0..p {
        for j in i..p {
            made.lets.push((q(i, j), plus((j..p).map(|k| format!("{} * {}", m(k, i), m(k, j))))));
        }
    }
    for k in 0..p {
        made.lets
            .push((format!("z.'{k}'"), format!("({} - {}) / {}", written("y", &layout.pieces[k]), mean(k), sd(k))));
    }
    let logs: String = (0..p).map(|k| format!(" - log({}) - log({})", sd(k), l(k, k))).collect();
    let mut squares = Vec::new();
    for i in 0..p {
        squares.push(format!("{} * z.'{i}'^2 / 2", q(i, i)));
        for j in i + 1..p {
            squares.push(format!("{} * z.'{i}' * z.'{j}'", q(i, j)));
        }
    }
    made.log_density = format!("-{p} * log(2 * pi) / 2{logs} - ({})", plus(squares));
    let pairs: Vec<(usize, usize)> = (0..p).flat_map(|i| (i + 1..p).map(move |j| (i, j))).collect();
    for i in 0..p {
        for j in i..p {
            made.information.push((mean(i), mean(j), format!("{} / ({} * {})", q(i, j), sd(i), sd(j))));
            let scale = match i == j {
                true => format!("(1 + {}) / {}^2", q(i, i), sd(i)),
                false => format!("{} * {} / ({} * {})", corr(i, j), q(i, j), sd(i), sd(j)),
            };
            made.information.push((sd(i), sd(j), scale));
        }
        for &(a, b) in pairs.iter().filter(|(a, b)| *a == i || *b == i) {
            made.information.push((sd(i), corr(a, b), format!("{} / {}", q(a, b), sd(i))));
        }
    }
    for (at, &(i, j)) in pairs.iter().enumerate() {
        for &(k, n) in &pairs[at..] {
            let text = format!("{} * {} + {} * {}", q(i, k), q(j, n), q(i, n), q(j, k));
            made.information.push((corr(i, j), corr(k, n), text));
        }
    }
    made
}

fn start(_: &Layout, summary: &Summary) -> Vec<f64> {
    let spread = |v: f64, m: f64| if v > 0.0 { v.sqrt() } else { m.abs().max(1.0) };
    let mut out: Vec<f64> = summary.columns.iter().map(|m| m.mean).collect();
    out.extend(summary.columns.iter().map(|m| spread(m.variance, m.mean)));
    // drawn a little to zero, the matrix stays positive definite
    out.extend(summary.correlations.iter().map(|r| 0.98 * r.clamp(-1.0, 1.0)));
    out
}

fn sample(layout: &Layout, values: &[f64], random: &mut Random) -> Drawn {
    let p = layout.pieces.len();
    // where the correlation of columns i < j stands among the values
    let place = |i: usize, j: usize| 2 * p + i * p - i * (i + 1) / 2 + j - i - 1;
    let mut l = vec![vec![0.0; p]; p];
    for i in 0..p {
        for j in 0..=i {
            let r = if i == j { 1.0 } else { values[place(j, i)] };
            let rest: f64 = r - (0..j).map(|k| l[i][k] * l[j][k]).sum::<f64>();
            l[i][j] = if i == j { rest.sqrt() } else { rest / l[j][j] };
        }
    }
    let z: Vec<f64> = (0..p).map(|_| random.normal()).collect();
    Drawn::Values((0..p).map(|i| values[i] + values[p + i] * (0..=i).map(|k| l[i][k] * z[k]).sum::<f64>()).collect())
}
