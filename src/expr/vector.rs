//! Branch-free loops over a block: exponential, logarithm and what is built of them, sums and dot products.
//!
//! Arguments outside the range of the fast path (overflow, subnormal, NaN) are done again one by one with `libm`. At most one
//! unit in the last place from the exact value on the fast path.

use std::hint::black_box;

use crate::math::special::deviance;

/// Partial sums of a reduction. Their number and order are part of the result, so it is the same on every machine.
pub(super) const LANES: usize = 16;

const LOG2_E: f64 = std::f64::consts::LOG2_E;
/// log 2 in two parts, the first with zeros at the end so that k * LN2_HIGH is exact
const LN2_HIGH: f64 = 6.931_471_803_691_238_16e-1;
const LN2_LOW: f64 = 1.908_214_929_270_587_70e-10;
/// Adding and subtracting it rounds to a whole number.
const ROUND: f64 = 6_755_399_441_055_744.0;

/// exp on [-708, 709]; anything else gives an arbitrary number.
#[inline(always)]
pub(super) fn exp_fast(x: f64) -> f64 {
    let shifted = x * LOG2_E + ROUND;
    let k = shifted - ROUND;
    let r = (x - k * LN2_HIGH) - k * LN2_LOW;
    // Taylor polynomial on |r| <= log(2) / 2: the rest is below 5e-18
    let r2 = r * r;
    let r4 = r2 * r2;
    let p01 = 0.5 + r * (1.0 / 6.0);
    let p23 = 1.0 / 24.0 + r * (1.0 / 120.0);
    let p45 = 1.0 / 720.0 + r * (1.0 / 5_040.0);
    let p67 = 1.0 / 40_320.0 + r * (1.0 / 362_880.0);
    let p89 = 1.0 / 3_628_800.0 + r * (1.0 / 39_916_800.0);
    let pab = 1.0 / 479_001_600.0 + r * (1.0 / 6_227_020_800.0);
    let low = p01 + r2 * p23;
    let mid = p45 + r2 * p67;
    let high = p89 + r2 * pab;
    let p = low + r4 * (mid + r4 * high);
    let e = 1.0 + (r + r2 * p);
    // the low bits of `shifted` hold k; two steps keep the factor in range at both ends
    let k = (shifted.to_bits() << 52).wrapping_add(1023 << 52);
    e * f64::from_bits(k)
}

#[inline(always)]
fn exp_is_fast(x: f64) -> bool {
    (-708.0..=709.0).contains(&x)
}

#[inline(always)]
pub(super) fn exp_block(out: &mut [f64], a: &[f64]) {
    let mut all = true;
    for (o, &x) in out.iter_mut().zip(a) {
        *o = exp_fast(x);
        all &= exp_is_fast(x);
    }
    if !all {
        for (o, &x) in out.iter_mut().zip(a) {
            if !exp_is_fast(x) {
                *o = libm::exp(x);
            }
        }
    }
}

#[inline(always)]
fn log_is_fast(x: f64) -> bool {
    (f64::MIN_POSITIVE..f64::INFINITY).contains(&x)
}

/// Exponent (as a double) and mantissa in [sqrt(1/2), sqrt(2)) of a positive normal number.
#[inline(always)]
fn parts(x: f64) -> (f64, f64) {
    const HALF_ROOT: u64 = 0x3fe6_a09e_667f_3bcd;
    let bits = x.to_bits();
    let e = bits.wrapping_sub(HALF_ROOT).wrapping_add(0x4000_0000_0000_0000) >> 52;
    let m = f64::from_bits(bits.wrapping_sub(e.wrapping_sub(0x400) << 52));
    // a small whole number to a double by way of the bits of 2^52 + e
    let k = f64::from_bits(0x4330_0000_0000_0000 | e) - 4_503_599_627_371_520.0;
    (k, m)
}

/// The minimax polynomial for (log(1 + s) - log(1 - s) - 2 s) / s on |s| <= 0.1716, in z = s^2
#[inline(always)]
fn odd_part(z: f64) -> f64 {
    let w = z * z;
    let t1 = w * (3.999_999_999_940_941_908e-1 + w * (2.222_219_843_214_978_396e-1 + w * 1.531_383_769_920_937_332e-1));
    let t2 = z
        * (6.666_666_666_666_735_13e-1
            + w * (2.857_142_874_366_239_149e-1
                + w * (1.818_357_216_161_805_012e-1 + w * 1.479_819_860_511_658_591e-1)));
    t1 + t2
}

/// log of a positive normal number; anything else gives an arbitrary number.
#[inline(always)]
pub(super) fn log_fast(x: f64) -> f64 {
    let (k, m) = parts(x);
    let f = m - 1.0;
    let s = f / (2.0 + f);
    let r = odd_part(s * s);
    let h = 0.5 * f * f;
    k * LN2_HIGH - ((h - (s * (h + r) + k * LN2_LOW)) - f)
}

