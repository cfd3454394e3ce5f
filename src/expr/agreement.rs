//! Tests that hold the engine together: programs over blocks against one row at a time, derivatives against differences.

use super::{
    Graph, Id, Layout, Output, Registers, Scalars, Scope, Sign, Store, Variable, blocks, build, compile,
    parse_expression, preparation,
};

const TEXTS: &[&str] = &[
    "-log(b) - ((y - a) / b)^2 / 2 - log(2 * pi) / 2",
    "y * log(x * exp(a)) - x * exp(a) - lgamma(y + 1)",
    "y * log(logistic(a + b * x)) + (3 - y) * log1p(-logistic(a + b * x))",
    "log_mix(logistic(a), -(y - 1)^2, 1 - logistic(a), -(y - b)^2 / 2)",
    "log_sum_exp(a * x, b * y, a - b)",
    "(log(b) + (b - 1) * log(x / a) - log(a)) - (x / a)^b",
    "if(x > 1, a * x, log(b) * y)",
    "normal_log_cdf((x - a) / b) + normal_log_interval((x - a) / b, (x + y + 1 - a) / b)",
    "abs(x - a) + max(a, x * b) + min(y, a, b)",
    "sqrt(x + b) * tanh(a * x) + erf(a) * sinh(x / 3) + cosh(b * x / 5)",
    "digamma(x + b) + lgamma(a + 1) + polygamma(1, a + x)",
    "log1mexp(a * x) + expm1(a) * log1p(b * x) + logit(logistic(a * y))",
    "atan(a * x) + sin(b) * cos(x * a) + asin(a / 9) + acos(b / 9) + tan(a / 5)",
    "x^a + (x - 3)^2 * b + (a + b * x)^-1.5 + (a * x)^b",
    "bessel_i(0, a * x) + erfc(a * x / 3) + normal_cdf(x - b)",
    "(a * exp(-b * x) + 1 - y)^2 / a^2 + 1 / (1 + b * x)^3",
    "y * log(y * a) - y * b",
    "deviance(y, a * x) + deviance(y * a, b) + factorial_remainder(a * y + b)",
    "stirling_inverse(0, a * x) + stirling_inverse(1, b / 30) * stirling_inverse(0, a * b)",
    "log1p_over(0, a * x - b / 3) + log1p_over(1, b * y)",
    "log1p_excess(0, a * x - b / 3) * log1p_excess(1, b * y / 9)",
    "gamma_log_cdf(0, b, x / a) + gamma_log_survival(0, a * b, x * b)",
    "gamma_log_cdf(1, x, a * b) + gamma_log_survival(1, x + y, 3 * a) * gamma_log_cdf(2, x, b)",
    "beta_log_cdf(0, 0, a, b, x / 3, 1 - x / 3) + beta_log_cdf(0, 0, a * x, b / a, logistic(b - a), logistic(a - b))",
    "beta_log_cdf(1, 0, x, y + 1, a / 2, 1 - a / 2) + beta_log_cdf(0, 1, x, 2, 1 - a / 2, a / 2)",
    "beta_log_cdf(1, 1, x, y + 1, a / 2, 1 - a / 2) + beta_log_cdf(2, 0, x, 2, b / 4, 1 - b / 4) * beta_log_cdf(0, 2, x, 2, a / 4, 1 - a / 4)",
    "log_bessel_i0_scaled(a * x) * b",
    "log_bessel_i0(a * x) - bessel_ratio(b * y) * bessel_ratio(20 * a * b * x)",
];

fn scope(graph: &mut Graph) -> Scope {
    graph.set_parameter_sign(0, Sign::Positive);
    graph.set_parameter_sign(1, Sign::Positive);
    graph.set_column_sign(0, Sign::Positive);
    graph.set_column_sign(1, Sign::Nonnegative);
    let mut scope = Scope::new("name");
    for (i, name) in ["a", "b"].into_iter().enumerate() {
        let id = graph.parameter(i as u32);
        scope.insert(name, id);
    }
    for (i, name) in ["x", "y"].into_iter().enumerate() {
        let id = graph.column(i as u32);
        scope.insert(name, id);
    }
    scope
}

fn outputs(graph: &mut Graph, l: Id) -> Vec<Id> {
    let vs = [Variable::Parameter(0), Variable::Parameter(1)];
    let mut out = vec![l];
    for v in vs {
        out.push(graph.derivative(l, v));
    }
    for (i, u) in vs.into_iter().enumerate() {
        for v in &vs[i..] {
            let d = graph.derivative(l, u);
            out.push(graph.derivative(d, *v));
        }
    }
    out
}

/// One row: columns are constants, so nothing but the scalar evaluation is used.
fn one_row(text: &str, x: f64, y: f64, theta: &[f64]) -> Vec<f64> {
    let mut g = Graph::new();
    let mut s = scope(&mut g);
    let (cx, cy) = (g.constant(x), g.constant(y));
    s.insert("x", cx);
    s.insert("y", cy);
    let l = build(&mut g, &parse_expression(text).unwrap(), &s).unwrap();
    let out = outputs(&mut g, l);
    Scalars::compile(&g, &out).evaluate(theta)
}

fn data(n: usize) -> (Vec<f64>, Vec<f64>, Vec<f64>) {
    let x = (0..n).map(|i| 0.3 + (i * 37 % 101) as f64 / 40.0).collect();
    let y = (0..n).map(|i| (i * 13 % 4) as f64).collect();
    let w = (0..n).map(|i| 1.0 + (i % 3) as f64 / 2.0).collect();
    (x, y, w)
}

