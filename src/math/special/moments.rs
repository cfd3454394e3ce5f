//! Integrals over a density that falls from the end of its interval, with the moments of what its shapes multiply.

use super::jet::Jet;
use libm::{exp, log};

/// Nodes and weights of Gauss-Legendre quadrature with 32 points on [-1, 1], positive half (Newton's method on the recurrence
/// of the polynomials in 40 digits).
const LEGENDRE: [(f64, f64); 16] = [
    (0.997263861849481564, 0.0070186100094700966),
    (0.985611511545268335, 0.0162743947309056706),
    (0.964762255587506431, 0.0253920653092620595),
    (0.934906075937739689, 0.0342738629130214331),
    (0.896321155766052124, 0.0428358980222266807),
    (0.84936761373256997, 0.0509980592623761762),
    (0.794483795967942407, 0.0586840934785355471),
    (0.73218211874028968, 0.0658222227763618468),
    (0.663044266930215201, 0.0723457941088485062),
    (0.587715757240762329, 0.0781938957870703065),
    (0.50689990893222939, 0.0833119242269467552),
    (0.421351276130635345, 0.0876520930044038111),
    (0.33186860228212765, 0.0911738786957638847),
    (0.239287362252137075, 0.0938443990808045656),
    (0.144471961582796493, 0.0956387200792748594),
    (0.0483076656877383162, 0.0965400885147278006),
];

/// The exponent at which the integrand is taken for zero: exp(-40) is 4e-18.
const REACH: f64 = 40.0;

/// A concave exponent f(u), with f(0) = 0, that falls (or nearly so) from u = 0 on, and what is averaged over exp(f).
pub(super) trait Falling {
    /// f(u).
    fn exponent(&self, u: f64) -> f64;
    /// f'(u).
    fn slope(&self, u: f64) -> f64;
    /// What the shapes a and b multiply in the exponent: its derivatives in them.
    fn shares(&self, u: f64) -> [f64; 2];
}

/// log of the integral of exp(f) from u = 0 on, and its derivatives in the shapes: the means, variances and covariance of
/// their shares. `steepness` and `curvature` are -f'(0) and -f''(0).
///
/// Relative error 1e-14 where exp(f) is like an exponential, a normal, or between them: where the range of 40 in the exponent is
/// well inside the domain of f.
pub(super) fn integral(f: &impl Falling, steepness: f64, curvature: f64) -> Jet {
    let d = steepness.max(0.0);
    let mut end = 2.0 * REACH / (d + libm::sqrt(d * d + 2.0 * REACH * curvature));
    // from the right of the point Newton's method on a concave function falls to it without passing it
    for _ in 0..12 {
        let excess = f.exponent(end) + REACH;
        if excess.abs() < 2.0 {
            break;
        }
        end -= excess / f.slope(end);
    }
    let half = 0.5 * end;
    let mut points = [(0.0, [0.0; 2]); 2 * LEGENDRE.len()];
    let (mut total, mut mean) = (0.0, [0.0; 2]);
    for (pair, &(x, w)) in points.chunks_exact_mut(2).zip(&LEGENDRE) {
        for (point, x) in pair.iter_mut().zip([1.0 - x, 1.0 + x]) {
            let weight = w * exp(f.exponent(half * x));
            let l = f.shares(half * x);
            *point = (weight, l);
            total += weight;
            mean = [mean[0] + weight * l[0], mean[1] + weight * l[1]];
        }
    }
    let mean = [mean[0] / total, mean[1] / total];
    let mut out = Jet::constant(log(half * total));
    for (weight, l) in points {
        let (w, p, q) = (weight / total, l[0] - mean[0], l[1] - mean[1]);
        out.aa += w * p * p;
        out.ab += w * p * q;
        out.bb += w * q * q;
    }
    Jet { a: mean[0], b: mean[1], ..out }
}