#[inline(always)]
pub(super) fn log_block(out: &mut [f64], a: &[f64]) {
    let mut all = true;
    for (o, &x) in out.iter_mut().zip(a) {
        *o = log_fast(x);
        all &= log_is_fast(x);
    }
    if !all {
        for (o, &x) in out.iter_mut().zip(a) {
            if !log_is_fast(x) {
                *o = libm::log(x);
            }
        }
    }
}

/// x log(x / m) - x + m. Both forms are computed and one is taken: near x = m the odd series of the logarithm in
/// v = (x - m)/(x + m), the polynomial of [`log_fast`] itself, beyond that the logarithm.
#[inline(always)]
pub(super) fn deviance_block(out: &mut [f64], a: &[f64], b: &[f64]) {
    // beyond these sizes, and at zero, the scalar function takes over
    let is_fast = |x: f64, m: f64| (1e-150..1e150).contains(&m) & (1e-150..1e150).contains(&x);
    let mut all = true;
    for ((o, &x), &m) in out.iter_mut().zip(a).zip(b) {
        let d = x - m;
        let v = d / (x + m);
        let close = d * v + x * (v * odd_part(v * v));
        let far = x * log_fast(x / m) - d;
        let y = if v.abs() <= 0.1715 { close } else { far };
        // a count of zero is common: it stays on the fast path
        *o = if x == 0.0 { m } else { y };
        all &= is_fast(x, m) | ((x == 0.0) & (m >= 0.0));
    }
    if !all {
        for ((o, &x), &m) in out.iter_mut().zip(a).zip(b) {
            if !is_fast(x, m) {
                *o = deviance(x, m);
            }
        }
    }
}

#[inline(always)]
pub(super) fn logistic_block(out: &mut [f64], a: &[f64]) {
    for (o, &x) in out.iter_mut().zip(a) {
        // exp(709) is finite: beyond it the result is 0 or 1 to rounding, clamping keeps NaN
        let e = exp_fast(-x.clamp(-708.0, 708.0));
        *o = if x.is_nan() { x } else { 1.0 / (1.0 + e) };
    }
}

/// log(logistic(x)) = min(x, 0) - log(1 + exp(-|x|))
#[inline(always)]
pub(super) fn log1p_exp_block(out: &mut [f64], a: &[f64]) {
    for (o, &x) in out.iter_mut().zip(a) {
        let u = exp_fast(-x.abs().min(708.0));
        let w = 1.0 + u;
        // the rounding of 1 + u is put back
        let l = log_fast(w) + (u - (w - 1.0)) / w;
        let low = if x < 0.0 { x } else { 0.0 };
        *o = if x.is_nan() { x } else { low - l };
    }
}

// Lanes pass through `black_box` before they are reduced: otherwise the compiler shapes the loop after the reduction's tree and
// uses a part of each vector register.
#[inline(always)]
fn reduce(l: [f64; LANES]) -> f64 {
    let mut h = [0.0; 8];
    for i in 0..8 {
        h[i] = l[i] + l[i + 8];
    }
    ((h[0] + h[4]) + (h[2] + h[6])) + ((h[1] + h[5]) + (h[3] + h[7]))
}

#[inline(always)]
pub(super) fn sum(a: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    let (chunks, rest) = a.as_chunks::<LANES>();
    for c in chunks {
        for i in 0..LANES {
            lanes[i] += c[i];
        }
    }
    reduce(black_box(lanes)) + rest.iter().fold(0.0, |s, x| s + x)
}

#[inline(always)]
fn dot_with(a: &[f64], b: &[f64], f: impl Fn(f64, f64) -> f64) -> f64 {
    let mut lanes = [0.0; LANES];
    let ((c, c_rest), (d, d_rest)) = (a.as_chunks::<LANES>(), b.as_chunks::<LANES>());
    for (c, d) in c.iter().zip(d) {
        for i in 0..LANES {
            lanes[i] += f(c[i], d[i]);
        }
    }
    reduce(black_box(lanes)) + c_rest.iter().zip(d_rest).fold(0.0, |s, (&c, &d)| s + f(c, d))
}

#[inline(always)]
pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    dot_with(a, b, |x, y| x * y)
}

#[inline(always)]
pub(super) fn dot_zero(a: &[f64], b: &[f64]) -> f64 {
    dot_with(a, b, |x, y| {
        let p = x * y;
        if p.is_nan() && !x.is_nan() && !y.is_nan() { 0.0 } else { p }
    })
}

/// Sum of logarithms: mantissas are multiplied, exponents added, one logarithm a lane is taken at the end.
#[inline(always)]
pub(super) fn sum_log(a: &[f64]) -> f64 {
    let mut all = true;
    for &x in a {
        all &= log_is_fast(x);
    }
    if !all {
        return a.iter().map(|&x| libm::log(x)).sum();
    }
    let mut product = [1.0; LANES];
    let mut exponent = [0.0; LANES];
    let (chunks, rest) = a.as_chunks::<LANES>();
    for c in chunks {
        for i in 0..LANES {
            let (k, m) = parts(c[i]);
            product[i] *= m;
            exponent[i] += k;
        }
    }
    // a block has at most 32 factors a lane, each within [0.7, 1.42): the product stays within 1e-5 and 1e5
    let (product, exponent) = black_box((product, exponent));
    let mut lanes = [0.0; LANES];
    for i in 0..LANES {
        lanes[i] = exponent[i] * LN2_HIGH + (libm::log(product[i]) + exponent[i] * LN2_LOW);
    }
    reduce(black_box(lanes)) + rest.iter().fold(0.0, |s, &x| s + libm::log(x))
}

