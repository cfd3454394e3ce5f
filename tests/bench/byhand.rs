//! The same arithmetic written out by hand: what a careful person would write for one model and no other.
//!
//! Columns are walked in blocks of 400 rows, whole ones only; loops over arrays of a known length are plain enough for
//! the compiler to vectorise, and compiled for the machine at hand (AVX-512, AVX2 or the base set, chosen at run time) as
//! the program's own kernels are. One thread.

use multiversion::multiversion;

/// Rows of a block; the benches' numbers of rows are multiples of it.
pub const BLOCK: usize = 400;
type Rows = [f64; BLOCK];

fn blocks(column: &[f64]) -> &[Rows] {
    column.as_chunks().0
}

#[inline(always)]
fn sum(a: &Rows) -> f64 {
    let mut lanes = [0.0; 16];
    for chunk in a.as_chunks::<16>().0 {
        for i in 0..16 {
            lanes[i] += chunk[i];
        }
    }
    lanes.iter().sum()
}

#[inline(always)]
fn dot(a: &Rows, b: &Rows) -> f64 {
    let mut lanes = [0.0; 16];
    for (p, q) in a.as_chunks::<16>().0.iter().zip(b.as_chunks::<16>().0) {
        for i in 0..16 {
            lanes[i] += p[i] * q[i];
        }
    }
    lanes.iter().sum()
}

/// Sum of logarithms of positive normal numbers: mantissas are multiplied, exponents added.
#[inline(always)]
fn sum_of_logs(a: &Rows) -> f64 {
    let (mut product, mut exponent) = ([1.0; 16], [0i64; 16]);
    // 25 mantissas below two stay far below the largest double.
    for chunk in a.as_chunks::<16>().0 {
        for i in 0..16 {
            let bits = chunk[i].to_bits();
            exponent[i] += (bits >> 52) as i64;
            product[i] *= f64::from_bits(bits & 0x000f_ffff_ffff_ffff | 0x3ff0_0000_0000_0000);
        }
    }
    let biased: i64 = exponent.iter().sum();
    product.iter().map(|p| p.ln()).sum::<f64>() + (biased - 1023 * BLOCK as i64) as f64 * std::f64::consts::LN_2
}

/// Value, gradient and lower Hessian by mean and sd of a normal log-likelihood: two sums a row, the rest follows.
pub fn normal(y: &[f64], mean: f64, sd: f64) -> Vec<f64> {
    let [s1, s2] = deviations(y, mean);
    let n = y.len() as f64;
    let (v, ln2pi) = (sd * sd, (2.0 * std::f64::consts::PI).ln());
    vec![
        -n * (sd.ln() + 0.5 * ln2pi) - 0.5 * s2 / v,
        s1 / v,
        s2 / (v * sd) - n / sd,
        -n / v,
        -2.0 * s1 / (v * sd),
        n / v - 3.0 * s2 / (v * v),
    ]
}

#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512dq+avx512vl+avx512bw", "x86_64+avx+avx2"))]
fn deviations(y: &[f64], mean: f64) -> [f64; 2] {
    let mut total = [0.0; 2];
    let mut d = [0.0; BLOCK];
    for y in blocks(y) {
        for i in 0..BLOCK {
            d[i] = y[i] - mean;
        }
        total[0] += sum(&d);
        total[1] += dot(&d, &d);
    }
    total
}

/// Value, gradient and lower Hessian of a mixture of three known components by its shares; `f` are the densities, one
/// column a component, computed once.
#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512dq+avx512vl+avx512bw", "x86_64+avx+avx2"))]
pub fn mixture(f: [&[f64]; 3], shares: [f64; 3]) -> Vec<f64> {
    let mut total = vec![0.0; 10];
    let (mut m, mut x, mut y, mut z) = ([0.0; BLOCK], [0.0; BLOCK], [0.0; BLOCK], [0.0; BLOCK]);
    for ((a, b), c) in blocks(f[0]).iter().zip(blocks(f[1])).zip(blocks(f[2])) {
        for i in 0..BLOCK {
            m[i] = shares[0] * a[i] + shares[1] * b[i] + shares[2] * c[i];
            let r = 1.0 / m[i];
            x[i] = a[i] * r;
            y[i] = b[i] * r;
            z[i] = c[i] * r;
        }
        total[0] += sum_of_logs(&m);
        total[1] += sum(&x);
        total[2] += sum(&y);
        total[3] += sum(&z);
        for (t, (p, q)) in total[4..].iter_mut().zip([(&x, &x), (&x, &y), (&y, &y), (&x, &z), (&y, &z), (&z, &z)]) {
            *t -= dot(p, q);
        }
    }
    total
}

