//! Tail probabilities, each from a survival function, with logarithms that outlive underflow.

use statrs::distribution::{ChiSquared, ContinuousCDF, Normal};

/// Upper tail of chi-square and its decimal logarithm. A statistic of 0 has p 1, whatever the degrees of freedom.
pub(super) fn chi_square(statistic: f64, df: usize) -> (f64, f64) {
    if statistic <= 0.0 || df == 0 {
        return (1.0, 0.0);
    }
    if statistic.is_infinite() {
        return (0.0, f64::NEG_INFINITY);
    }
    let p = ChiSquared::new(df as f64).map_or(f64::NAN, |d| d.sf(statistic));
    // Near the smallest doubles sf loses digits before it vanishes; the logarithm is then taken by itself.
    let log10 =
        if p > 1e-280 { p.log10() } else { log_upper(df as f64 / 2.0, statistic / 2.0) / std::f64::consts::LN_10 };
    (p, log10)
}

/// log of the regularised upper incomplete gamma function, x well above a: continued fraction by the modified Lentz
/// recursion (Thompson and Barnett 1986).
fn log_upper(a: f64, x: f64) -> f64 {
    let tiny = 1e-300;
    let mut b = x + 1.0 - a;
    let mut c = 1.0 / tiny;
    let mut d = 1.0 / b;
    let mut h = d;
    for i in 1..10_000 {
        let i = f64::from(i);
        let an = -i * (i - a);
        b += 2.0;
        d = an * d + b;
        d = 1.0 / if d.abs() < tiny { tiny } else { d };
        c = b + an / c;
        c = if c.abs() < tiny { tiny } else { c };
        let step = c * d;
        h *= step;
        if (step - 1.0).abs() < 1e-16 {
            break;
        }
    }
    -x + a * x.ln() - libm::lgamma(a) + h.ln()
}

/// Both tails of the standard normal beyond |z|.
pub(super) fn two_sided(z: f64) -> f64 {
    libm::erfc(z.abs() / std::f64::consts::SQRT_2)
}

/// The standard normal quantile of an interval that holds `confidence`.
pub(super) fn quantile(confidence: f64) -> f64 {
    // From the small tail, which keeps its digits when the confidence is close to 1.
    -Normal::standard().inverse_cdf((1.0 - confidence) / 2.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn usual_tails() {
        // chi-square 1: 3.841458820694124 is the square of the normal 0.975 quantile, 1.959963984540054 (NIST/SEMATECH
        // handbook, tables 1.3.6.7.1 and 1.3.6.7.4, to their printed digits; the further digits from memory).
        let (p, log) = chi_square(3.841458820694124, 1);
        assert!((p - 0.05).abs() < 1e-13, "{p}");
        assert!((log - 0.05f64.log10()).abs() < 1e-12);
        assert!((quantile(0.95) - 1.959963984540054).abs() < 1e-13);
        assert!((two_sided(-1.959963984540054) - 0.05).abs() < 1e-15);
        assert_eq!(chi_square(0.0, 2), (1.0, 0.0));
    }

    #[test]
    fn two_degrees_are_exponential_however_far_out() {
        // With df 2 the upper tail is exp(-x/2) exactly, also where it underflows.
        for x in [1.0, 30.0, 600.0, 1290.0, 1400.0, 3000.0, 1e5] {
            let (_, log) = chi_square(x, 2);
            let exact = -x / 2.0 / std::f64::consts::LN_10;
            assert!((log - exact).abs() < 1e-13 * exact.abs(), "x {x}: {log} not {exact}");
        }
    }

    #[test]
    fn logarithm_is_continuous_where_the_route_changes() {
        // Ratio of survival functions against the log route on both sides of 1e-280.
        for df in [1usize, 3, 17, 120] {
            let a = df as f64 / 2.0;
            for x in [1200.0, 1250.0] {
                let p = ChiSquared::new(df as f64).unwrap().sf(x);
                // sf is good to 1e-13 (measured against 40 digits); in the logarithm that is absolute.
                assert!((log_upper(a, x / 2.0) - p.ln()).abs() < 1e-10, "df {df}, x {x}");
            }
        }
    }
}