#[cfg(test)]
mod tests {
    use super::{deviance_block, exp_block, log_block, log1p_exp_block, logistic_block, sum_log};

    /// Distance in units in the last place of the wanted value.
    fn ulps(got: f64, want: f64) -> f64 {
        if got == want || (got.is_nan() && want.is_nan()) {
            return 0.0;
        }
        let unit = f64::from_bits(want.abs().to_bits() + 1) - want.abs();
        (got - want).abs() / unit
    }

    fn worst(f: fn(&mut [f64], &[f64]), g: fn(f64) -> f64, points: &[f64]) -> (f64, f64) {
        let mut out = vec![0.0; points.len()];
        f(&mut out, points);
        points
            .iter()
            .zip(&out)
            .map(|(&x, &y)| (ulps(y, g(x)), x))
            .fold((0.0, 0.0), |w, p| if p.0 > w.0 { p } else { w })
    }

    #[test]
    fn blocks_agree_with_the_library() {
        let points: Vec<f64> = (0..200_001).map(|i| -760.0 + 0.0076 * f64::from(i)).collect();
        let near: Vec<f64> = (0..20_001).map(|i| 1e-4 * f64::from(i - 10_000)).collect();
        let ends = [0.0, -0.0, f64::INFINITY, f64::NEG_INFINITY, f64::NAN, 709.0, 709.9, -708.0, -745.2, 1e-320];
        for p in [&points[..], &near, &ends] {
            // the library is itself within one unit of the exact value
            let (w, x) = worst(exp_block, libm::exp, p);
            assert!(w <= 2.0, "exp {x}: {w}");
        }
        let positive: Vec<f64> = points.iter().map(|&x| libm::exp(x * 0.9)).collect();
        let about_one: Vec<f64> = near.iter().map(|&x| 1.0 + 0.9 * x).collect();
        for p in [&positive[..], &about_one, &ends, &[-1.0, -1e-310]] {
            let (w, x) = worst(log_block, libm::log, p);
            assert!(w <= 2.0, "log {x}: {w}");
        }
        let log_logistic = |x: f64| x.min(0.0) - libm::log1p(libm::exp(-x.abs()));
        // beyond 708 the result is below 1e-307 and taken as what it is at 708
        let inside: Vec<f64> = points.iter().copied().filter(|x| x.abs() < 708.0).collect();
        for p in [&inside[..], &near] {
            let (w, x) = worst(log1p_exp_block, log_logistic, p);
            assert!(w <= 3.0, "log_logistic {x}: {w}");
        }
        // 1 / (1 + exp(-x)) rounds three times
        let (w, x) = worst(logistic_block, |x| 1.0 / (1.0 + libm::exp(-x)), &inside);
        assert!(w <= 3.0, "logistic {x}: {w}");
    }

    #[test]
    fn deviances_agree_with_the_scalar_function() {
        let ends = [0.0, 1e-320, 1e-200, 1.0, 3.0, 1e200, f64::INFINITY, f64::NAN, -1.0];
        let mut pairs: Vec<(f64, f64)> = ends.iter().flat_map(|&x| ends.iter().map(move |&m| (x, m))).collect();
        for i in 0..40_000 {
            let x = f64::from(i % 97) + 1e-3 * f64::from(i % 7);
            let ratio = libm::exp(0.9 * libm::sin(f64::from(i)) * libm::pow(10.0, f64::from(-(i % 9))));
            pairs.push((x, x * ratio));
        }
        let (x, m): (Vec<f64>, Vec<f64>) = pairs.into_iter().unzip();
        let mut out = vec![0.0; x.len()];
        deviance_block(&mut out, &x, &m);
        for i in 0..x.len() {
            let want = crate::math::special::deviance(x[i], m[i]);
            // at a ratio of sqrt 2 the three terms are twenty times their sum
            assert!(ulps(out[i], want) <= 40.0, "{} {}: {} {want}", x[i], m[i], out[i]);
        }
    }

    #[test]
    fn the_sum_of_logarithms_is_the_sum() {
        let a: Vec<f64> = (1..500).map(|i| libm::exp(f64::from(i * 37 % 211) - 100.0)).collect();
        let want: f64 = a.iter().map(|&x| libm::log(x)).sum();
        let size: f64 = a.iter().map(|&x| libm::log(x).abs()).sum();
        // 500 roundings on either side
        assert!((sum_log(&a) - want).abs() < 500.0 * 2.3e-16 * size / 100.0, "{} {want}", sum_log(&a));
        assert_eq!(sum_log(&[1.0, 0.0]), f64::NEG_INFINITY);
        assert!(sum_log(&[1.0, -2.0]).is_nan());
    }
}
