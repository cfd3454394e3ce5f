//! Numbers as a reader wants them: few digits in text, all digits for machines.

/// About `digits` significant digits, plain between 1e-4 and 1e7, else with an exponent; whole numbers stay whole.
pub fn short(x: f64, digits: usize) -> String {
    if !x.is_finite() {
        return if x.is_nan() {
            "undefined".into()
        } else if x > 0.0 {
            "infinity".into()
        } else {
            "-infinity".into()
        };
    }
    if x == 0.0 {
        return "0".into();
    }
    // Let the exponential form do the rounding, so that 9.9996 becomes 10.00 with an honest exponent.
    let scientific = format!("{:.*e}", digits.saturating_sub(1), x);
    let (mantissa, exponent) = scientific.split_once('e').unwrap_or((&scientific, "0"));
    let exponent: i32 = exponent.parse().unwrap_or(0);
    if (-4..7).contains(&exponent) {
        let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
        let text = format!("{x:.decimals$}");
        if x.fract() == 0.0 { format!("{x:.0}") } else { text }
    } else {
        let mantissa =
            if mantissa.contains('.') { mantissa.trim_end_matches('0').trim_end_matches('.') } else { mantissa };
        format!("{mantissa}e{exponent}")
    }
}

/// As [`short`], without the zeros at the end of a decimal fraction: for values that were given, not computed.
pub fn trimmed(x: f64, digits: usize) -> String {
    let text = short(x, digits);
    if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.').to_string()
    } else {
        text
    }
}

/// A probability: two significant digits, three decimals close to 1, an exponent below 1e-4; where it underflows, from
/// its decimal logarithm.
pub fn probability(p: f64, log10: f64) -> String {
    if !p.is_finite() {
        return "undefined".into();
    }
    if p >= 0.995 {
        return if p > 0.9995 { "1.000".into() } else { format!("{p:.3}") };
    }
    if p >= 1e-4 {
        return short(p, 2);
    }
    if p > 1e-300 {
        return format!("{p:.1e}");
    }
    if log10.is_finite() {
        let exponent = log10.floor();
        let mantissa = 10f64.powf(log10 - exponent);
        return if mantissa >= 9.95 {
            format!("1.0e{:.0}", exponent + 1.0)
        } else {
            format!("{mantissa:.1}e{exponent:.0}")
        };
    }
    "0".into()
}

/// `2.0e-9` as `2e-9`.
fn tidy(text: &str) -> String {
    text.replace(".0e", "e")
}

/// A figure of the certificate: one or two digits and an exponent.
pub fn tiny(x: f64) -> String {
    if x == 0.0 {
        "0".into()
    } else if x.is_finite() {
        tidy(&format!("{x:.1e}"))
    } else {
        "not finite".into()
    }
}

/// A count with its noun: `1 row`, `3 rows`.
pub fn count(n: usize, noun: &str) -> String {
    format!("{n} {noun}{}", if n == 1 { "" } else { "s" })
}

/// Every digit a double needs to be read back, as JSON writes it; nothing for what is not finite.
pub fn exact(x: f64) -> String {
    serde_json::Number::from_f64(x).map_or_else(String::new, |n| n.to_string())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reads_well() {
        let cases = [
            (0.0, "0"),
            (12.0, "12"),
            (-41.2345, "-41.23"),
            (0.00123456, "0.001235"),
            (9.99996, "10.00"),
            (123456.7, "123457"),
            (1.5e-7, "1.5e-7"),
            (-2.34567e12, "-2.346e12"),
            (f64::NAN, "undefined"),
        ];
        for (x, text) in cases {
            assert_eq!(short(x, 4), text);
        }
    }

    #[test]
    fn given_values_lose_their_zeros() {
        for (x, text) in [(1152.5, "1152.5"), (1200.0, "1200"), (0.25, "0.25"), (1.5e-9, "1.5e-9")] {
            assert_eq!(trimmed(x, 7), text);
        }
    }

    #[test]
    fn probabilities_read_well() {
        let cases = [
            (1.0, 0.0, "1.000"),
            (0.9962, -0.0017, "0.996"),
            (0.38412, 0.0, "0.38"),
            (0.05382, 0.0, "0.054"),
            (0.0017321, 0.0, "0.0017"),
            (3.21e-9, 0.0, "3.2e-9"),
            (2.0e-9, 0.0, "2.0e-9"),
            (0.0, -411.5, "3.2e-412"),
            (0.0, f64::NEG_INFINITY, "0"),
        ];
        for (p, log, text) in cases {
            assert_eq!(probability(p, log), text);
        }
    }

    #[test]
    fn exact_digits_come_back() {
        for x in [0.1, 1e-300, -2.5e17, 1.0 / 3.0, f64::MIN_POSITIVE] {
            assert_eq!(exact(x).parse::<f64>().unwrap(), x);
        }
        assert_eq!(exact(f64::INFINITY), "");
    }
}
