//! The result as text: answers to questions, in the order in which a reader has them.

use super::estimates;
use super::number::{count, probability, short, tiny, trimmed};
use super::words::{how_often, list, sentence, stance, wrap};
use super::{CAUTION, Document, failure};
use crate::infer::{Block, Information, Multiplier, Outcome, Role, Test};
use crate::solve::Verdict;

/// Warnings about tests that are missing; the answer on the tests says them.
const MISSING: [&str; 2] = ["test-not-available", "unrestricted-failed"];

/// The whole text.
pub fn render(document: &Document) -> String {
    let block = &document.outcome.restricted;
    let mut out = Vec::new();
    out.push(fitted(document));
    if block.fit.certificate.verdict == Verdict::StrictMaximum {
        out.push(estimates::section(document));
        out.push(restrictions(block));
        out.push(tests(&document.outcome));
        out.push(certificate(block));
    } else {
        out.push(failure::section(document));
    }
    out.push(cautions(&document.outcome));
    out.retain(|part| !part.is_empty());
    out.join("\n")
}

fn fitted(document: &Document) -> String {
    let Document { group, data, model, outcome } = document;
    let mut out = String::new();
    if !model.title.is_empty() {
        out.push_str(&wrap(&model.title, 0, false));
    }
    if let Some(pairs) = group {
        let pairs: Vec<String> = pairs.iter().map(|(column, label)| format!("{column} {label}")).collect();
        out.push_str(&wrap(&format!("group: {}", pairs.join(", ")), 0, true));
    }
    if !out.is_empty() {
        out.push('\n');
    }
    out.push_str("What was fitted?\n");
    out.push_str(&wrap(&format!("{}.", model.sentence), 2, true));
    let source = match data.file.as_deref() {
        None => "There are no data".to_string(),
        Some("-") => format!("{} from standard input", count(data.rows_used, "row")),
        Some(file) => format!("{} of {file}", count(data.rows_used, "row")),
    };
    let weight = if data.weight_total == data.rows_used as f64 || data.file.is_none() {
        String::new()
    } else {
        format!(", total weight {}", trimmed(data.weight_total, 9))
    };
    let dropped = if data.rows_dropped > 0 {
        format!(" ({} read, {} left out)", data.rows_read, data.rows_dropped)
    } else {
        String::new()
    };
    let (tested, held) = {
        let all = &outcome.restricted.multipliers;
        let tested = all.iter().filter(|m| m.role == Role::Tested).count();
        (tested, all.len() - tested)
    };
    let imposed = match (held, tested) {
        (0, 0) => "no restrictions".to_string(),
        (0, t) => format!("{} put to the test", count(t, "restriction")),
        (h, 0) => format!("{} always imposed, none put to the test", count(h, "restriction")),
        (h, t) => format!("{} always imposed and {t} put to the test", count(h, "restriction")),
    };
    let parameters = count(model.parameters.len(), "parameter");
    out.push_str(&wrap(&format!("{source}{weight}{dropped}; {parameters}, {imposed}."), 2, false));
    out
}

fn restrictions(block: &Block) -> String {
    let mut out = String::new();
    let tested: Vec<&Multiplier> = block.multipliers.iter().filter(|m| m.role == Role::Tested).collect();
    let held: Vec<&Multiplier> = block.multipliers.iter().filter(|m| m.role != Role::Tested).collect();
    if !tested.is_empty() {
        out.push_str("How hard do the data pull at each tested restriction?\n");
        let explain = "A pull is the slope of the log-likelihood in the right-hand side: raise that by a small d, and the \
                       log-likelihood rises by about d times the pull.";
        out.push_str(&wrap(explain, 2, false));
        let alone = tested.len() == 1;
        for m in tested {
            out.push_str(&wrap(&format!("{}: {}", m.name, m.equation), 2, true));
            out.push_str(&pull(m, alone));
        }
    }
    if !held.is_empty() {
        if !out.is_empty() {
            out.push('\n');
        }
        out.push_str("Which restrictions are always imposed?\n");
        for m in held {
            out.push_str(&wrap(&format!("{}: {}", m.name, m.equation), 2, true));
            let by = if m.role == Role::Family { "brought by the family" } else { "maintained" };
            let line = match m.value {
                Some(value) => format!("pull {}, {by}, not tested", short(value, 4)),
                None => format!("{by}; {}", m.reason.as_deref().unwrap_or("its pull is not known")),
            };
            out.push_str(&wrap(&line, 4, true));
        }
    }
    out
}

