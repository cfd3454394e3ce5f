//! Runs a program over blocks of rows. The loops are plain enough for the compiler to vectorise; they are compiled for several
//! instruction sets and the best one is chosen at run time. No fused multiply-add is used and every reduction has a fixed
//! order, so that all of them give the same bits.

use multiversion::multiversion;

use super::Function;
use super::graph::power;
use super::program::{ARGUMENTS, Argument, BLOCK, Block, Gather, Op, Program, Source, Step};
use super::vector::{
    LANES, deviance_block, dot, dot_zero, exp_block, log_block, log1p_exp_block, logistic_block, sum, sum_log,
};

/// Columns of one part of the rows, in blocks.
#[derive(Debug, Clone, Default)]
pub struct Store {
    /// One vector of blocks a column slot.
    pub columns: Vec<Vec<Block>>,
    /// Weights; `None` when all are 1.
    pub weights: Option<Vec<Block>>,
    /// How many rows; the rest of the last block is padding.
    pub rows: usize,
}

impl Store {
    /// How many blocks.
    pub fn blocks(&self) -> usize {
        self.rows.div_ceil(BLOCK)
    }

    /// How many rows of a block are rows.
    pub fn rows_in(&self, block: usize) -> usize {
        (self.rows - block * BLOCK).min(BLOCK)
    }
}

/// Puts values into blocks.
pub fn blocks(values: impl ExactSizeIterator<Item = f64>) -> Vec<Block> {
    let mut out = Vec::with_capacity(values.len().div_ceil(BLOCK));
    let mut fill = BLOCK;
    for x in values {
        if fill == BLOCK {
            out.push(Block::ZERO);
            fill = 0;
        }
        if let Some(b) = out.last_mut() {
            b.0[fill] = x;
        }
        fill += 1;
    }
    out
}

/// Registers of one thread. The first ones are the linear predictors, filled by the caller before each block.
#[derive(Debug, Default)]
pub struct Registers {
    blocks: Vec<Box<Block>>,
    spare: Option<Box<Block>>,
}

impl Registers {
    /// Registers enough for a program.
    pub fn new(program: &Program) -> Self {
        Registers {
            blocks: (0..program.registers.max(program.predictors)).map(|_| Box::new(Block::ZERO)).collect(),
            spare: Some(Box::new(Block::ZERO)),
        }
    }

    /// The register of a linear predictor.
    pub fn predictor(&mut self, k: usize) -> &mut [f64; BLOCK] {
        &mut self.blocks[k].0
    }
}

static ONES: Block = Block([1.0; BLOCK]);

impl Program {
    /// Runs the program on one block: operations, then sums added to `gathered` (length [`Program::gathers`]).
    pub fn block(&self, registers: &mut Registers, store: &Store, block: usize, scalars: &[f64], gathered: &mut [f64]) {
        run(&self.steps, registers, store, block, scalars, gathered);
    }

    /// The block of row output `k` after [`Program::block`]; to be multiplied by [`Program::row_scale`].
    pub fn row<'a>(&self, k: usize, registers: &'a Registers, store: &'a Store, block: usize) -> &'a [f64] {
        let n = store.rows_in(block);
        match self.rows[k].source {
            None => &ONES.0[..n],
            Some(s) => read(s, &registers.blocks, store, block, n),
        }
    }
}

#[inline(always)]
fn read<'a>(s: Source, registers: &'a [Box<Block>], store: &'a Store, block: usize, n: usize) -> &'a [f64] {
    match s {
        Source::Register(r) => &registers[r as usize].0[..n],
        Source::Column(c) => &store.columns[c as usize][block].0[..n],
        Source::Weight => match &store.weights {
            Some(w) => &w[block].0[..n],
            None => &ONES.0[..n],
        },
    }
}

#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512bw+avx512dq+avx512vl", "x86_64+avx+avx2"))]
fn run(steps: &[Step], registers: &mut Registers, store: &Store, block: usize, scalars: &[f64], gathered: &mut [f64]) {
    let n = store.rows_in(block);
    for step in steps {
        match step {
            Step::Op(target, op) => {
                // the target is never a source: it is taken out while the others are read
                let Some(spare) = registers.spare.take() else { return };
                let mut out = std::mem::replace(&mut registers.blocks[*target as usize], spare);
                operate(op, &mut out.0[..n], &registers.blocks, store, block, scalars);
                registers.spare = Some(std::mem::replace(&mut registers.blocks[*target as usize], out));
            }
            Step::Gather(at, gather) => {
                let r = &registers.blocks;
                gathered[*at as usize] += match *gather {
                    Gather::Sum(a) => sum(read(a, r, store, block, n)),
                    Gather::SumLog(a) => sum_log(read(a, r, store, block, n)),
                    Gather::Dot(a, b) => dot(read(a, r, store, block, n), read(b, r, store, block, n)),
                    Gather::DotZero(a, b) => dot_zero(read(a, r, store, block, n), read(b, r, store, block, n)),
                };
            }
        }
    }
}

#[inline(always)]
fn each1(out: &mut [f64], a: &[f64], f: impl Fn(f64) -> f64) {
    for (o, &x) in out.iter_mut().zip(a) {
        *o = f(x);
    }
}

