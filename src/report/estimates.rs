//! The lines of estimates: parameter, low, value, high, standard error.

use super::Document;
use super::number::short;
use super::words::wrap;
use crate::infer::Estimate;
use crate::solve::End;

/// Names wider than this stand on a line of their own.
const NAME: usize = 44;

pub(super) fn section(document: &Document) -> String {
    let block = &document.outcome.restricted;
    let question = if block.multipliers.is_empty() {
        "What are the estimates?\n"
    } else {
        "What are the estimates, with every restriction imposed?\n"
    };
    let noise = 2.0 * block.fit.certificate.feasibility;
    let mut out = String::from(question);
    out.push_str(&lines("parameter", &block.estimates, noise));
    if !block.quantities.is_empty() {
        out.push('\n');
        out.push_str(&lines("quantity", &block.quantities, noise));
    }
    let confidence = short(100.0 * document.outcome.confidence, 4);
    let explain = match &block.reason {
        Some(reason) => format!("There are no standard errors: {reason}."),
        None => format!("Low and high enclose {confidence} percent, by the standard error."),
    };
    out.push_str(&wrap(&explain, 2, false));
    out
}

fn lines(what: &str, estimates: &[Estimate], noise: f64) -> String {
    let longest = estimates.iter().map(|e| e.name.chars().count()).filter(|&n| n <= NAME).max().unwrap_or(0);
    let name = longest.max(what.len());
    let decimals = shared_decimals(estimates);
    let cells: Vec<[String; 4]> = estimates.iter().map(|e| cells(e, decimals, noise)).collect();
    let width = |column: usize, head: &str| {
        cells.iter().map(|c| c[column].chars().count()).chain([head.len()]).max().unwrap_or(0) + 2
    };
    let heads = ["low", "value", "high", "standard error"];
    let widths: Vec<usize> = (0..4).map(|i| width(i, heads[i])).collect();
    let row = |first: &str, cells: [&str; 4]| {
        let cells = cells.iter().zip(&widths).fold(String::new(), |out, (cell, w)| out + &format!("{cell:>w$}"));
        format!("  {first:<name$}{cells}").trim_end().to_string() + "\n"
    };
    let mut out = row(what, heads);
    for (e, c) in estimates.iter().zip(&cells) {
        let cells = [c[0].as_str(), c[1].as_str(), c[2].as_str(), c[3].as_str()];
        if e.name.chars().count() > name {
            out.push_str(&format!("  {}\n", e.name));
            out.push_str(&row("", cells));
        } else {
            out.push_str(&row(&e.name, cells));
        }
        if let Some(end) = e.edge {
            let end = if end == End::Lower { "lower" } else { "upper" };
            out.push_str(&format!("  {:name$}  on the {end} end of its range and held there\n", ""));
        }
    }
    out
}

/// Decimals that give the smallest standard error three digits; `None` where that would give the largest number of the
/// table more than ten.
fn shared_decimals(estimates: &[Estimate]) -> Option<usize> {
    let ses: Vec<f64> = estimates.iter().filter_map(|e| e.se).filter(|&se| se > 0.0).collect();
    let smallest = ses.iter().copied().fold(f64::INFINITY, f64::min);
    let largest = estimates
        .iter()
        .flat_map(|e| [Some(e.value), e.lower, e.upper])
        .flatten()
        .fold(0.0f64, |most, x| most.max(x.abs()));
    let decimals = three_digits(smallest)?;
    let before_the_point = largest.max(1.0).log10().floor() as usize + 1;
    (decimals + before_the_point <= 10).then_some(decimals)
}

/// Decimals that show three digits of a standard error.
fn three_digits(se: f64) -> Option<usize> {
    let decimals = 2 - se.log10().floor() as i32;
    (se.is_finite() && se > 0.0 && decimals <= 8).then_some(decimals.max(0) as usize)
}

/// The four numbers of one line. `noise` is how exactly the restrictions hold: a fixed value within it is 0.
fn cells(e: &Estimate, decimals: Option<usize>, noise: f64) -> [String; 4] {
    let blank = String::new;
    let fixed = |x: f64| if x.abs() <= noise { "0".to_string() } else { short(x, 6) };
    let (Some(se), Some(low), Some(high)) = (e.se, e.lower, e.upper) else {
        return [blank(), short(e.value, 6), blank(), "none".to_string()];
    };
    if se == 0.0 {
        return [blank(), fixed(e.value), blank(), "0, fixed".to_string()];
    }
    match decimals.or_else(|| three_digits(se).filter(|_| e.value.abs().max(low.abs()).max(high.abs()) < 1e7)) {
        Some(decimals) => {
            let plain = |x: f64| plain(x, decimals);
            [plain(low), plain(e.value), plain(high), plain(se)]
        }
        None => [short(low, 6), short(e.value, 6), short(high, 6), short(se, 3)],
    }
}

/// Fixed decimals, without the sign of a number that rounds to zero.
fn plain(x: f64, decimals: usize) -> String {
    let text = format!("{x:.decimals$}");
    match text.strip_prefix('-') {
        Some(rest) if rest.chars().all(|c| matches!(c, '0' | '.')) => rest.to_string(),
        _ => text,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn line(value: f64, se: f64) -> Estimate {
        let (lower, upper) = (Some(value - 2.0 * se), Some(value + 2.0 * se));
        Estimate { name: "x".into(), value, se: Some(se), lower, upper, edge: None }
    }

    #[test]
    fn lines_share_decimals_where_they_can() {
        assert_eq!(shared_decimals(&[line(0.5, 0.0123), line(12.25, 0.5)]), Some(4));
        assert_eq!(shared_decimals(&[line(1e6, 1e3), line(0.5, 1e-5)]), None);
        assert_eq!(shared_decimals(&[line(0.5, 0.0)]), None);
        assert_eq!(cells(&line(0.5, 0.0123), Some(4), 0.0), ["0.4754", "0.5000", "0.5246", "0.0123"]);
        assert_eq!(cells(&line(3e8, 1e7), None, 0.0), ["2.8e8", "3e8", "3.2e8", "1e7"]);
    }

    #[test]
    fn zeros_are_plain() {
        assert_eq!(cells(&line(-1e-17, 0.5), Some(3), 0.0), ["-1.000", "0.000", "1.000", "0.500"]);
        assert_eq!(cells(&line(-5e-28, 0.0), None, 1e-27)[1], "0");
        assert_eq!(cells(&line(2.0, 0.0), None, 1e-27)[1], "2");
    }
}
