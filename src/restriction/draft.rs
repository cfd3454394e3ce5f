//! Restrictions as they are written, before they are read.

use super::Role;
use crate::expr::Name;

/// A restriction as it stands in the study or on the command line.
#[derive(Debug, Clone, PartialEq)]
pub struct Draft {
    /// Its name without quotes; `None`: the role and a number, such as `tested_1`.
    pub name: Option<String>,
    /// Its role.
    pub role: Role,
    /// The equation: `a = b = c` or `equal(pattern)`.
    pub text: String,
    /// Dotted key of the study (`tested.same_slope`) or the option (`--tested`), for messages.
    pub place: String,
}

impl Draft {
    /// Reads the value of an option, `NAME: EQUATION` or `EQUATION`. The name is one piece, plain or quoted, so that the
    /// colon of `rate.kiln.middle:soak = 0` is not taken for its end.
    pub fn from_option(role: Role, value: &str, option: &str) -> Draft {
        let named = value.match_indices(':').find_map(|(at, _)| {
            let name = Name::parse(value[..at].trim()).ok()?;
            Some((name.as_single()?.to_string(), value[at + 1..].trim().to_string()))
        });
        let (name, text) = match named {
            Some((name, text)) => (Some(name), text),
            None => (None, value.trim().to_string()),
        };
        Draft { name, role, text, place: option.to_string() }
    }
}

/// A name for each draft: its own, or its role and the first number that is free.
pub(super) fn names(drafts: &[&Draft]) -> Vec<String> {
    let taken: Vec<&str> = drafts.iter().filter_map(|d| d.name.as_deref()).collect();
    let mut next = [0; 3];
    let mut fresh = |role: Role| loop {
        let (at, word) = match role {
            Role::Family => (0, "family"),
            Role::Maintained => (1, "maintained"),
            Role::Tested => (2, "tested"),
        };
        next[at] += 1;
        let name = format!("{word}_{}", next[at]);
        if !taken.contains(&name.as_str()) {
            return name;
        }
    };
    drafts.iter().map(|d| d.name.clone().unwrap_or_else(|| fresh(d.role))).collect()
}

#[cfg(test)]
mod tests {
    use super::{Draft, names};
    use crate::restriction::Role;

    #[test]
    fn options_with_and_without_a_name() {
        for (value, name, text) in [
            ("same: a = b", Some("same"), "a = b"),
            ("same : a = b", Some("same"), "a = b"),
            ("same:a.x = b.y", Some("same"), "a.x = b.y"),
            ("a = b", None, "a = b"),
            ("rate.kiln.middle:soak = 0", None, "rate.kiln.middle:soak = 0"),
            ("same: rate.kiln.middle:soak = 0", Some("same"), "rate.kiln.middle:soak = 0"),
            ("'same slope': a = b", Some("same slope"), "a = b"),
            ("'a: b': c = d", Some("a: b"), "c = d"),
            ("equal(rate.*:soak)", None, "equal(rate.*:soak)"),
            (": a = b", None, ": a = b"),
        ] {
            let draft = Draft::from_option(Role::Tested, value, "--tested");
            assert_eq!((draft.name.as_deref(), draft.text.as_str()), (name, text), "{value}");
        }
    }

    #[test]
    fn numbers_are_given_by_role_and_step_over_names_in_use() {
        let draft = |name: Option<&str>, role| Draft {
            name: name.map(str::to_string),
            role,
            text: String::new(),
            place: String::new(),
        };
        let drafts = [
            draft(None, Role::Tested),
            draft(Some("tested_2"), Role::Tested),
            draft(None, Role::Maintained),
            draft(None, Role::Tested),
        ];
        let all: Vec<&Draft> = drafts.iter().collect();
        assert_eq!(names(&all), ["tested_1", "tested_2", "maintained_1", "tested_3"]);
    }
}
