//! Starting values: moments and least squares for families, quantile splits and EM steps for mixtures, and starts spread round
//! them for likelihoods with several maxima.

use super::model::Model;
use super::plan::{Bound, LocalPlan, PredictorPlan};
use super::rows::{RowKind, Rows};
use super::statement::{Body, Statement};
use super::{Coordinates, Parameter, labels};
use crate::expr::{Graph, Name, Scalars, Scope, build, parse_expression};
use crate::family::composite::{Composite, Layout};
use crate::family::{Family, Link, Moments};
use crate::math::linear::positive_definite_inverse;
use crate::math::{Matrix, Vector, special};

/// All that starting values are computed from.
pub(super) struct Shape<'a> {
    pub(super) model: &'a Model,
    pub(super) statement: &'a Statement<'a>,
    pub(super) rows: &'a Rows,
    pub(super) locals: &'a [LocalPlan<'a>],
    pub(super) predictors: &'a [PredictorPlan<'a>],
    pub(super) bound_locals: &'a [Vec<Bound>],
    pub(super) bound_coefficients: &'a [Vec<Vec<Bound>>],
    pub(super) design: &'a [Vec<Vec<f64>>],
    pub(super) offsets: &'a [Option<Vec<f64>>],
    pub(super) coordinates: &'a Coordinates,
}

/// Rows that EM looks at, at most.
const EM_ROWS: usize = 2_000;
/// EM steps.
const EM_STEPS: usize = 15;

/// The first starting point; what the study states stands as stated.
pub(super) fn theta(shape: &Shape, parameters: &[Parameter], stated: &[Option<f64>]) -> Vector {
    let mut phi = Vector::zeros(parameters.len());
    for level in 0..shape.bound_locals.len() {
        let members = &shape.rows.members[level];
        match &shape.statement.body {
            Body::Density(f) => density(shape, f, level, members, &mut phi),
            Body::Composite(f, layout, _) => composite(shape, f, layout, level, members, &mut phi),
            Body::Mixture(parts) => mixture(shape, parts, level, members, &mut phi),
            Body::Custom(_) => {}
        }
    }
    let mut theta = shape.coordinates.theta(&phi);
    for (i, s) in stated.iter().enumerate() {
        if let Some(x) = s {
            theta[i] = *x;
        }
    }
    for (i, p) in parameters.iter().enumerate() {
        theta[i] = inside(theta[i], p);
    }
    theta
}

fn composite(shape: &Shape, f: &Composite, layout: &Layout, level: usize, members: &[usize], phi: &mut Vector) {
    let values = (f.start)(layout, &labels::summary(f, layout, shape.rows, members));
    for (k, p) in shape.predictors.iter().enumerate() {
        if let Some(&v) = values.get(p.local.row) {
            constant(shape, level, k, v, phi);
        }
    }
    for (l, b) in shape.locals.iter().zip(&shape.bound_locals[level]) {
        if let Some(&v) = l.row.and_then(|row| values.get(row)) {
            set(phi, *b, v);
        }
    }
}

fn set(phi: &mut Vector, bound: Bound, value: f64) {
    if let Bound::Free(i) = bound
        && value.is_finite()
    {
        phi[i] = value;
    }
}

/// A value moved inside the range, off its ends.
fn inside(x: f64, p: &Parameter) -> f64 {
    let r = &p.range;
    let width = r.high - r.low;
    let step = if width.is_finite() { 1e-3 * width } else { 1e-3 * x.abs().max(1e-3) };
    let mut x = if x.is_finite() { x } else { 0.0 };
    if x < r.low || (x == r.low && !r.low_closed) {
        x = r.low + step;
    }
    if x > r.high || (x == r.high && !r.high_closed) {
        x = r.high - step;
    }
    x
}

/// Exposure or trials of the rows, by which the response is divided.
fn size<'a>(shape: &'a Shape, component: Option<usize>, store: &'a mut Vec<f64>) -> Option<&'a [f64]> {
    for what in ["exposure", "trials"] {
        let own = component.and_then(|k| shape.rows.column(&format!("{what} of {}", shape.model.components[k].name)));
        if let Some((_, x)) = own.or_else(|| shape.rows.column(what)) {
            *store = x.iter().map(|v| v.max(f64::MIN_POSITIVE)).collect();
            return Some(store);
        }
    }
    if let Some(super::model::Amount::Number(n)) = &shape.model.trials {
        *store = vec![*n; shape.rows.count];
        return Some(store);
    }
    None
}