/// The two lines under a tested restriction, which may be the only one.
fn pull(m: &Multiplier, alone: bool) -> String {
    let Some(value) = m.value else {
        let reason = m.reason.as_deref().unwrap_or("its pull is not known");
        return wrap(&format!("no pull: {reason}"), 4, true);
    };
    let first = match (m.se, m.z, m.p) {
        (Some(se), Some(z), Some(p)) => format!(
            "pull {}, standard error {}, {} times it, p {}",
            short(value, 4),
            short(se, 4),
            short(z.abs(), 2),
            probability(p, p.log10())
        ),
        _ => {
            let reason = m.reason.as_deref().unwrap_or("not available");
            format!("pull {}, without a standard error: {reason}", short(value, 4))
        }
    };
    let side = if value > 0.0 { "larger" } else { "smaller" };
    let weak = m.z.is_some_and(|z| z.abs() < 1.0);
    let mut second = match value {
        0.0 => "the data pull neither way".to_string(),
        _ if weak => format!("the data want the left side {side}, by less than the pull's own standard error"),
        _ => format!("the data want the left side {side}"),
    };
    if let Some(gap) = m.gap {
        let free = if alone { "let go" } else { "with every tested restriction let go" };
        let size = short(gap.abs(), 4);
        second.push_str(&match gap {
            g if g > 0.0 => format!("; {free}, it would be {size} above the right side"),
            g if g < 0.0 => format!("; {free}, it would be {size} below the right side"),
            _ => format!("; {free}, both sides would be equal"),
        });
    }
    wrap(&first, 4, true) + &wrap(&second, 4, true)
}

fn tests(outcome: &Outcome) -> String {
    if outcome.restricted.multipliers.iter().all(|m| m.role != Role::Tested) {
        return String::new();
    }
    let mut out = String::from("Do the data accept the tested restrictions?\n");
    let all = [("score test", &outcome.score), ("likelihood ratio", &outcome.lr), ("Wald test", &outcome.wald)];
    if let Some((name, test)) = all.iter().find_map(|(name, test)| test.as_ref().ok().map(|t| (name, t))) {
        let often = how_often(test.p);
        let sentence = format!(
            "{} Were they true, data this far from them or farther would come up {often} (by the {name}).",
            stance(test.p)
        );
        out.push_str(&wrap(&sentence, 2, false));
    }
    let mut missing: Vec<(Vec<&str>, &str)> = Vec::new();
    for (name, test) in all {
        match test {
            Ok(test) => out.push_str(&wrap(&format!("{name}: {}", statistic(test)), 2, true)),
            Err(reason) => match missing.iter_mut().find(|(_, same)| same == reason) {
                Some((names, _)) => names.push(name),
                None => missing.push((vec![name], reason)),
            },
        }
    }
    for (names, reason) in missing {
        let code = code_of(outcome, reason).map_or_else(String::new, |code| format!(" ({code})"));
        out.push_str(&wrap(&format!("no {}: {reason}{code}", list(&names, 3)), 2, true));
    }
    let kind = match outcome.information {
        Information::Expected => "expected information (averaged over what might have been observed)",
        Information::Observed => "observed information (the curvature of this very likelihood)",
        Information::Outer => "outer-product information (the spread of the rows' slopes)",
        Information::Robust => "the robust form (which does not rely on the family being right)",
    };
    out.push_str(&wrap(&format!("Standard errors, score and Wald tests use {kind}."), 2, false));
    out
}

/// The code of the warning that gives this reason for a missing test.
fn code_of(outcome: &Outcome, reason: &str) -> Option<&'static str> {
    outcome.warnings.iter().find(|w| MISSING.contains(&w.code) && w.message.contains(reason)).map(|w| w.code)
}

fn statistic(test: &Test) -> String {
    format!(
        "chi-square {} on {}, p {}",
        short(test.chi_square, 4),
        if test.df == 1 { "1 degree of freedom".into() } else { format!("{} degrees of freedom", test.df) },
        probability(test.p, test.log10_p)
    )
}

