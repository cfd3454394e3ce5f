//! The kinks of a sample's log-likelihood, seen one by one: the rows in which an `abs(u)` is near its tie, and the likelihood
//! with every `abs(u)` rounded off or replaced by one of its sides, which is smooth.

use std::collections::HashMap;

use super::compose::Template;
use super::fold::{Column, Folds};
use super::formula::Formula;
use super::part::{Part, Predictor};
use super::{Evaluation, LogLikelihood, Order, Sample};
use crate::expr::{BLOCK, Block, blocks};
use crate::math::{Matrix, Vector};

/// The rows of a part as they were given.
#[derive(Debug, Clone, Default)]
pub(super) struct Raw {
    columns: HashMap<u32, Vec<f64>>,
    weights: Option<Vec<f64>>,
    lines: Vec<usize>,
}

impl Raw {
    /// Keeps what the rows of a formula with folds have to be bound anew from.
    pub(super) fn keep(
        formula: &Formula,
        template: &Template,
        members: &[usize],
        weights: Option<&[f64]>,
    ) -> Option<Raw> {
        let folds = formula.folds.as_ref()?;
        let read = formula.raw.iter().chain(&folds.formula.raw).filter(|&&c| c < folds.first);
        Some(Raw {
            columns: read.map(|&c| (c, template.raw(c, members))).collect(),
            weights: weights.map(<[f64]>::to_vec),
            lines: members.iter().map(|&i| template.table.line(i)).collect(),
        })
    }
}

/// One `abs(u)` in one row.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Place {
    part: usize,
    row: usize,
    fold: usize,
}

/// A kink near a point, at which l falls both ways: minus `fall` times |u|.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Kink {
    /// Where.
    pub place: Place,
    /// u there.
    pub residual: f64,
    /// |u| in units of what is typical.
    pub distance: f64,
    /// Half the jump of l's slope in u, weight included.
    pub fall: f64,
}

/// What stands for `abs(u)`.
#[derive(Debug, Clone, Copy)]
enum Stand {
    /// sqrt(u^2 + width^2)
    Rounded(f64),
    /// side * u
    Side(f64),
}

impl Sample {
    /// Where the folds of a part's formula begin among those of all formulas.
    fn fold_at(&self, part: usize) -> usize {
        let count = |f: &Formula| f.folds.as_ref().map_or(0, |f| f.count);
        self.formulas[..self.parts[part].formula].iter().map(count).sum()
    }

    /// The parts that have folds.
    fn folded(&self) -> impl Iterator<Item = (usize, &Part, &Folds, &Raw)> {
        self.parts.iter().enumerate().filter_map(|(p, part)| {
            let (folds, raw) = (self.formulas[part.formula].folds.as_ref()?, part.raw.as_ref()?);
            Some((p, part, folds.as_ref(), raw.as_ref()))
        })
    }

    /// Mean |u| of every fold.
    pub fn typical_residuals(&self, phi: &Vector) -> Vec<f64> {
        let total: usize = self.formulas.iter().map(|f| f.folds.as_ref().map_or(0, |f| f.count)).sum();
        let (mut sums, mut counts) = (vec![0.0; total], vec![0.0; total]);
        for (p, part, folds, _) in self.folded() {
            let rows = part.all_rows(&self.formulas[part.formula].heights, phi.as_slice());
            let at = self.fold_at(p);
            for k in 0..folds.count {
                for u in rows[2 * k].iter().filter(|u| u.is_finite()) {
                    sums[at + k] += u.abs();
                    counts[at + k] += 1.0;
                }
            }
        }
        sums.iter().zip(&counts).map(|(s, n)| if *s > 0.0 { s / n } else { 1.0 }).collect()
    }

