//! Products of design columns over a block of rows: predictors, gradients and weighted Gram products.

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
        let c = [0, 1, 2, 3].map(|k| &columns[j + k][block].0[..n]);
        let s = dot4(h, c);
        for k in 0..4 {
            out[j + k] += s[k];
        }
        j += 4;
    }
    while j < columns.len() {
        out[j] += dot1(h, &columns[j][block].0[..n]);
        j += 1;
    }
}

#[inline(always)]
fn dot1(h: &[f64], x: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    let (mut a, mut b) = (h.chunks_exact(LANES), x.chunks_exact(LANES));
    for (a, b) in (&mut a).zip(&mut b) {
        for i in 0..LANES {
            lanes[i] += a[i] * b[i];
        }
    }
    for (i, (&a, &b)) in a.remainder().iter().zip(b.remainder()).enumerate() {
        lanes[i] += a * b;
    }
    reduce(lanes)
}

/// Four dot products with one common factor, which is loaded once.
#[inline(always)]
fn dot4(h: &[f64], x: [&[f64]; 4]) -> [f64; 4] {
    let mut lanes = [[0.0; LANES]; 4];
    let whole = h.len() / LANES * LANES;
    let (x0, x1, x2, x3) = (&x[0][..h.len()], &x[1][..h.len()], &x[2][..h.len()], &x[3][..h.len()]);
    let mut at = 0;
    while at < whole {
        let a = &h[at..at + LANES];
        let (p, q, r, s) = (&x0[at..at + LANES], &x1[at..at + LANES], &x2[at..at + LANES], &x3[at..at + LANES]);
        for i in 0..LANES {
            lanes[0][i] += a[i] * p[i];
            lanes[1][i] += a[i] * q[i];
            lanes[2][i] += a[i] * r[i];
            lanes[3][i] += a[i] * s[i];
        }
        at += LANES;
    }
    for i in whole..h.len() {
        for k in 0..4 {
            lanes[k][i - whole] += h[i] * x[k][i];
        }
    }
    lanes.map(reduce)
}

#[inline(always)]
fn reduce(l: [f64; LANES]) -> f64 {
    ((l[0] + l[4]) + (l[2] + l[6])) + ((l[1] + l[5]) + (l[3] + l[7]))
}
