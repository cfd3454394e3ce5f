//! Random numbers from a seed: a counter-based generator and the draws that samplers are made of.
//!
//! All transcendental parts come from `libm`, so a seed gives the same numbers on every machine.

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{RngCore, SeedableRng};

use super::special::normal_quantile;

/// A stream of random numbers. Streams of one seed do not overlap, so rows or replicates can each have their own.
#[derive(Debug, Clone)]
pub struct Random(ChaCha8Rng);

impl Random {
    /// Stream number `stream` of a seed.
    pub fn new(seed: u64, stream: u64) -> Random {
        let mut generator = ChaCha8Rng::seed_from_u64(seed);
        generator.set_stream(stream);
        Random(generator)
    }

    /// A number above 0 and below 1.
    pub fn uniform(&mut self) -> f64 {
        ((self.0.next_u64() >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    /// Standard normal, by inversion.
    pub fn normal(&mut self) -> f64 {
        normal_quantile(self.uniform())
    }

    /// Exponential of mean 1.
    pub fn exponential(&mut self) -> f64 {
        -libm::log(self.uniform())
    }

    /// Gamma of this shape and scale 1; 0 where a tiny shape puts it below the smallest double.
    ///
    /// Marsaglia and Tsang (2000), ACM Transactions on Mathematical Software 26.
    pub fn gamma(&mut self, shape: f64) -> f64 {
        if shape < 1.0 {
            return self.gamma(shape + 1.0) * libm::pow(self.uniform(), 1.0 / shape);
        }
        let d = shape - 1.0 / 3.0;
        let c = 1.0 / (9.0 * d).sqrt();
        loop {
            let x = self.normal();
            let v = (1.0 + c * x).powi(3);
            if v > 0.0 && libm::log(self.uniform()) < 0.5 * x * x + d - d * v + d * libm::log(v) {
                return d * v;
            }
        }
    }

    /// Beta of these shapes.
    pub fn beta(&mut self, a: f64, b: f64) -> f64 {
        let (x, y) = (self.gamma(a), self.gamma(b));
        x / (x + y)
    }

    /// Poisson of this mean, 0 or more.
    ///
    /// Ahrens and Dieter (1974), Computing 12: a gamma variable splits a large mean.
    pub fn poisson(&mut self, mean: f64) -> f64 {
        let (mut mean, mut count) = (mean, 0.0);
        while mean > 30.0 {
            let n = (0.875 * mean).floor();
            let x = self.gamma(n);
            if x > mean {
                return count + self.binomial(n - 1.0, mean / x);
            }
            count += n;
            mean -= x;
        }
        let mut p = libm::exp(-mean);
        let (mut u, mut k) = (self.uniform(), 0.0);
        // beyond 200 the mass of a mean under 30 is below 1e-100
        while u > p && k < 200.0 {
            u -= p;
            k += 1.0;
            p *= mean / k;
        }
        count + k
    }

    /// Binomial: successes among `trials` (a whole number).
    ///
    /// Ahrens and Dieter (1974), Computing 12: the median of the uniforms splits many trials.
    pub fn binomial(&mut self, trials: f64, probability: f64) -> f64 {
        let (mut n, mut p, mut count) = (trials, probability, 0.0);
        while n > 30.0 {
            let a = (0.5 * n).floor() + 1.0;
            let x = self.beta(a, n + 1.0 - a);
            if x <= p {
                // a of the uniforms lie at or below x, and so below p
                count += a;
                p = (p - x) / (1.0 - x);
                n -= a;
            } else {
                p /= x;
                n = a - 1.0;
            }
        }
        (0..n as u32).fold(count, |k, _| if self.uniform() < p { k + 1.0 } else { k })
    }
}

#[cfg(test)]
mod tests {
    use super::Random;

    fn moments(mut draw: impl FnMut() -> f64) -> (f64, f64) {
        let x: Vec<f64> = (0..40_000).map(|_| draw()).collect();
        let mean = x.iter().sum::<f64>() / x.len() as f64;
        (mean, x.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / x.len() as f64)
    }

    #[test]
    fn draws_have_their_means_and_variances() {
        let mut r = Random::new(1, 0);
        let mut check = |name: &str, draw: &mut dyn FnMut(&mut Random) -> f64, mean: f64, variance: f64| {
            let (m, v) = moments(|| draw(&mut r));
            // 40,000 draws: five standard errors of the mean, and a variance to 5%
            assert!((m - mean).abs() < 5.0 * (variance / 40_000.0).sqrt(), "{name}: mean {m} not {mean}");
            assert!((v / variance - 1.0).abs() < 0.05, "{name}: variance {v} not {variance}");
        };
        check("normal", &mut |r| r.normal(), 0.0, 1.0);
        check("exponential", &mut |r| r.exponential(), 1.0, 1.0);
        check("gamma 0.4", &mut |r| r.gamma(0.4), 0.4, 0.4);
        check("gamma 7", &mut |r| r.gamma(7.0), 7.0, 7.0);
        check("beta", &mut |r| r.beta(2.0, 3.0), 0.4, 0.04);
        check("poisson 4", &mut |r| r.poisson(4.0), 4.0, 4.0);
        check("poisson 500", &mut |r| r.poisson(500.0), 500.0, 500.0);
        check("binomial 12", &mut |r| r.binomial(12.0, 0.3), 3.6, 2.52);
        check("binomial 900", &mut |r| r.binomial(900.0, 0.3), 270.0, 189.0);
    }

    #[test]
    fn streams_are_the_same_every_time_and_differ() {
        let draw = |stream| Random::new(7, stream).uniform();
        assert_eq!(draw(3), draw(3));
        assert_ne!(draw(3), draw(4));
    }
}
