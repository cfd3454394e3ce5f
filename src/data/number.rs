//! Numbers from bytes: a fast exact path for short ones, the standard parser for the rest, and an account of what is
//! wrong with a text that is none.

use super::error::Advice;

/// Powers of ten that doubles hold exactly.
const POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20,
    1e21, 1e22,
];

/// Without spaces round it: ASCII only, which is all a number may hold.
pub(super) fn trim(cell: &[u8]) -> &[u8] {
    match cell {
        // Most cells have no spaces; one look at each end settles it.
        [first, .., last] if *first > b' ' && *last > b' ' => cell,
        _ => cell.trim_ascii(),
    }
}

/// The double nearest to a decimal number `[+-]digits[.digits][e[+-]digits]`; `None` when the text is anything else
/// (`nan` and `inf` included) or too large for a double.
///
/// With at most 2^53 for the digits and at most 22 for the power of ten both factors are exact doubles, so one
/// multiplication or division rounds correctly; everything else goes to the standard parser.
pub(super) fn parse(cell: &[u8], decimal: u8) -> Option<f64> {
    let (negative, mut at) = match cell.first()? {
        b'-' => (true, 1),
        b'+' => (false, 1),
        _ => (false, 0),
    };
    let mut digits: u64 = 0;
    let mut run = |at: &mut usize| {
        let first = *at;
        while *at < cell.len() {
            let d = cell[*at].wrapping_sub(b'0');
            if d > 9 {
                break;
            }
            digits = digits.wrapping_mul(10).wrapping_add(u64::from(d));
            *at += 1;
        }
        *at - first
    };
    let mut seen = run(&mut at);
    let mut power: i64 = 0;
    if cell.get(at) == Some(&decimal) {
        at += 1;
        let places = run(&mut at);
        power = -(places as i64);
        seen += places;
    }
    if seen == 0 {
        return None;
    }
    if let Some(b'e' | b'E') = cell.get(at) {
        at += 1;
        let down = match cell.get(at) {
            Some(b'-') => {
                at += 1;
                true
            }
            Some(b'+') => {
                at += 1;
                false
            }
            _ => false,
        };
        let begin = at;
        let mut exponent: i64 = 0;
        while let Some(d) = digit(cell, at) {
            exponent = (exponent * 10 + d as i64).min(1_000_000);
            at += 1;
        }
        if at == begin {
            return None;
        }
        power += if down { -exponent } else { exponent };
    }
    if at != cell.len() {
        return None;
    }
    // 19 digits cannot overflow 64 bits, so up to there `digits` is what was written.
    if seen <= 19 && digits <= 1 << 53 && (-22..=22).contains(&power) {
        let scale = POWERS[power.unsigned_abs() as usize];
        let size = if power < 0 { digits as f64 / scale } else { digits as f64 * scale };
        return Some(if negative { -size } else { size });
    }
    standard(cell, decimal).filter(|x| x.is_finite())
}

fn digit(cell: &[u8], at: usize) -> Option<u64> {
    cell.get(at).map(|b| b.wrapping_sub(b'0')).filter(|d| *d < 10).map(u64::from)
}

/// The standard parser on a text whose shape was checked.
fn standard(cell: &[u8], decimal: u8) -> Option<f64> {
    let text = std::str::from_utf8(cell).ok()?;
    if decimal == b'.' { text.parse().ok() } else { text.replacen(char::from(decimal), ".", 1).parse().ok() }
}

/// `inf`, `+inf`, `-inf`, `infinity` in any case: an open end of an interval.
pub(super) fn infinite(cell: &[u8]) -> Option<f64> {
    let (sign, word) = match cell {
        [b'-', rest @ ..] => (f64::NEG_INFINITY, rest),
        [b'+', rest @ ..] => (f64::INFINITY, rest),
        _ => (f64::INFINITY, cell),
    };
    (word.eq_ignore_ascii_case(b"inf") || word.eq_ignore_ascii_case(b"infinity")).then_some(sign)
}

/// What was expected in place of a text that is no number, and what to do about it.
pub(super) fn explain(cell: &[u8], decimal: u8) -> (String, Option<Advice>) {
    let point = char::from(decimal);
    let Ok(text) = std::str::from_utf8(cell) else {
        return ("a number (these bytes are not UTF-8)".into(), Some(Advice::Encoding));
    };
    let lower = text.to_ascii_lowercase();
    if cell.is_empty() {
        return ("a number, not an empty cell".into(), Some(Advice::Mark));
    }
    if infinite(cell).is_some() {
        return ("a finite number".into(), Some(Advice::Finite));
    }
    if ["na", "n/a", "nan", "null", "none", "nil", "missing", "-", "--", ".", "?", "#n/a", "*"]
        .contains(&lower.as_str())
    {
        return ("a number".into(), Some(Advice::Mark));
    }
    if is_number_text(cell, decimal) {
        return ("a number: this one is too large for a double".into(), Some(Advice::TooLarge));
    }
    if text.starts_with(['\u{2212}', '\u{2013}', '\u{2014}']) {
        return ("a number with the plain minus sign -".into(), None);
    }
    let other = if decimal == b',' { '.' } else { ',' };
    let spaces = [' ', '\'', '_', '\u{a0}', '\u{202f}', '\u{2009}', '\u{2019}', other];
    if let Some(plain) = without_thousands(text, &spaces, point) {
        let mut expected = format!("a number without thousands separators, {}", super::error::clip(&plain));
        if text.matches(other).count() == 1 && !text.contains(point) {
            expected.push_str(&format!(" (or is {other} the decimal sign?)"));
            return (expected, Some(Advice::Decimal(other)));
        }
        return (expected, Some(Advice::Thousands));
    }
    if is_number_text(text.replacen(other, ".", 1).as_bytes(), b'.') {
        return (format!("a number with the decimal sign {point}"), Some(Advice::Decimal(other)));
    }
    ("a number".into(), None)
}