fn certificate(block: &Block) -> String {
    let c = &block.fit.certificate;
    let mut out = String::from("Can this answer be believed?\n");
    let mut say = vec!["It is a strict local maximum of the likelihood under the restrictions.".to_string()];
    say.push(format!("The log-likelihood is {}.", short(block.fit.log_likelihood, 8)));
    if c.restrictions > 0 {
        let rank = if c.rank == c.restrictions {
            if c.rank == 1 { "it is regular there".to_string() } else { "they are independent there".to_string() }
        } else {
            format!("{} of the {} are independent there", c.rank, c.restrictions)
        };
        let condition = c.condition.map_or_else(String::new, |k| format!(" (condition {})", short(k, 2)));
        let one = c.restrictions == 1;
        say.push(format!(
            "{} {} and {rank}{condition}.",
            if one { "The restriction holds" } else { "The restrictions hold" },
            if c.feasibility == 0.0 { "exactly".to_string() } else { format!("to {}", tiny(c.feasibility)) }
        ));
    }
    say.push(format!("What slope is left is {} on the scale of standard errors.", tiny(c.stationarity)));
    say.push(match (c.curvature_min, c.curvature_max) {
        (Some(low), Some(high)) if short(low, 2) == short(high, 2) => {
            format!("The likelihood falls off in every free direction (scaled curvature {}).", short(low, 2))
        }
        (Some(low), Some(high)) => format!(
            "The likelihood falls off in every free direction (scaled curvature {} to {}).",
            short(low, 2),
            short(high, 2)
        ),
        _ => "The restrictions leave no direction free, so there is nothing to fall off in.".to_string(),
    });
    say.push(format!("Exact and difference derivatives agree to {}.", tiny(c.derivatives)));
    say.push(match c.starts {
        1 => "One start was made.".to_string(),
        starts => format!("Of {starts} starts, {} reached the best value.", c.starts_at_best),
    });
    if c.maxima.len() > 1 {
        let others: Vec<String> = c.maxima[1..].iter().map(|&x| short(x, 8)).collect();
        let others: Vec<&str> = others.iter().map(String::as_str).collect();
        say.push(format!("Other maxima were met, with log-likelihood {}.", list(&others, 4)));
    }
    match c.second_opinion {
        Some(true) => say.push("A different method from a different start found the same optimum.".to_string()),
        Some(false) => say.push("A different method from a different start did NOT find the same optimum.".to_string()),
        None => {}
    }
    out.push_str(&wrap(&say.join(" "), 2, false));
    for note in &c.notes {
        out.push_str(&wrap(&sentence(note), 2, true));
    }
    out
}

fn cautions(outcome: &Outcome) -> String {
    let mut out = String::from("What should be kept in mind?\n");
    for warning in outcome.warnings.iter().filter(|w| !MISSING.contains(&w.code)) {
        out.push_str(&wrap(&format!("{} ({})", sentence(&warning.message), warning.code), 2, true));
    }
    out.push_str(&wrap(CAUTION, 2, false));
    out
}

#[cfg(test)]
mod tests {
    use super::super::{sample, words};
    use super::*;

    #[test]
    fn fits_the_page_whatever_the_names() {
        let long: Vec<String> =
            (0..60).map(|i| format!("{}.level_{i}", "strength.'a rather long name' ".repeat(i % 3 + 1))).collect();
        let long: Vec<&str> = long.iter().map(String::as_str).collect();
        for document in [sample::good(&["a", "b"]), sample::good(&long), sample::failed()] {
            let text = render(&document);
            for line in text.lines() {
                // A name alone on its line may be as long as its author made it.
                let is_name = long.iter().any(|n| n.trim() == line.trim());
                assert!(line.chars().count() <= words::WIDTH || is_name, "{line}");
                assert_eq!(line, line.trim_end());
            }
            for name in &document.model.parameters {
                assert!(text.contains(&name.name));
            }
        }
    }

    #[test]
    fn a_failed_fit_prints_no_estimate() {
        let text = render(&sample::failed());
        assert!(text.contains("not an estimate"));
        assert!(text.contains("What can be done?"));
        for never in ["standard error 13", "chi-square 9", "Low and high"] {
            assert!(!text.contains(never), "{never}");
        }
    }

    #[test]
    fn a_good_fit_reads_as_intended() {
        let text = render(&sample::good(&["rate.north", "rate.middle", "rate.south"]));
        if std::env::var_os("SHOW").is_some() {
            panic!("{text}\n{}", render(&sample::failed()));
        }
        for wanted in [
            "pull -41.23, standard error 13.07, 3.2 times it, p 0.0016\n",
            "the data want the left side smaller",
            "240 rows of flaws.csv, total weight 1152.5 (243 read, 3 left out); 3 parameters, 1 restriction always imposed",
            "on the lower end of its range",
            "score test: chi-square 9.950 on 1 degree of freedom, p 0.0016",
            CAUTION.split(';').next().unwrap(),
        ] {
            assert!(text.replace("\n  ", " ").contains(wanted) || text.contains(wanted), "{wanted}\n{text}");
        }
    }
}
