//! A compiled program over blocks of rows: what it is made of. [`super::lower`] makes it, [`super::kernel`] runs it.

use super::graph::Id;
use super::scalars::Scalars;
use super::{Function, Relation};

/// Rows in a block. Some hundreds, so that a dozen registers fit the first-level cache.
pub const BLOCK: usize = 512;

/// A block of one column or register, aligned to a cache line.
#[derive(Debug, Clone, Copy)]
#[repr(C, align(64))]
pub struct Block(pub [f64; BLOCK]);

impl Block {
    /// A block of zeros.
    pub const ZERO: Block = Block([0.0; BLOCK]);
}

/// What a program is asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Output {
    /// The weighted sum over rows.
    Sum(Id),
    /// The value in each row.
    Row(Id),
    /// The value in each row times its weight.
    WeightedRow(Id),
}

/// Where an operand lies.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) enum Source {
    Register(u16),
    Column(u16),
    Weight,
}

/// An argument of a call: one value a row, or one for all rows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Argument {
    Row(Source),
    Scalar(u32),
}

/// The most arguments a call on blocks has; those that take any number are written in other operations.
pub(super) const ARGUMENTS: usize = 8;

/// An operation on blocks; scalars are indices into the once-a-pass values.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Op {
    Fill(u32),
    Scale(Source, u32),
    Shift(Source, u32),
    /// scale * a + shift
    Affine(Source, u32, u32),
    Add(Source, Source),
    Subtract(Source, Source),
    /// a + scale * b
    AddScaled(Source, u32, Source),
    Multiply(Source, Source),
    /// as Multiply, but zero times infinity is zero
    MultiplyZero(Source, Source),
    Reciprocal(Source),
    PowerConstant(Source, f64),
    Power(Source, Source),
    Call1(Function, Source),
    /// any number of arguments, at most [`ARGUMENTS`]
    Call(Function, Box<[Argument]>),
    Deviance(Source, Source),
    Greatest(Box<[Source]>),
    Least(Box<[Source]>),
    /// greatest, but 0 where all are -inf
    ShiftOf(Box<[Source]>),
    Choose(Source, Source, Source),
    Compare(Relation, Source, Source),
    And(Source, Source),
    Or(Source, Source),
    Not(Source),
}

impl Op {
    pub(super) fn sources(&self) -> Vec<Source> {
        match self {
            Op::Fill(_) => vec![],
            Op::Scale(a, _)
            | Op::Shift(a, _)
            | Op::Affine(a, _, _)
            | Op::Reciprocal(a)
            | Op::PowerConstant(a, _)
            | Op::Call1(_, a)
            | Op::Not(a) => vec![*a],
            Op::Add(a, b)
            | Op::Subtract(a, b)
            | Op::AddScaled(a, _, b)
            | Op::Multiply(a, b)
            | Op::MultiplyZero(a, b)
            | Op::Power(a, b)
            | Op::Deviance(a, b)
            | Op::Compare(_, a, b)
            | Op::And(a, b)
            | Op::Or(a, b) => vec![*a, *b],
            Op::Choose(a, b, c) => vec![*a, *b, *c],
            Op::Greatest(a) | Op::Least(a) | Op::ShiftOf(a) => a.to_vec(),
            Op::Call(_, a) => a.iter().filter_map(|x| if let Argument::Row(s) = x { Some(*s) } else { None }).collect(),
        }
    }

    pub(super) fn map(&mut self, f: &dyn Fn(Source) -> Source) {
        match self {
            Op::Fill(_) => {}
            Op::Scale(a, _)
            | Op::Shift(a, _)
            | Op::Affine(a, _, _)
            | Op::Reciprocal(a)
            | Op::PowerConstant(a, _)
            | Op::Call1(_, a)
            | Op::Not(a) => *a = f(*a),
            Op::Add(a, b)
            | Op::Subtract(a, b)
            | Op::AddScaled(a, _, b)
            | Op::Multiply(a, b)
            | Op::MultiplyZero(a, b)
            | Op::Power(a, b)
            | Op::Deviance(a, b)
            | Op::Compare(_, a, b)
            | Op::And(a, b)
            | Op::Or(a, b) => {
                *a = f(*a);
                *b = f(*b);
            }
            Op::Choose(a, b, c) => {
                *a = f(*a);
                *b = f(*b);
                *c = f(*c);
            }
            Op::Greatest(a) | Op::Least(a) | Op::ShiftOf(a) => a.iter_mut().for_each(|s| *s = f(*s)),
            Op::Call(_, a) => {
                for x in a {
                    if let Argument::Row(s) = x {
                        *s = f(*s);
                    }
                }
            }
        }
    }
}