/// exp without branches, at most 2 units in the last place for |x| < 700 (degree 12, argument within half a log 2).
#[inline(always)]
fn exp(x: f64) -> f64 {
    const ROUND: f64 = 6_755_399_441_055_744.0; // 1.5 * 2^52: adding it leaves a whole number in the low bits
    let shifted = x * std::f64::consts::LOG2_E + ROUND;
    let n = shifted - ROUND;
    let r = x - n * 0.693_147_180_369_123_8 - n * 1.908_214_929_270_587_7e-10;
    let (r2, r4) = (r * r, r * r * r * r);
    let (a, b) = (1.0 + r, 0.5 + r * (1.0 / 6.0));
    let (c, d) = (1.0 / 24.0 + r * (1.0 / 120.0), 1.0 / 720.0 + r * (1.0 / 5040.0));
    let (e, f) = (1.0 / 40320.0 + r * (1.0 / 362_880.0), 1.0 / 3_628_800.0 + r * (1.0 / 39_916_800.0));
    let p = (a + r2 * b) + r4 * ((c + r2 * d) + r4 * ((e + r2 * f) + r4 * (1.0 / 479_001_600.0)));
    p * f64::from_bits((shifted.to_bits() << 52).wrapping_add(1023 << 52))
}

/// Columns of the logistic model; the first coefficient is the intercept.
pub const COVARIATES: usize = 10;
const K: usize = COVARIATES + 1;

/// Value, gradient (11) and lower Hessian (66) of a logistic log-likelihood with an intercept and ten covariates.
#[multiversion(targets("x86_64+avx+avx2+avx512f+avx512dq+avx512vl+avx512bw", "x86_64+avx+avx2"))]
pub fn logistic(y: &[f64], x: &[Vec<f64>], beta: &[f64; K]) -> Vec<f64> {
    let (mut value, mut gradient, mut hessian) = (0.0, [0.0; K], [[0.0; K]; K]);
    let (mut eta, mut residual, mut weight, mut scaled) = ([0.0; BLOCK], [0.0; BLOCK], [0.0; BLOCK], [0.0; BLOCK]);
    let ones = [1.0; BLOCK];
    for (at, y) in blocks(y).iter().enumerate() {
        let columns: [&Rows; K] = std::array::from_fn(|k| if k == 0 { &ones } else { &blocks(&x[k - 1])[at] });
        eta.fill(beta[0]);
        for k in 1..K {
            for i in 0..BLOCK {
                eta[i] += beta[k] * columns[k][i];
            }
        }
        // log f = y eta - max(eta, 0) - log(1 + exp(-|eta|)), the last summed as logs of numbers in (1, 2].
        for i in 0..BLOCK {
            let e = eta[i];
            let q = exp(-e.abs());
            let r = 1.0 / (1.0 + q);
            let p = if e < 0.0 { q * r } else { r };
            residual[i] = y[i] - p;
            weight[i] = q * r * r;
            scaled[i] = 1.0 + q;
            eta[i] = y[i] * e - if e > 0.0 { e } else { 0.0 };
        }
        value += sum(&eta) - sum_of_logs(&scaled);
        gradient[0] += sum(&residual);
        hessian[0][0] -= sum(&weight);
        for k in 1..K {
            gradient[k] += dot(&residual, columns[k]);
            for i in 0..BLOCK {
                scaled[i] = weight[i] * columns[k][i];
            }
            hessian[k][0] -= sum(&scaled);
            for j in 1..=k {
                hessian[k][j] -= dot(&scaled, columns[j]);
            }
        }
    }
    let mut out = vec![value];
    out.extend(gradient);
    for (k, row) in hessian.iter().enumerate() {
        out.extend(&row[..=k]);
    }
    out
}
