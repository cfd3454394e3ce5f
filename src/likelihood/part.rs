//! One part of the rows, all of one kind and with one set of parameters, bound to its formula.

use std::ops::Range;
use std::sync::{Arc, OnceLock};

use super::expectation::Inputs;
use super::formula::{Formula, Pass, Slot, Which};
use super::gram;
use super::kinks::Raw;
use crate::expr::{BLOCK, Block, Registers, Store, blocks};

/// Blocks in a chunk: 16,384 rows. Chunks are summed pairwise, so the order of additions does not depend on threads.
pub(super) const CHUNK: usize = 32;

/// A linear predictor over the rows of a part.
#[derive(Debug, Clone, Default)]
pub(super) struct Predictor {
    pub(super) columns: Vec<Vec<Block>>,
    pub(super) offset: Option<Vec<Block>>,
    /// Index of each coefficient among the free parameters.
    pub(super) at: Vec<usize>,
}

/// Rows, their columns, and which free parameters they speak of.
#[derive(Debug, Clone)]
pub(super) struct Part {
    /// Which formula.
    pub(super) formula: usize,
    pub(super) store: Store,
    fixed: Vec<f64>,
    /// Index among the free parameters of each parameter of the formula.
    pub(super) map: Vec<usize>,
    pub(super) predictors: Vec<Predictor>,
    /// What expectations over the rows need, where there are any.
    pub(super) inputs: Option<Inputs>,
    /// The rows as they were given, where the formula has folds.
    pub(super) raw: Option<Arc<Raw>>,
    /// Products of the Hessian pass that are the same in every pass.
    kept: OnceLock<Vec<f64>>,
}

/// Where the products of design columns stand among a chunk's sums, behind the gathered ones.
fn products(pass: &Pass, sizes: &[usize], parameters: usize) -> Vec<(usize, usize)> {
    let mut at = pass.program.gathers();
    let mut out = Vec::new();
    let mut place = |len: usize| {
        out.push((at, len));
        at += len;
    };
    for (v, slot) in pass.first.iter().enumerate() {
        if let Slot::Row(_) = slot {
            place(sizes[v - parameters]);
        }
    }
    for &(u, v, slot) in &pass.second {
        if let Slot::Row(_) = slot {
            let k = sizes[v - parameters];
            place(if u < parameters {
                k
            } else if u == v {
                k * (k + 1) / 2
            } else {
                sizes[u - parameters] * k
            });
        }
    }
    out
}

impl Part {
    /// Binds rows to a formula; `raw(column)` gives the values of a raw column for these rows.
    pub(super) fn bind(
        formula: &Formula,
        index: usize,
        rows: usize,
        raw: &dyn Fn(u32) -> Vec<f64>,
        weights: Option<&[f64]>,
        map: Vec<usize>,
        predictors: Vec<Predictor>,
    ) -> Part {
        let weights = weights.map(|w| blocks(w.iter().copied()));
        let source =
            Store { columns: formula.raw.iter().map(|&c| blocks(raw(c).into_iter())).collect(), weights, rows };
        let count = formula.layout.columns();
        let mut columns: Vec<Vec<Block>> = vec![vec![Block::ZERO; source.blocks()]; count];
        let program = &formula.preparation;
        let scalars = program.scalars(&[]);
        let mut registers = Registers::new(program);
        let mut chunks = Vec::new();
        for first in (0..source.blocks()).step_by(CHUNK) {
            let mut gathered = vec![0.0; program.gathers()];
            for b in first..(first + CHUNK).min(source.blocks()) {
                program.block(&mut registers, &source, b, &scalars, &mut gathered);
                for (k, column) in columns.iter_mut().enumerate() {
                    let scale = program.row_scale(k, &scalars);
                    for (o, &x) in column[b].0.iter_mut().zip(program.row(k, &registers, &source, b)) {
                        *o = scale * x;
                    }
                }
            }
            chunks.push(gathered);
        }
        let gathered = pairwise(chunks, program.gathers());
        let fixed = program.finish(&scalars, &gathered, &[]);
        let store = Store { columns, weights: source.weights, rows };
        Part { formula: index, store, fixed, map, predictors, inputs: None, raw: None, kept: OnceLock::new() }
    }

    /// How many rows.
    pub(super) fn rows_count(&self) -> usize {
        self.store.rows
    }