fn density(shape: &Shape, f: &Family, level: usize, members: &[usize], phi: &mut Vector) {
    let mut store = Vec::new();
    let size = size(shape, None, &mut store);
    let mut moments = shape.rows.moments(members.iter().copied(), size);
    if f.amounts.contains(&"trials")
        && let Some(size) = size
    {
        moments.trials = members.iter().map(|&i| size[i]).sum::<f64>() / members.len().max(1) as f64;
    }
    let known: Vec<Option<f64>> = (0..f.parameters.len())
        .map(|row| {
            let at = shape.locals.iter().position(|l| l.row == Some(row))?;
            if let Bound::Known(x) = shape.bound_locals[level][at] { Some(x) } else { None }
        })
        .collect();
    let mut values = (f.start)(&moments, &known);
    for (k, p) in shape.predictors.iter().enumerate() {
        let fitted = if p.local.row == 0 {
            least_squares(shape, f, level, k, members, size, &moments, &known, phi)
        } else {
            None
        };
        if let Some(rest) = fitted
            && p.local.link == Link::Identity
        {
            moments.variance = rest;
            let again = (f.start)(&moments, &known);
            values.iter_mut().zip(again).skip(1).for_each(|(v, a)| *v = a);
        }
        if fitted.is_none() {
            constant(shape, level, k, values[p.local.row], phi);
        }
    }
    for (l, b) in shape.locals.iter().zip(&shape.bound_locals[level]) {
        if let Some(row) = l.row {
            set(phi, *b, values[row]);
        }
    }
}

/// The summaries of one value.
fn at_one(y: f64, weight: f64) -> Moments {
    let positive = y > 0.0;
    Moments {
        weight,
        mean: y,
        min: y,
        max: y,
        quartiles: [y; 3],
        log_mean: if positive { libm::log(y) } else { 0.0 },
        inverse_mean: if positive { 1.0 / y } else { 0.0 },
        trials: 1.0,
        direction: (libm::cos(y), libm::sin(y)),
        ..Moments::default()
    }
}

/// A predictor that is as constant as its design allows: intercept, or all levels of a full coding.
fn constant(shape: &Shape, level: usize, k: usize, value: f64, phi: &mut Vector) {
    let p = &shape.predictors[k];
    let eta = p.local.link.forward(value);
    let intercept = p.coefficients.iter().any(|c| c.factors.is_empty());
    let mut theta = Vector::zeros(phi.len());
    for (c, b) in p.coefficients.iter().zip(&shape.bound_coefficients[level][k]) {
        let alone = c.factors.len() == 1 && c.factors[0].1.is_some() && c.factors[0].0 == first_category(p);
        if c.factors.is_empty() || (!intercept && alone) {
            set(&mut theta, *b, eta);
        }
    }
    let moved = shape.coordinates.phi(&theta);
    for b in &shape.bound_coefficients[level][k] {
        if let Bound::Free(i) = *b {
            phi[i] = moved[i];
        }
    }
}

fn first_category(p: &PredictorPlan) -> String {
    let found = p.coefficients.iter().flat_map(|c| &c.factors).find(|f| f.1.is_some());
    found.map_or(String::new(), |f| f.0.clone())
}

