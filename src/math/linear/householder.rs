//! Householder reduction of a tall matrix given by columns, with column pivoting.

use super::dot::dot;
use crate::math::Matrix;

/// A pivot of the factorisation of columns of unit length below this times the number of columns counts as zero. Householder
/// QR leaves rounding of a few eps (2e-16) in the pivots of an exactly collinear column; data written in decimals add an eps
/// or so of each entry. 1e-13 is some hundred times that, and a thousandth of the smallest pivot of the hardest certified
/// data set (the degree-10 polynomial of NIST's Filip: see the test).
pub(super) const RANK: f64 = 1e-13;

/// y += a x.
fn add(y: &mut [f64], a: f64, x: &[f64]) {
    for (y, x) in y.iter_mut().zip(x) {
        *y += a * x;
    }
}

/// Divides a column by its length, free of overflow, and returns the length; a column of zeros stays.
pub(super) fn normalise(c: &mut [f64]) -> f64 {
    let largest = c.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
    if largest == 0.0 {
        return 0.0;
    }
    // A power of two first, so that squares neither overflow nor vanish and nothing is rounded.
    let power = libm::ldexp(1.0, -libm::ilogb(largest));
    c.iter_mut().for_each(|v| *v *= power);
    let length = dot(c, c).sqrt();
    c.iter_mut().for_each(|v| *v /= length);
    length / power
}

/// Rows a block of the first reduction holds: a block of ten columns stays in the second-level cache.
const ROWS: usize = 4096;

/// Orthonormal columns, triangle (rank x p) and the order of the columns. A tall design is reduced block by block of rows
/// first, without pivoting, and the blocks' triangles then together (Demmel, Grigori, Hoemmen and Langou 2012): the same
/// backward error, and each row is fetched from memory twice rather than twice a column.
pub(super) fn factorise(mut work: Vec<Vec<f64>>, n: usize) -> (Vec<Vec<f64>>, Matrix, Vec<usize>) {
    let p = work.len();
    let block = ROWS.max(4 * p);
    if n <= 2 * block {
        let (rank, triangle, order) = reduce(&mut work, n, true);
        return (form(&work, n, rank, None), triangle, order);
    }
    let blocks = n / block;
    let ends = |b: usize| (b * block, if b + 1 == blocks { n } else { (b + 1) * block });
    let mut reflectors = Vec::with_capacity(blocks);
    let mut stacked = vec![vec![0.0; blocks * p]; p];
    for b in 0..blocks {
        let (from, to) = ends(b);
        let mut part: Vec<Vec<f64>> = work.iter().map(|c| c[from..to].to_vec()).collect();
        let (_, triangle, _) = reduce(&mut part, to - from, false);
        for (j, column) in stacked.iter_mut().enumerate() {
            column[b * p..(b + 1) * p].copy_from_slice(triangle.column(j).as_slice());
        }
        reflectors.push(part);
    }
    let (rank, triangle, order) = reduce(&mut stacked, blocks * p, true);
    let top = form(&stacked, blocks * p, rank, None);
    let mut q = work;
    q.truncate(rank);
    for (b, part) in reflectors.iter().enumerate() {
        let (from, to) = ends(b);
        let heads: Vec<&[f64]> = top.iter().map(|c| &c[b * p..(b + 1) * p]).collect();
        for (column, piece) in q.iter_mut().zip(form(part, to - from, p, Some(&heads))) {
            column[from..to].copy_from_slice(&piece);
        }
    }
    (q, triangle, order)
}

/// Householder reduction in place, with column pivoting if `pivoting` and else as the columns stand, to the last. Column k
/// of `work` then holds in rows k.. the reflector v_k (v'v = 2, or zero for a column with nothing left), for k below the rank. Returns the rank, the triangle (rank x p) and the order of the columns; columns of `work` are permuted
/// likewise.
fn reduce(work: &mut [Vec<f64>], n: usize, pivoting: bool) -> (usize, Matrix, Vec<usize>) {
    let p = work.len();
    let mut order: Vec<usize> = (0..p).collect();
    let mut triangle = Matrix::zeros(n.min(p), p);
    let mut left: Vec<f64> = work.iter().map(|c| dot(c, c)).collect();
    let mut fresh = left.clone();
    let mut rank = 0;
    for k in 0..n.min(p) {
        // The first of the longest: ties go to the column written first.
        let pivot = if pivoting { (k..p).fold(k, |best, j| if left[j] > left[best] { j } else { best }) } else { k };
        work.swap(k, pivot);
        order.swap(k, pivot);
        left.swap(k, pivot);
        fresh.swap(k, pivot);
        for i in 0..k {
            triangle.swap((i, k), (i, pivot));
        }
        let (done, rest) = work.split_at_mut(k + 1);
        let v = &mut done[k][k..];
        let length = dot(v, v).sqrt();
        if pivoting && length <= RANK * p as f64 {
            break;
        }
        rank = k + 1;
        if length == 0.0 {
            for (j, column) in rest.iter().enumerate() {
                triangle[(k, k + 1 + j)] = column[k];
            }
            continue;
        }
        let diagonal = if v[0] > 0.0 { -length } else { length };
        triangle[(k, k)] = diagonal;
        // v / sqrt(length (length + |v_0|)) has squared length 2, so the reflection is y - v (v'y).
        let size = (length * (length + v[0].abs())).sqrt();
        v[0] -= diagonal;
        v.iter_mut().for_each(|x| *x /= size);
        for (j, column) in rest.iter_mut().enumerate() {
            let j = k + 1 + j;
            let y = &mut column[k..];
            let along = dot(v, y);
            add(y, -along, v);
            triangle[(k, j)] = y[0];
            // Down-dated length, computed anew once cancellation has eaten half the digits (LAPACK working note 176).
            left[j] -= y[0] * y[0];
            if pivoting && left[j] <= 1e-8 * fresh[j] {
                left[j] = dot(&y[1..], &y[1..]);
                fresh[j] = left[j];
            }
        }
    }
    (rank, triangle.rows(0, rank).into_owned(), order)
}

/// The product of the first `rank` reflectors times the leading columns of the identity, or times columns that hold the
/// heads given and zeros below.
fn form(work: &[Vec<f64>], n: usize, rank: usize, heads: Option<&[&[f64]]>) -> Vec<Vec<f64>> {
    let mut q = vec![vec![0.0; n]; heads.map_or(rank, <[&[f64]]>::len)];
    if let Some(heads) = heads {
        q.iter_mut().zip(heads).for_each(|(column, head)| column[..head.len()].copy_from_slice(head));
    }
    for k in (0..rank).rev() {
        let v = &work[k][k..];
        // A column of the identity is not touched by the reflectors beyond its own.
        let first = if heads.is_some() { 0 } else { k };
        if heads.is_none() {
            q[k][k] = 1.0;
        }
        for column in &mut q[first..] {
            let y = &mut column[k..];
            let along = dot(v, y);
            add(y, -along, v);
        }
    }
    q
}