/// A sum over the rows of a block, added to one accumulator.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Gather {
    Sum(Source),
    /// sum of logarithms, by products of mantissas
    SumLog(Source),
    Dot(Source, Source),
    /// as Dot, but zero times infinity is zero
    DotZero(Source, Source),
}

impl Gather {
    pub(super) fn sources(self) -> Vec<Source> {
        match self {
            Gather::Sum(a) | Gather::SumLog(a) => vec![a],
            Gather::Dot(a, b) | Gather::DotZero(a, b) => vec![a, b],
        }
    }

    pub(super) fn map(self, f: impl Fn(Source) -> Source) -> Gather {
        match self {
            Gather::Sum(a) => Gather::Sum(f(a)),
            Gather::SumLog(a) => Gather::SumLog(f(a)),
            Gather::Dot(a, b) => Gather::Dot(f(a), f(b)),
            Gather::DotZero(a, b) => Gather::DotZero(f(a), f(b)),
        }
    }
}

/// One step of a program: an operation into a register, or a gather into an accumulator.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Step {
    Op(u16, Op),
    Gather(u32, Gather),
}

/// Which row sum a term of an output uses.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Total {
    /// Gathered in each pass.
    Gathered(usize),
    /// Known once the data are bound.
    Fixed(usize),
}

/// A per-row output: scale (once a pass) times a block.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct RowOutput {
    pub(super) scale: u32,
    /// `None`: the block is all ones.
    pub(super) source: Option<Source>,
    /// The node of the block, for callers that keep what does not change between passes.
    pub(super) node: Id,
    pub(super) fixed: bool,
}

/// The compiled program.
#[derive(Debug, Clone, Default)]
pub struct Program {
    pub(super) scalars: Scalars,
    pub(super) predictors: usize,
    pub(super) steps: Vec<Step>,
    pub(super) registers: usize,
    pub(super) gathered: usize,
    /// Only while the program is made; then they stand among the steps.
    pub(super) gathers: Vec<Gather>,
    /// Each sum output: terms (scalar, total).
    pub(super) sums: Vec<Vec<(u32, Total)>>,
    pub(super) rows: Vec<RowOutput>,
}

impl Program {
    /// The once-a-pass values at these parameters.
    pub fn scalars(&self, parameters: &[f64]) -> Vec<f64> {
        self.scalars.evaluate(parameters)
    }

    /// How many accumulators a chunk needs.
    pub fn gathers(&self) -> usize {
        self.gathered
    }

    /// How many row outputs there are.
    pub fn row_outputs(&self) -> usize {
        self.rows.len()
    }

    /// Operations on blocks, for the curious and the benchmark.
    pub fn operations(&self) -> usize {
        self.steps.len()
    }

    /// Whether a pass over the rows is needed at all (else every sum is known once the data are bound).
    pub fn needs_rows(&self) -> bool {
        self.gathered > 0 || self.rows.iter().any(|r| !r.fixed)
    }

    /// The sum outputs from the once-a-pass values, the gathered sums and the fixed sums.
    pub fn finish(&self, scalars: &[f64], gathered: &[f64], fixed: &[f64]) -> Vec<f64> {
        self.sums
            .iter()
            .map(|terms| {
                terms.iter().fold(0.0, |s, &(k, total)| {
                    let sum = match total {
                        Total::Gathered(i) => gathered[i],
                        Total::Fixed(i) => fixed[i],
                    };
                    // a count of zero takes its term away, whatever the factor (0 log 0 = 0)
                    if sum == 0.0 { s } else { s + scalars[k as usize] * sum }
                })
            })
            .collect()
    }

    /// The factor of row output `k`.
    pub fn row_scale(&self, k: usize, scalars: &[f64]) -> f64 {
        scalars[self.rows[k].scale as usize]
    }

    /// A key that is equal for row outputs whose blocks are the same in every pass; `None` if the block changes.
    pub fn row_fixed(&self, k: usize) -> Option<Id> {
        self.rows[k].fixed.then_some(self.rows[k].node)
    }
}