    /// The kinks within `within` typical residuals at which a maximum can sit, nearest first; `None` if they are more than
    /// `most`.
    pub fn kinks_near(&self, phi: &Vector, typical: &[f64], within: f64, most: usize) -> Option<Vec<Kink>> {
        let mut out = Vec::new();
        for (p, part, folds, _) in self.folded() {
            let rows = part.all_rows(&self.formulas[part.formula].heights, phi.as_slice());
            let at = self.fold_at(p);
            for fold in 0..folds.count {
                let unit = typical[at + fold];
                for (row, (&u, &slope)) in rows[2 * fold].iter().zip(&rows[2 * fold + 1]).enumerate() {
                    let (distance, fall) = (u.abs() / unit, -slope * part.weight(row));
                    if distance <= within && fall > 0.0 {
                        out.push(Kink { place: Place { part: p, row, fold }, residual: u, distance, fall });
                        if out.len() > most {
                            return None;
                        }
                    }
                }
            }
        }
        out.sort_by(|a, b| a.distance.total_cmp(&b.distance).then(a.place.cmp(&b.place)));
        Some(out)
    }

    /// Whether some u, not among `except` and more than `least` typical residuals from zero, has changed its sign.
    pub fn crossed(&self, from: &Vector, to: &Vector, typical: &[f64], least: f64, except: &[Place]) -> bool {
        self.folded().any(|(p, part, folds, _)| {
            let pass = &self.formulas[part.formula].heights;
            let (before, after) = (part.all_rows(pass, from.as_slice()), part.all_rows(pass, to.as_slice()));
            let at = self.fold_at(p);
            (0..folds.count).any(|fold| {
                before[2 * fold].iter().zip(&after[2 * fold]).enumerate().any(|(row, (&a, &b))| {
                    b.abs() > least * typical[at + fold]
                        && (a < 0.0) != (b < 0.0)
                        && !except.contains(&Place { part: p, row, fold })
                })
            })
        })
    }

    /// l with `abs(u)` rounded off to sqrt(u^2 + width^2); one width a fold.
    pub fn rounded(&self, widths: &[f64]) -> Sample {
        self.standing(&|at, _| Stand::Rounded(widths[at]), &|_| Vec::new())
    }

    /// Largest size of what a u is the difference of, over its fold's typical size: rounding makes u this much less exact.
    pub fn cancellation(&self, phi: &Vector, typical: &[f64]) -> f64 {
        let mut worst: f64 = 1.0;
        for (p, _, folds, _) in self.folded() {
            for fold in 0..folds.count {
                let terms =
                    self.residuals(&[Place { part: p, row: 0, fold }]).jacobian(phi).transpose().component_mul(phi);
                worst = worst.max(terms.abs().sum() / typical[self.fold_at(p) + fold]);
            }
        }
        worst
    }

    /// l with `side * u` for every `abs(u)`: the side on which it is at phi, or that given.
    pub fn sided(&self, phi: &Vector, sides: &[(Place, f64)]) -> Sample {
        let given: HashMap<Place, f64> = sides.iter().copied().collect();
        let here = |part: usize| {
            let part = &self.parts[part];
            part.all_rows(&self.formulas[part.formula].heights, phi.as_slice())
        };
        self.standing(
            &|_, (place, u)| Stand::Side(given.get(&place).copied().unwrap_or(if u < 0.0 { -1.0 } else { 1.0 })),
            &here,
        )
    }

    /// The sample with something standing for every `abs(u)`; `heights` gives the row outputs of a part, for u.
    fn standing(
        &self,
        stand: &dyn Fn(usize, (Place, f64)) -> Stand,
        heights: &dyn Fn(usize) -> Vec<Vec<f64>>,
    ) -> Sample {
        let mut out = self.clone();
        for (p, part, folds, raw) in self.folded() {
            let (at, rows) = (self.fold_at(p), heights(p));
            let column = |c: u32| match folds.column(c) {
                None => raw.columns[&c].clone(),
                Some((fold, column)) => {
                    let one = |row: usize| {
                        let u = rows.get(2 * fold).map_or(0.0, |u| u[row]);
                        match (stand(at + fold, (Place { part: p, row, fold }, u)), column) {
                            (Stand::Rounded(_), Column::Round) | (Stand::Side(_), Column::Width) => 1.0,
                            (Stand::Rounded(_), Column::Side) | (Stand::Side(_), Column::Round) => 0.0,
                            (Stand::Rounded(width), Column::Width) => width,
                            (Stand::Side(side), Column::Side) => side,
                        }
                    };
                    (0..part.rows_count()).map(one).collect()
                }
            };
            out.parts[p] = Part::bind(
                &folds.formula,
                part.formula,
                part.rows_count(),
                &column,
                raw.weights.as_deref(),
                part.map.clone(),
                part.predictors.clone(),
            );
        }
        for f in &mut out.formulas {
            if let Some(folds) = f.folds.take() {
                *f = folds.formula;
            }
        }
        out
    }