    /// The part with one row kept of each `step`, at a place in its stretch that no period of the data can follow. Fixed sums are
    /// scaled, not taken anew.
    pub(super) fn thinned(&self, step: usize) -> Part {
        let kept: Vec<usize> = (0..self.store.rows / step)
            .map(|i| {
                let mixed = (i as u64).wrapping_mul(0x9e37_79b9_7f4a_7c15);
                i * step + ((mixed >> 32) as usize) % step
            })
            .collect();
        let take = |c: &Vec<Block>| blocks(kept.iter().map(|&i| c[i / BLOCK].0[i % BLOCK]));
        let weight = |w: &Option<Vec<Block>>| w.as_ref().map(take);
        let store = Store {
            columns: self.store.columns.iter().map(take).collect(),
            weights: weight(&self.store.weights),
            rows: kept.len(),
        };
        let ratio = kept.len() as f64 / self.store.rows as f64;
        Part {
            formula: self.formula,
            store,
            fixed: self.fixed.iter().map(|x| ratio * x).collect(),
            map: self.map.clone(),
            predictors: self
                .predictors
                .iter()
                .map(|p| Predictor {
                    columns: p.columns.iter().map(take).collect(),
                    offset: weight(&p.offset),
                    at: p.at.clone(),
                })
                .collect(),
            // starts need no expectation
            inputs: None,
            raw: None,
            kept: OnceLock::new(),
        }
    }

    /// Marks the free parameters that a square of this part contains.
    pub(super) fn mark(&self, inside: &[bool], marked: &mut [bool]) {
        let (parameters, predictors) = inside.split_at(self.map.len());
        for (&i, _) in self.map.iter().zip(parameters).filter(|p| *p.1) {
            marked[i] = true;
        }
        for (p, _) in self.predictors.iter().zip(predictors).filter(|p| *p.1) {
            p.at.iter().for_each(|&i| marked[i] = true);
        }
    }

    fn sizes(&self) -> Vec<usize> {
        self.predictors.iter().map(|p| p.at.len()).collect()
    }

    /// The chunks of blocks this pass has to visit.
    pub(super) fn chunks(&self, pass: &Pass) -> Vec<Range<usize>> {
        let n = self.store.blocks();
        if !pass.program.needs_rows() && self.predictors.is_empty() {
            return Vec::new();
        }
        (0..n).step_by(CHUNK).map(|a| a..(a + CHUNK).min(n)).collect()
    }

    /// Sums over one chunk: gathered ones, then products with design columns.
    pub(super) fn chunk(&self, pass: &Pass, theta: &[f64], chunk: Range<usize>, skip_kept: bool) -> Vec<f64> {
        let program = &pass.program;
        let local: Vec<f64> = self.map.iter().map(|&i| theta[i]).collect();
        let coefficients: Vec<Vec<f64>> =
            self.predictors.iter().map(|p| p.at.iter().map(|&i| theta[i]).collect()).collect();
        let scalars = program.scalars(&local);
        let sizes = self.sizes();
        let places = products(pass, &sizes, self.map.len());
        let total = places.last().map_or(program.gathers(), |&(at, len)| at + len);
        let mut sums = vec![0.0; total];
        let mut registers = Registers::new(program);
        let mut work = [0.0; BLOCK];
        let p = self.map.len();
        for block in chunk {
            let n = self.store.rows_in(block);
            for (k, predictor) in self.predictors.iter().enumerate() {
                let out = &mut registers.predictor(k)[..n];
                gram::predict(out, &predictor.columns, predictor.offset.as_deref(), block, &coefficients[k]);
            }
            let (gathered, design) = sums.split_at_mut(program.gathers());
            program.block(&mut registers, &self.store, block, &scalars, gathered);
            let mut place = places.iter().map(|&(at, len)| (at - program.gathers(), len));
            for (v, slot) in pass.first.iter().enumerate() {
                let Slot::Row(k) = *slot else { continue };
                let Some((at, len)) = place.next() else { continue };
                let h = program.row(k, &registers, &self.store, block);
                gram::cross(&mut design[at..at + len], &self.predictors[v - p].columns, block, h);
            }
            for &(u, v, slot) in &pass.second {
                let Slot::Row(k) = slot else { continue };
                let Some((at, len)) = place.next() else { continue };
                if skip_kept && program.row_fixed(k).is_some() {
                    continue;
                }
                let h = program.row(k, &registers, &self.store, block);
                let out = &mut design[at..at + len];
                let right = &self.predictors[v - p].columns;
                if u < p {
                    gram::cross(out, right, block, h);
                } else if u == v {
                    gram::gram(out, right, block, h, &mut work);
                } else {
                    gram::gram_between(out, &self.predictors[u - p].columns, right, block, h, &mut work);
                }
            }
        }
        sums
    }

    /// Whether the products that never change are known, so that chunks need not compute them.
    pub(super) fn knows_kept(&self, which: Which) -> bool {
        which == Which::Hessian && self.kept.get().is_some()
    }

