//! Products of design columns over a block of rows: predictors, gradients and weighted Gram products.

use std::hint::black_box;

use multiversion::multiversion;

use crate::expr::Block;

/// Partial sums of a reduction; their number and order are part of the result.
const LANES: usize = 8;

/// eta = offset + sum of coefficient * column over one block.
#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512bw+avx512dq+avx512vl", "x86_64+avx+avx2"))]
pub(super) fn predict(
    out: &mut [f64],
    columns: &[Vec<Block>],
    offset: Option<&[Block]>,
    block: usize,
    coefficients: &[f64],
) {
    let n = out.len();
    match offset {
        Some(o) => out.copy_from_slice(&o[block].0[..n]),
        None => out.fill(0.0),
    }
    let mut pairs = columns.chunks_exact(2).zip(coefficients.chunks_exact(2));
    for (c, b) in &mut pairs {
        let (x, y) = (&c[0][block].0[..n], &c[1][block].0[..n]);
        for ((o, &x), &y) in out.iter_mut().zip(x).zip(y) {
            *o = (*o + b[0] * x) + b[1] * y;
        }
    }
    if columns.len() % 2 == 1 {
        let (last, b) = (columns.len() - 1, coefficients[coefficients.len() - 1]);
        for (o, &x) in out.iter_mut().zip(&columns[last][block].0[..n]) {
            *o += b * x;
        }
    }
}

/// Adds sum_i x_ij h_i for each column j.
#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512bw+avx512dq+avx512vl", "x86_64+avx+avx2"))]
pub(super) fn cross(out: &mut [f64], columns: &[Vec<Block>], block: usize, h: &[f64]) {
    dots(out, columns, block, h);
}

/// Adds sum_i x_ij h_i x_ik for k <= j, row by row of the lower triangle.
#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512bw+avx512dq+avx512vl", "x86_64+avx+avx2"))]
pub(super) fn gram(out: &mut [f64], columns: &[Vec<Block>], block: usize, h: &[f64], work: &mut [f64]) {
    let n = h.len();
    let work = &mut work[..n];
    let mut at = 0;
    for j in 0..columns.len() {
        for ((w, &x), &h) in work.iter_mut().zip(&columns[j][block].0[..n]).zip(h) {
            *w = x * h;
        }
        dots(&mut out[at..at + j + 1], &columns[..j + 1], block, work);
        at += j + 1;
    }
}

/// Adds sum_i x_ij h_i z_ik for all j and k, row by row.
#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512bw+avx512dq+avx512vl", "x86_64+avx+avx2"))]
pub(super) fn gram_between(
    out: &mut [f64],
    left: &[Vec<Block>],
    right: &[Vec<Block>],
    block: usize,
    h: &[f64],
    work: &mut [f64],
) {
    let n = h.len();
    let work = &mut work[..n];
    for (j, x) in left.iter().enumerate() {
        for ((w, &x), &h) in work.iter_mut().zip(&x[block].0[..n]).zip(h) {
            *w = x * h;
        }
        dots(&mut out[j * right.len()..(j + 1) * right.len()], right, block, work);
    }
}

#[inline(always)]
fn dots(out: &mut [f64], columns: &[Vec<Block>], block: usize, h: &[f64]) {
    let n = h.len();
    let mut j = 0;
    while j + 4 <= columns.len() {
        let c = |k: usize| &columns[j + k][block].0[..n];
        let s = dot4(h, c(0), c(1), c(2), c(3));
        out[j] += s[0];
        out[j + 1] += s[1];
        out[j + 2] += s[2];
        out[j + 3] += s[3];
        j += 4;
    }
    while j < columns.len() {
        out[j] += dot1(h, &columns[j][block].0[..n]);
        j += 1;
    }
}

// Arrays of fixed length, one accumulator a column, and a wall before the final reduction: without them the compiler shapes the
// loop after the reduction's tree and uses a part of each vector register, at up to four times the cost.

#[inline(always)]
fn dot1(h: &[f64], x: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    let ((a, a_rest), (b, b_rest)) = (h.as_chunks::<LANES>(), x.as_chunks::<LANES>());
    for (a, b) in a.iter().zip(b) {
        for i in 0..LANES {
            lanes[i] += a[i] * b[i];
        }
    }
    reduce(black_box(lanes)) + rest(a_rest, b_rest)
}

/// Four dot products with one common factor, which is loaded once.
#[inline(always)]
fn dot4(h: &[f64], x0: &[f64], x1: &[f64], x2: &[f64], x3: &[f64]) -> [f64; 4] {
    let (mut l0, mut l1, mut l2, mut l3) = ([0.0; LANES], [0.0; LANES], [0.0; LANES], [0.0; LANES]);
    let (a, a_rest) = h.as_chunks::<LANES>();
    let (c0, r0) = x0.as_chunks::<LANES>();
    let (c1, r1) = x1.as_chunks::<LANES>();
    let (c2, r2) = x2.as_chunks::<LANES>();
    let (c3, r3) = x3.as_chunks::<LANES>();
    let n = a.len();
    let (c0, c1, c2, c3) = (&c0[..n], &c1[..n], &c2[..n], &c3[..n]);
    for k in 0..n {
        let (a, p, q, r, s) = (&a[k], &c0[k], &c1[k], &c2[k], &c3[k]);
        for i in 0..LANES {
            l0[i] += a[i] * p[i];
        }
        for i in 0..LANES {
            l1[i] += a[i] * q[i];
        }
        for i in 0..LANES {
            l2[i] += a[i] * r[i];
        }
        for i in 0..LANES {
            l3[i] += a[i] * s[i];
        }
    }
    let (l0, l1, l2, l3) = black_box((l0, l1, l2, l3));
    [
        reduce(l0) + rest(a_rest, r0),
        reduce(l1) + rest(a_rest, r1),
        reduce(l2) + rest(a_rest, r2),
        reduce(l3) + rest(a_rest, r3),
    ]
}

#[inline(always)]
fn rest(a: &[f64], b: &[f64]) -> f64 {
    let mut s = 0.0;
    for (a, b) in a.iter().zip(b) {
        s += a * b;
    }
    s
}

#[inline(always)]
fn reduce(l: [f64; LANES]) -> f64 {
    ((l[0] + l[4]) + (l[2] + l[6])) + ((l[1] + l[5]) + (l[3] + l[7]))
}