/// Whether the text has the shape of a number, whatever its size.
fn is_number_text(cell: &[u8], decimal: u8) -> bool {
    cell.iter().all(|b| b.is_ascii_digit() || *b == decimal || b"+-eE".contains(b))
        && standard(cell, decimal).is_some_and(|x| !x.is_nan())
}

/// `1,234,567.8` without its separators: groups of three after a first of one to three.
fn without_thousands(text: &str, separators: &[char], point: char) -> Option<String> {
    let separator = text.chars().find(|c| separators.contains(c))?;
    let whole = text.split(point).next()?.trim_start_matches(['+', '-']);
    let mut groups = whole.split(separator);
    let first = groups.next()?;
    let grouped = (1..=3).contains(&first.len())
        && first.bytes().all(|b| b.is_ascii_digit())
        && groups.all(|g| g.len() == 3 && g.bytes().all(|b| b.is_ascii_digit()));
    let plain: String = text.chars().filter(|c| *c != separator).collect();
    (grouped && is_number_text(plain.as_bytes(), point as u8)).then_some(plain)
}

#[cfg(test)]
mod tests {
    use super::{explain, infinite, parse, trim};
    use proptest::prelude::{any, prop_assert_eq, proptest};

    #[test]
    fn reads_what_numbers_may_look_like() {
        for (text, value) in [
            ("0", 0.0),
            ("-0.5", -0.5),
            ("+3", 3.0),
            (".5", 0.5),
            ("5.", 5.0),
            ("1e3", 1000.0),
            ("1E-3", 0.001),
            ("00012", 12.0),
            ("9007199254740993", 9007199254740992.0),
            ("123456789012345678901234567890", 123456789012345678901234567890.0),
            ("0.1", 0.1),
            ("1.7976931348623157e308", f64::MAX),
            ("5e-324", 5e-324),
            ("1e-400", 0.0),
        ] {
            assert_eq!(parse(text.as_bytes(), b'.'), Some(value), "{text}");
        }
        assert!(parse(b"-0", b'.').unwrap().is_sign_negative());
        assert_eq!(parse(b"1,5", b','), Some(1.5));
        assert_eq!(parse(b"12345678901234567,25", b','), Some(12345678901234567.25));
    }

    #[test]
    fn refuses_what_is_no_number() {
        for text in [
            "",
            "-",
            "+",
            ".",
            "e5",
            "1e",
            "1e+",
            "nan",
            "NaN",
            "inf",
            "-inf",
            "infinity",
            "1e400",
            "-1e309",
            "0x10",
            "1_000",
            "1,5",
            "1.2.3",
            "--1",
            "1 2",
            "abc",
            "1f",
            "1e5.5",
            "\u{2212}5",
        ] {
            assert_eq!(parse(text.as_bytes(), b'.'), None, "{text}");
        }
        assert_eq!(parse(b"1.5", b','), None);
    }

    #[test]
    fn open_ends() {
        assert_eq!(infinite(b"inf"), Some(f64::INFINITY));
        assert_eq!(infinite(b"-Infinity"), Some(f64::NEG_INFINITY));
        assert_eq!(infinite(b"+INF"), Some(f64::INFINITY));
        assert_eq!(infinite(b"info"), None);
    }

    #[test]
    fn says_what_is_wrong() {
        for (text, decimal, part) in [
            ("1,234.5", b'.', "without thousands separators, 1234.5"),
            ("1.234.567,5", b',', "without thousands separators, 1234567,5"),
            ("1 234", b'.', "without thousands separators, 1234"),
            ("1'234'567", b'.', "without thousands separators, 1234567"),
            ("1,234", b'.', "is , the decimal sign?"),
            ("1,5", b'.', "with the decimal sign ."),
            ("1.5", b',', "with the decimal sign ,"),
            ("1e400", b'.', "too large for a double"),
            ("inf", b'.', "finite"),
            ("\u{2212}5", b'.', "plain minus sign"),
            ("twelve", b'.', "a number"),
            ("", b'.', "not an empty cell"),
        ] {
            let (expected, _) = explain(text.as_bytes(), decimal);
            assert!(expected.contains(part), "{text}: {expected}");
        }
        assert!(explain(&[0xff], b'.').0.contains("UTF-8"));
    }

    proptest! {
        #[test]
        fn agrees_with_the_standard_parser(x in any::<f64>(), places in 0usize..20) {
            if x.is_finite() {
                for text in [format!("{x}"), format!("{x:e}"), format!("{x:.places$}"), format!("{x:.places$e}")] {
                    prop_assert_eq!(parse(text.as_bytes(), b'.').map(f64::to_bits), text.parse::<f64>().ok().map(f64::to_bits));
                }
            }
        }

        #[test]
        fn short_decimals_agree_with_the_standard_parser(digits in any::<u32>(), places in 0usize..9) {
            let text = format!("{:.places$}", f64::from(digits) / 10f64.powi(places as i32));
            prop_assert_eq!(parse(text.as_bytes(), b'.'), text.parse::<f64>().ok());
        }

        #[test]
        fn any_text_is_judged_without_panic(text in ".{0,12}") {
            let cell = trim(text.as_bytes());
            if parse(cell, b'.').is_none() {
                prop_assert_eq!(explain(cell, b'.').0.is_empty(), false);
            }
        }
    }
}