/// One weighted least-squares fit of the linked response on the design; the variance of what is left (on the scale of the
/// link), or `None` where that is impossible.
#[allow(clippy::too_many_arguments, reason = "one caller, and every argument is a different thing")]
fn least_squares(
    shape: &Shape,
    f: &Family,
    level: usize,
    k: usize,
    members: &[usize],
    size: Option<&[f64]>,
    moments: &Moments,
    known: &[Option<f64>],
    phi: &mut Vector,
) -> Option<f64> {
    let link = shape.predictors[k].local.link;
    let free: Vec<(usize, usize)> = shape.bound_coefficients[level][k]
        .iter()
        .enumerate()
        .filter_map(|(j, b)| if let Bound::Free(i) = b { Some((j, *i)) } else { None })
        .collect();
    if free.is_empty() || members.len() < free.len() || members.iter().any(|&i| shape.rows.kinds[i] != RowKind::Exact) {
        return None;
    }
    // half way to the mean where the link needs a value inside the range
    let pull = if link == Link::Identity && f.support == crate::family::Support::Real { 0.0 } else { 0.5 };
    let columns = &shape.design[k];
    let offset = shape.offsets[k].as_deref();
    let p = free.len();
    let mut gram = Matrix::zeros(p, p);
    let mut right = Vector::zeros(p);
    // the rows may be many: a few tens of thousands are enough for a start, unless the fit would be exact
    let step = if pull == 0.0 { 1 } else { (members.len() / 50_000).max(1) };
    let target = |i: usize| {
        let s = size.map_or(1.0, |s| s[i]);
        let y = (1.0 - pull) * shape.rows.values[i] / s + pull * moments.mean;
        let own = Moments { variance: moments.variance, log_variance: moments.log_variance, ..at_one(y, s) };
        link.forward((f.start)(&own, known)[0]) - offset.map_or(0.0, |o| o[i])
    };
    let weight = |i: usize| shape.rows.weight(i) * size.map_or(1.0, |s| s[i]);
    for &i in members.iter().step_by(step) {
        let (z, w) = (target(i), weight(i));
        if !z.is_finite() {
            return None;
        }
        for (a, &(ja, _)) in free.iter().enumerate() {
            let x = w * columns[ja][i];
            right[a] += x * z;
            for (b, &(jb, _)) in free[..=a].iter().enumerate() {
                gram[(a, b)] += x * columns[jb][i];
            }
        }
    }
    for a in 0..p {
        for b in 0..a {
            gram[(b, a)] = gram[(a, b)];
        }
    }
    let beta = positive_definite_inverse(&gram)? * right;
    let (mut rest, mut total) = (0.0, 0.0);
    for &i in members.iter().step_by(step) {
        let fit: f64 = free.iter().enumerate().map(|(a, &(j, _))| beta[a] * columns[j][i]).sum();
        rest += weight(i) * (target(i) - fit).powi(2);
        total += weight(i);
    }
    if !beta.iter().all(|b| b.is_finite()) {
        return None;
    }
    for (a, &(_, i)) in free.iter().enumerate() {
        phi[i] = beta[a];
    }
    // fitted values outside the range of the parameter would leave the likelihood undefined
    if link == Link::Identity && f.parameters[0].range.low == 0.0 {
        let bad = members.iter().any(|&i| {
            free.iter().enumerate().map(|(a, &(j, _))| beta[a] * columns[j][i]).sum::<f64>()
                + offset.map_or(0.0, |o| o[i])
                <= 0.0
        });
        if bad {
            return None;
        }
    }
    Some(rest / total)
}

