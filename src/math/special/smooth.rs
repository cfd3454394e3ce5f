//! Quotients of log1p that are smooth at zero, with their derivatives.

use libm::log1p;

/// The order-th derivative (0 to 4) in w of log1p(w)/w, w > -1: 1, -1/2, ... at w = 0. NaN below -1 and for other orders.
///
/// Relative error 1e-13 at most, and far less up to order 2. It is (-1)^m m! times the integral of t^m / (1 + w t)^(m+1) over [0, 1].
pub fn log1p_over(order: f64, w: f64) -> f64 {
    let Some(order) = super::whole(order, MOST) else { return f64::NAN };
    if let Some(end) = end(order, w) {
        return end;
    }
    if (-0.5..=1.0).contains(&w) { near(order, w, 0) } else { quotients(w)[order] }
}

/// The order-th derivative (0 to 4) in w of (w - log1p(w))/w^2, w > -1: 1/2, -1/3, ... at w = 0. NaN below -1 and for other
/// orders.
///
/// Relative error 1e-13 at most, and far less up to order 2. It is (-1)^m m! times the integral of t^(m+1) / (1 + w t)^(m+1) over [0, 1].
pub fn log1p_excess(order: f64, w: f64) -> f64 {
    let Some(order) = super::whole(order, MOST) else { return f64::NAN };
    if let Some(end) = end(order, w) {
        return end;
    }
    if (-0.5..=1.0).contains(&w) {
        return near(order, w, 1);
    }
    // e = (1 - f)/w: w e^(m) + m e^(m-1) = -f^(m)
    let f = quotients(w);
    let mut e = (1.0 - f[0]) / w;
    for (m, f) in f.iter().enumerate().take(order + 1).skip(1) {
        e = -(f + m as f64 * e) / w;
    }
    e
}

const MOST: usize = 4;

/// Limits: infinite at -1, zero at infinity.
fn end(order: usize, w: f64) -> Option<f64> {
    if w.is_nan() || w < -1.0 {
        Some(f64::NAN)
    } else if w == -1.0 {
        Some(if order.is_multiple_of(2) { f64::INFINITY } else { f64::NEG_INFINITY })
    } else if w == f64::INFINITY {
        Some(0.0)
    } else {
        None
    }
}

/// f = log1p(w)/w and its derivatives away from zero: w f^(m) + m f^(m-1) is the m-th derivative of log1p.
fn quotients(w: f64) -> [f64; MOST + 1] {
    let mut f = [log1p(w) / w; MOST + 1];
    let k = 1.0 / (1.0 + w);
    let mut l = k;
    for m in 1..=MOST {
        let n = m as f64;
        f[m] = (l - n * f[m - 1]) / w;
        l *= -n * k;
    }
    f
}

/// The m-th derivative near zero: (-1)^m m! integral of t^(m + extra) (1 + w t)^-(m+1), by a series of positive terms on
/// either side of zero.
fn near(m: usize, w: f64, extra: usize) -> f64 {
    let n = m as f64;
    let start = n + extra as f64 + 1.0;
    let (mut sum, mut k) = (0.0, 0.0);
    let mut factor = 1.0;
    if w <= 0.0 {
        // (1 + w t)^-(m+1) = sum C(m+k, k) (-w t)^k
        while factor > 1e-18 {
            sum += factor / (start + k);
            k += 1.0;
            factor *= -w * (n + k) / k;
        }
    } else {
        // with r = t (1+w)/(1+w t) and p = w/(1+w): (1+w)^-start times the integral of r^(start-1) (1 - p r)^-(1+extra)
        let p = w / (1.0 + w);
        let mut power = 1.0;
        while factor > 1e-18 {
            sum += factor / (start + k);
            k += 1.0;
            power *= p;
            factor = if extra == 1 { power * (k + 1.0) } else { power };
        }
        for _ in 0..=(m + extra) {
            sum /= 1.0 + w;
        }
    }
    for i in 1..=m {
        sum *= -(i as f64);
    }
    sum
}