#[test]
fn programs_over_blocks_agree_with_single_rows() {
    let theta = [0.7, 1.3];
    for weighted in [false, true] {
        for text in TEXTS {
            let (x, y, w) = data(1_100);
            let mut g = Graph::new();
            let s = scope(&mut g);
            let l = build(&mut g, &parse_expression(text).unwrap(), &s).unwrap();
            let ids = outputs(&mut g, l);
            let mut layout = Layout::default();
            let asked: Vec<Output> = ids.iter().map(|&i| Output::Sum(i)).collect();
            let program = compile(&mut g, &mut layout, &asked, 0, weighted);
            let (prep, raw) = preparation(&mut g, &layout, weighted);
            let weights = weighted.then(|| blocks(w.iter().copied()));
            let columns = (0..raw.columns())
                .map(|k| blocks(if raw.raw(&g, k) == Some(0) { x.clone() } else { y.clone() }.into_iter()))
                .collect();
            let source = Store { columns, weights: weights.clone(), rows: x.len() };
            let scalars = prep.scalars(&[]);
            let mut registers = Registers::new(&prep);
            let mut kept = vec![Vec::new(); layout.columns()];
            let mut sums = vec![0.0; prep.gathers()];
            for b in 0..source.blocks() {
                prep.block(&mut registers, &source, b, &scalars, &mut sums);
                for (k, out) in kept.iter_mut().enumerate() {
                    let scale = prep.row_scale(k, &scalars);
                    out.extend(prep.row(k, &registers, &source, b).iter().map(|v| v * scale));
                }
            }
            let fixed = prep.finish(&scalars, &sums, &[]);
            let columns = kept.into_iter().map(|c| blocks(c.into_iter())).collect();
            let store = Store { columns, weights, rows: x.len() };
            let scalars = program.scalars(&theta);
            let mut registers = Registers::new(&program);
            let mut sums = vec![0.0; program.gathers()];
            for b in 0..store.blocks() {
                program.block(&mut registers, &store, b, &scalars, &mut sums);
            }
            let got = program.finish(&scalars, &sums, &fixed);
            let mut want = vec![0.0; got.len()];
            let mut size = vec![0.0; got.len()];
            for i in 0..x.len() {
                let k = if weighted { w[i] } else { 1.0 };
                for (j, v) in one_row(text, x[i], y[i], &theta).into_iter().enumerate() {
                    want[j] += k * v;
                    size[j] += k * v.abs();
                }
            }
            for j in 0..got.len() {
                // both sum about a thousand rounded terms; hoisting may cost a digit
                let slack = 3e-13 * size[j] + 1e-12;
                assert!((got[j] - want[j]).abs() <= slack, "{text}, output {j}: {} not {}", got[j], want[j]);
            }
        }
    }
}

#[test]
fn derivatives_agree_with_differences() {
    for text in TEXTS {
        for (x, y) in [(0.4, 0.0), (1.7, 2.0), (2.6, 3.0)] {
            let theta = [0.7, 1.3];
            let exact = one_row(text, x, y, &theta);
            let h = 1e-5;
            let at = |i: usize, k: f64| {
                let mut t = theta;
                t[i] += k * h;
                one_row(text, x, y, &t)
            };
            let order = [(0, 0, 3), (0, 1, 4), (1, 1, 5)];
            for i in 0..2 {
                let (up, down) = (at(i, 1.0), at(i, -1.0));
                // a central difference with h = 1e-5 is good to about 1e-9 of the values differenced
                let d = (up[0] - down[0]) / (2.0 * h);
                assert!(
                    (d - exact[1 + i]).abs() < 1e-8 * (1.0 + up[0].abs() + d.abs()),
                    "{text}: first {i} {d} {exact:?}"
                );
                for &(u, v, k) in &order {
                    if v == i {
                        let d = (up[1 + u] - down[1 + u]) / (2.0 * h);
                        let size = 1.0 + up[1 + u].abs() + d.abs();
                        assert!((d - exact[k]).abs() < 1e-7 * size, "{text}: second {u} {v} {d} {exact:?}");
                    }
                }
            }
        }
    }
}

#[test]
fn tails_keep_their_digits() {
    let mut g = Graph::new();
    let mut s = Scope::new("name");
    let x = g.parameter(0);
    s.insert("x", x);
    let l = build(&mut g, &parse_expression("normal_log_cdf(x)").unwrap(), &s).unwrap();
    let first = g.derivative(l, Variable::Parameter(0));
    let second = g.derivative(first, Variable::Parameter(0));
    let got = Scalars::compile(&g, &[l, first, second]).evaluate(&[-1e5]);
    // asymptotic series of the tail, exact to 1e-20 at z = 1e5: log(phi/z) + log(1 - z^-2 + ...), z + 1/z, -1 + z^-2
    let z = 1e5_f64;
    let want = [-z * z / 2.0 - z.ln() - 0.918_938_533_204_672_7 - 1e-10, z + 1.0 / z, -1.0 + 1e-10];
    for (g, w) in got.iter().zip(want) {
        assert!((g - w).abs() <= 4e-16 * w.abs(), "{got:?} {want:?}");
    }
}

#[test]
fn zero_times_log_zero_is_zero() {
    let mut g = Graph::new();
    g.set_parameter_sign(0, Sign::Nonnegative);
    let mut s = Scope::new("name");
    let p = g.parameter(0);
    s.insert("p", p);
    let l = build(&mut g, &parse_expression("p * log(p)").unwrap(), &s).unwrap();
    assert_eq!(Scalars::compile(&g, &[l]).evaluate(&[0.0]), [0.0]);
}