    /// The line of the data on which the row of a kink stands.
    pub fn line(&self, place: Place) -> usize {
        self.parts[place.part].raw.as_ref().map_or(0, |r| r.lines[place.row])
    }

    /// u at these places as functions of phi, without passes over the rows.
    pub fn residuals(&self, places: &[Place]) -> Residuals {
        let one = |place: &Place| {
            let part = &self.parts[place.part];
            let formula = &self.formulas[part.formula];
            let row = place.row;
            let pick = |c: &Vec<Block>| blocks(std::iter::once(c[row / BLOCK].0[row % BLOCK]));
            let predictors = part.predictors.iter().map(|p| Predictor {
                columns: p.columns.iter().map(pick).collect(),
                offset: p.offset.as_ref().map(pick),
                at: p.at.clone(),
            });
            let raw = part.raw.as_ref();
            let column = |c: u32| vec![raw.and_then(|r| r.columns.get(&c)).map_or(f64::NAN, |x| x[row])];
            // of weight 1: what its weight is belongs to the kink
            let weight = raw.and_then(|r| r.weights.as_ref()).map(|_| [1.0]);
            let weight = weight.as_ref().map(<[f64; 1]>::as_slice);
            let part = Part::bind(formula, part.formula, 1, &column, weight, part.map.clone(), predictors.collect());
            Single { part, formula: formula.clone(), fold: place.fold }
        };
        Residuals { n: self.parameters.len(), list: places.iter().map(one).collect() }
    }

    /// l itself.
    pub fn at(&self, phi: &Vector) -> f64 {
        let Evaluation { value, .. } = self.evaluate(phi, Order::Value);
        value
    }
}

/// Some u as functions of working coordinates.
#[derive(Debug)]
pub struct Residuals {
    n: usize,
    list: Vec<Single>,
}

#[derive(Debug)]
struct Single {
    part: Part,
    formula: Formula,
    fold: usize,
}

impl Single {
    fn outputs(&self, phi: &Vector) -> Vec<f64> {
        self.part.all_rows(&self.formula.slopes, phi.as_slice()).iter().map(|o| o[0]).collect()
    }
}

impl Residuals {
    /// How many.
    pub fn len(&self) -> usize {
        self.list.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.list.is_empty()
    }

    /// u.
    pub fn values(&self, phi: &Vector) -> Vector {
        Vector::from_iterator(self.list.len(), self.list.iter().map(|s| s.outputs(phi)[s.fold]))
    }

    /// Derivatives by phi, a row each.
    pub fn jacobian(&self, phi: &Vector) -> Matrix {
        let mut out = Matrix::zeros(self.list.len(), self.n);
        for (i, s) in self.list.iter().enumerate() {
            let Some(folds) = &s.formula.folds else { continue };
            let found = s.outputs(phi);
            for (&(k, v), &x) in folds.firsts.iter().zip(&found[folds.count..]) {
                if k == s.fold {
                    s.part.reach(v, 0).into_iter().for_each(|(j, z)| out[(i, j)] += x * z);
                }
            }
        }
        out
    }

    /// Sum of multiplier times second derivatives by phi.
    pub fn curvature(&self, phi: &Vector, multipliers: &[f64]) -> Matrix {
        let mut out = Matrix::zeros(self.n, self.n);
        for (s, m) in self.list.iter().zip(multipliers) {
            let Some(folds) = &s.formula.folds else { continue };
            let found = s.outputs(phi);
            for (&(k, v, w), &x) in folds.seconds.iter().zip(&found[folds.count + folds.firsts.len()..]) {
                if k != s.fold {
                    continue;
                }
                for (i, a) in s.part.reach(v, 0) {
                    for (j, b) in s.part.reach(w, 0) {
                        out[(i, j)] += m * x * a * b;
                        if v != w {
                            out[(j, i)] += m * x * a * b;
                        }
                    }
                }
            }
        }
        out
    }
}