fn mixture(shape: &Shape, parts: &[(Name, &'static Family)], level: usize, members: &[usize], phi: &mut Vector) {
    let k = parts.len();
    let mut sorted: Vec<(f64, f64)> = members.iter().map(|&i| (shape.rows.values[i], shape.rows.weight(i))).collect();
    sorted.sort_by(|a, b| a.0.total_cmp(&b.0));
    let step = (sorted.len() / EM_ROWS).max(1);
    let sorted: Vec<(f64, f64)> = sorted.into_iter().step_by(step).collect();
    let total: f64 = sorted.iter().map(|s| s.1).sum();
    let bound = &shape.bound_locals[level];
    let local = |name: &Name| shape.locals.iter().position(|l| l.local.name == *name);
    let of = |weights: &[f64]| Moments::of(sorted.iter().zip(weights).map(|(s, &w)| (s.0, w)));
    let everything = of(&sorted.iter().map(|s| s.1).collect::<Vec<_>>());
    // quantile splits: component j begins with the j-th slice of the response
    let mut shares = vec![1.0 / k as f64; k];
    let mut values: Vec<Vec<f64>> = Vec::new();
    let fixed = |j: usize| -> Vec<Option<f64>> {
        parts[j]
            .1
            .parameters
            .iter()
            .map(|p| {
                let at = local(&parts[j].0.clone().dot(p.name))?;
                match bound[at] {
                    Bound::Known(x) => Some(x),
                    Bound::Free(_) => None,
                }
            })
            .collect()
    };
    let known: Vec<Vec<Option<f64>>> = (0..k).map(fixed).collect();
    let settle = |j: usize, mut v: Vec<f64>| {
        v.iter_mut().zip(&known[j]).for_each(|(v, k)| *v = k.unwrap_or(*v));
        v
    };
    for (j, part) in parts.iter().enumerate() {
        let (from, to) = (total * j as f64 / k as f64, total * (j + 1) as f64 / k as f64);
        let mut sum = 0.0;
        let weights: Vec<f64> = sorted
            .iter()
            .map(|s| {
                sum += s.1;
                if sum > from && sum <= to + 1e-9 * total { s.1 } else { 0.0 }
            })
            .collect();
        let mut m = of(&weights);
        if m.weight <= 0.0 {
            m = everything;
        }
        m.variance = m.variance.max(1e-3 * everything.variance);
        values.push(settle(j, (part.1.start)(&m, &known[j])));
    }
    let logs: Vec<Option<Scalars>> = parts.iter().map(|(_, f)| log_density(f)).collect();
    if logs.iter().all(Option::is_some) {
        for _ in 0..EM_STEPS {
            let mut weights = vec![vec![0.0; sorted.len()]; k];
            for (i, &(y, w)) in sorted.iter().enumerate() {
                let log: Vec<f64> = (0..k)
                    .map(|j| {
                        let mut arguments = vec![y];
                        arguments.extend(&values[j]);
                        let l = logs[j].as_ref().map_or(f64::NAN, |s| s.evaluate(&arguments)[0]);
                        libm::log(shares[j]) + l
                    })
                    .collect();
                let all = special::log_sum_exp(&log);
                for j in 0..k {
                    let r = libm::exp(log[j] - all);
                    weights[j][i] = if r.is_finite() { w * r } else { w / k as f64 };
                }
            }
            for j in 0..k {
                let mut m = of(&weights[j]);
                shares[j] = (m.weight / total).max(1e-3);
                if m.weight > 2.0 {
                    m.variance = m.variance.max(1e-3 * everything.variance);
                    values[j] = settle(j, (parts[j].1.start)(&m, &known[j]));
                }
            }
            let sum: f64 = shares.iter().sum();
            shares.iter_mut().for_each(|s| *s /= sum);
        }
    }
    for (j, (name, f)) in parts.iter().enumerate() {
        if let Some(at) = local(&Name::single("share").then(name)) {
            set(phi, bound[at], shares[j]);
        }
        for (p, &v) in f.parameters.iter().zip(&values[j]) {
            if let Some(at) = local(&name.clone().dot(p.name)) {
                set(phi, bound[at], v);
            }
        }
    }
}

/// The log density of a family as a function of (y, its parameters), with one unit of exposure and one trial.
fn log_density(f: &Family) -> Option<Scalars> {
    let mut graph = Graph::new();
    let mut scope = Scope::new("name");
    let y = graph.parameter(0);
    scope.insert("y", y);
    for (i, p) in f.parameters.iter().enumerate() {
        let id = graph.parameter(i as u32 + 1);
        scope.insert(p.name, id);
    }
    let one = graph.constant(1.0);
    scope.insert("exposure", one);
    scope.insert("trials", one);
    let id = build(&mut graph, &parse_expression(f.log_density).ok()?, &scope).ok()?;
    Some(Scalars::compile(&graph, &[id]))
}

/// Starts spread round the first: factors on what is positive, places in what is bounded, steps on the rest. The points follow an
/// additive recurrence, which fills the box evenly; the seed shifts it.
pub(super) fn spread(first: &Vector, parameters: &[Parameter], count: usize, seed: u64) -> Vec<Vector> {
    let n = first.len();
    let mut out = vec![first.clone()];
    // powers of the positive root of x^(n+1) = x + 1
    let mut g: f64 = 2.0;
    for _ in 0..60 {
        g = libm::pow(1.0 + g, 1.0 / (n as f64 + 1.0));
    }
    let shift = (seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) >> 11) as f64 / (1u64 << 53) as f64;
    for k in 1..count {
        let mut x = first.clone();
        for (i, p) in parameters.iter().enumerate() {
            let u = (0.5 + shift + k as f64 * libm::pow(g, -(i as f64 + 1.0))).fract();
            let u = u.clamp(1e-6, 1.0 - 1e-6);
            let z = special::normal_quantile(u);
            let r = &p.range;
            x[i] = if r.low.is_finite() && r.high.is_finite() {
                r.low + (r.high - r.low) * (0.02 + 0.96 * u)
            } else if r.low.is_finite() {
                r.low + (first[i] - r.low).max(1e-3) * libm::exp(1.2 * z)
            } else if r.high.is_finite() {
                r.high - (r.high - first[i]).max(1e-3) * libm::exp(1.2 * z)
            } else {
                first[i] + z * first[i].abs().max(1.0)
            };
        }
        out.push(x);
    }
    out
}