#[inline(always)]
fn each2(out: &mut [f64], a: &[f64], b: &[f64], f: impl Fn(f64, f64) -> f64) {
    for ((o, &x), &y) in out.iter_mut().zip(a).zip(b) {
        *o = f(x, y);
    }
}

#[inline(always)]
fn truth(b: bool) -> f64 {
    if b { 1.0 } else { 0.0 }
}

#[inline(always)]
fn operate(op: &Op, out: &mut [f64], registers: &[Box<Block>], store: &Store, block: usize, scalars: &[f64]) {
    let n = out.len();
    let get = |s: Source| read(s, registers, store, block, n);
    match op {
        Op::Fill(s) => out.fill(scalars[*s as usize]),
        Op::Scale(a, s) => {
            let s = scalars[*s as usize];
            each1(out, get(*a), |x| s * x);
        }
        Op::Shift(a, c) => {
            let c = scalars[*c as usize];
            each1(out, get(*a), |x| x + c);
        }
        Op::Affine(a, s, c) => {
            let (s, c) = (scalars[*s as usize], scalars[*c as usize]);
            each1(out, get(*a), |x| s * x + c);
        }
        Op::Add(a, b) => each2(out, get(*a), get(*b), |x, y| x + y),
        Op::Subtract(a, b) => each2(out, get(*a), get(*b), |x, y| x - y),
        Op::AddScaled(a, s, b) => {
            let s = scalars[*s as usize];
            each2(out, get(*a), get(*b), |x, y| x + s * y);
        }
        Op::Multiply(a, b) => each2(out, get(*a), get(*b), |x, y| x * y),
        Op::MultiplyZero(a, b) => each2(out, get(*a), get(*b), |x, y| {
            let p = x * y;
            if p.is_nan() && !x.is_nan() && !y.is_nan() { 0.0 } else { p }
        }),
        Op::Reciprocal(a) => each1(out, get(*a), |x| 1.0 / x),
        Op::PowerConstant(a, e) => {
            let e = *e;
            if e == 0.5 {
                each1(out, get(*a), f64::sqrt);
            } else if e == -0.5 {
                each1(out, get(*a), |x| 1.0 / x.sqrt());
            } else {
                each1(out, get(*a), |x| power(x, e));
            }
        }
        Op::Power(a, b) => each2(out, get(*a), get(*b), libm::pow),
        Op::Call1(f, a) => {
            let a = get(*a);
            match f {
                Function::Exp => exp_block(out, a),
                Function::Log => log_block(out, a),
                Function::Logistic => logistic_block(out, a),
                Function::LogLogistic => log1p_exp_block(out, a),
                Function::Abs => each1(out, a, f64::abs),
                f => each1(out, a, |x| f.value(&[x])),
            }
        }
        Op::Deviance(a, b) => deviance_block(out, get(*a), get(*b)),
        Op::Call(f, a) => {
            let mut values = [0.0; ARGUMENTS];
            for (v, x) in values.iter_mut().zip(a) {
                if let Argument::Scalar(s) = x {
                    *v = scalars[*s as usize];
                }
            }
            for (i, o) in out.iter_mut().enumerate() {
                for (v, x) in values.iter_mut().zip(a) {
                    if let Argument::Row(s) = x {
                        *v = get(*s)[i];
                    }
                }
                *o = f.value(&values[..a.len()]);
            }
        }
        Op::Greatest(a) => fold(out, a, &get, |x, y| if y > x || y.is_nan() { y } else { x }),
        Op::Least(a) => fold(out, a, &get, |x, y| if y < x || y.is_nan() { y } else { x }),
        Op::ShiftOf(a) => {
            fold(out, a, &get, |x, y| if y > x { y } else { x });
            out.iter_mut().for_each(|x| *x = if *x == f64::NEG_INFINITY { 0.0 } else { *x });
        }
        Op::Choose(c, a, b) => {
            for (((o, &c), &x), &y) in out.iter_mut().zip(get(*c)).zip(get(*a)).zip(get(*b)) {
                *o = if c != 0.0 { x } else { y };
            }
        }
        Op::Compare(r, a, b) => each2(out, get(*a), get(*b), |x, y| truth(r.holds(x, y))),
        Op::And(a, b) => each2(out, get(*a), get(*b), |x, y| truth(x != 0.0 && y != 0.0)),
        Op::Or(a, b) => each2(out, get(*a), get(*b), |x, y| truth(x != 0.0 || y != 0.0)),
        Op::Not(a) => each1(out, get(*a), |x| truth(x == 0.0)),
    }
}

#[inline(always)]
fn fold<'a>(out: &mut [f64], sources: &[Source], get: &impl Fn(Source) -> &'a [f64], f: impl Fn(f64, f64) -> f64) {
    out.copy_from_slice(get(sources[0]));
    for &s in &sources[1..] {
        for (o, &y) in out.iter_mut().zip(get(s)) {
            *o = f(*o, y);
        }
    }
}

const _: () = assert!(BLOCK.is_multiple_of(LANES));