    /// Adds this part to value, gradient and symmetric matrix (lower triangle and upper alike).
    #[allow(clippy::too_many_arguments, reason = "three results are added to, and one caller")]
    pub(super) fn finish(
        &self,
        which: Which,
        pass: &Pass,
        theta: &[f64],
        mut sums: Vec<f64>,
        value: &mut f64,
        gradient: &mut [f64],
        matrix: &mut dyn FnMut(usize, usize, f64),
    ) {
        let program = &pass.program;
        let sizes = self.sizes();
        let p = self.map.len();
        let places = products(pass, &sizes, p);
        let total = places.last().map_or(program.gathers(), |&(at, len)| at + len);
        sums.resize(total, 0.0);
        if which == Which::Hessian {
            self.keep(pass, &places, &mut sums);
        }
        let local: Vec<f64> = self.map.iter().map(|&i| theta[i]).collect();
        let scalars = program.scalars(&local);
        let out = program.finish(&scalars, &sums[..program.gathers()], &self.fixed);
        if pass.value {
            *value += out[0];
        }
        let mut place = places.into_iter();
        // a sum of zero takes its term away, whatever the factor
        let times = |s: f64, x: f64| if x == 0.0 { 0.0 } else { s * x };
        for (v, slot) in pass.first.iter().enumerate() {
            match *slot {
                Slot::Zero => {}
                Slot::Sum(k) => gradient[self.map[v]] += out[k],
                Slot::Row(k) => {
                    let Some((at, _)) = place.next() else { continue };
                    let s = program.row_scale(k, &scalars);
                    for (j, &i) in self.predictors[v - p].at.iter().enumerate() {
                        gradient[i] += times(s, sums[at + j]);
                    }
                }
            }
        }
        // two variables that stand for one free parameter meet on its diagonal twice
        let mut add = |i: usize, j: usize, same: bool, x: f64| {
            if same {
                matrix(i, i, x);
            } else {
                matrix(i, j, x);
                matrix(j, i, x);
            }
        };
        for &(u, v, slot) in &pass.second {
            match slot {
                Slot::Zero => {}
                Slot::Sum(k) => add(self.map[u], self.map[v], u == v, out[k]),
                Slot::Row(k) => {
                    let Some((at, _)) = place.next() else { continue };
                    let s = program.row_scale(k, &scalars);
                    let right = &self.predictors[v - p].at;
                    if u < p {
                        for (j, &i) in right.iter().enumerate() {
                            add(self.map[u], i, false, times(s, sums[at + j]));
                        }
                    } else if u == v {
                        let mut t = at;
                        for (j, &i) in right.iter().enumerate() {
                            for (k, &m) in right[..=j].iter().enumerate() {
                                add(i, m, j == k, times(s, sums[t]));
                                t += 1;
                            }
                        }
                    } else {
                        let left = &self.predictors[u - p].at;
                        for (j, &i) in left.iter().enumerate() {
                            for (k, &m) in right.iter().enumerate() {
                                add(i, m, false, times(s, sums[at + j * right.len() + k]));
                            }
                        }
                    }
                }
            }
        }
    }

    fn keep(&self, pass: &Pass, places: &[(usize, usize)], sums: &mut [f64]) {
        let rows_first = pass.first.iter().filter(|s| matches!(s, Slot::Row(_))).count();
        let fixed: Vec<(usize, usize)> = pass
            .second
            .iter()
            .filter_map(|s| if let Slot::Row(k) = s.2 { Some(k) } else { None })
            .zip(&places[rows_first..])
            .filter(|(k, _)| pass.program.row_fixed(*k).is_some())
            .map(|(_, &place)| place)
            .collect();
        match self.kept.get() {
            Some(kept) => {
                let mut from = 0;
                for (at, len) in fixed {
                    sums[at..at + len].copy_from_slice(&kept[from..from + len]);
                    from += len;
                }
            }
            None => {
                let kept = fixed.iter().flat_map(|&(at, len)| sums[at..at + len].iter().copied()).collect();
                // another thread may have been first: it kept the same numbers
                let _ = self.kept.set(kept);
            }
        }
    }
}

/// Sums of equal-length lists, combined pairwise in a fixed order.
pub(super) fn pairwise(mut lists: Vec<Vec<f64>>, len: usize) -> Vec<f64> {
    if lists.is_empty() {
        return vec![0.0; len];
    }
    while lists.len() > 1 {
        let mut next = Vec::with_capacity(lists.len().div_ceil(2));
        let mut it = lists.into_iter();
        while let Some(mut a) = it.next() {
            if let Some(b) = it.next() {
                a.iter_mut().zip(&b).for_each(|(x, y)| *x += y);
            }
            next.push(a);
        }
        lists = next;
    }
    lists.swap_remove(0)
}
