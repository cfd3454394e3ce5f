//! The inner product that the factorisations share.

/// Sum of products in eight lanes over blocks, the blocks summed in pairs' order: error grows with the block count's
/// logarithm rather than the length, and the order is the same on every machine.
pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    const BLOCK: usize = 1024;
    if a.len() > BLOCK {
        let half = (a.len() / 2).div_ceil(BLOCK) * BLOCK;
        if half < a.len() {
            return dot(&a[..half], &b[..half]) + dot(&a[half..], &b[half..]);
        }
    }
    let mut lanes = [0.0; 8];
    let (ca, cb) = (a.chunks_exact(8), b.chunks_exact(8));
    let rest: f64 = ca.remainder().iter().zip(cb.remainder()).map(|(x, y)| x * y).sum();
    for (x, y) in ca.zip(cb) {
        for l in 0..8 {
            lanes[l] += x[l] * y[l];
        }
    }
    ((lanes[0] + lanes[4]) + (lanes[1] + lanes[5])) + ((lanes[2] + lanes[6]) + (lanes[3] + lanes[7])) + rest
}
