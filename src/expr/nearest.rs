//! The nearest name to a mistyped one.

/// The candidate nearest to the word, if any is near enough to have been meant. Whole names are compared, and the word
/// with the last pieces of a longer name, so that `soke` finds `rate.soak`. The first of equally near ones wins.
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let wanted = word.to_lowercase();
    let mut best: Option<(usize, &str)> = None;
    for candidate in candidates {
        let Some(distance) = closeness(word, &wanted, candidate) else { continue };
        if best.is_none_or(|(d, _)| distance < d) {
            best = Some((distance, candidate));
        }
    }
    best.map(|(_, candidate)| candidate)
}

/// Twice the edit distance, plus one if only the end of the candidate was compared or the case differs; `None` if too far.
fn closeness(word: &str, wanted: &str, candidate: &str) -> Option<usize> {
    let lower = candidate.to_lowercase();
    let length = wanted.chars().count();
    let most = match length {
        0..=3 => 1,
        4..=7 => 2,
        _ => length / 3,
    };
    let ends = {
        let pieces = wanted.matches(['.', ':']).count() + 1;
        lower.char_indices().rev().filter(|&(_, c)| c == '.' || c == ':').nth(pieces - 1).map(|(i, _)| &lower[i + 1..])
    };
    let penalty = |whole: bool| usize::from(!whole || word.to_lowercase() == word && lower != candidate);
    let whole = distance(wanted, &lower);
    let part = ends.map(|e| distance(wanted, e));
    let pick = |d: usize, whole: bool, long: usize| (d <= most && d < long.max(1)).then_some(2 * d + penalty(whole));
    let first = pick(whole, true, length.min(lower.chars().count()));
    let second = part.and_then(|d| pick(d, false, length.min(ends.map_or(0, |e| e.chars().count()))));
    [first, second].into_iter().flatten().min()
}

/// Edit distance with insertions, deletions, substitutions and swaps of neighbours (Damerau 1964, restricted form).
fn distance(a: &str, b: &str) -> usize {
    let a: Vec<char> = a.chars().collect();
    let b: Vec<char> = b.chars().collect();
    let mut before = vec![0; b.len() + 1];
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i; b.len() + 1];
        for j in 1..=b.len() {
            let change = usize::from(a[i - 1] != b[j - 1]);
            row[j] = (last[j] + 1).min(row[j - 1] + 1).min(last[j - 1] + change);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                row[j] = row[j].min(before[j - 2] + 1);
            }
        }
        before = std::mem::replace(&mut last, row);
    }
    last[b.len()]
}

#[cfg(test)]
mod tests {
    use super::{distance, nearest};

    #[test]
    fn distances_by_hand() {
        for (a, b, d) in
            [("soke", "soak", 2), ("", "abc", 3), ("north", "nroth", 1), ("rate", "rate", 0), ("ab", "ba", 1)]
        {
            assert_eq!(distance(a, b), d, "{a} {b}");
            assert_eq!(distance(b, a), d, "{b} {a}");
        }
    }

    #[test]
    fn finds_what_was_meant_and_no_more() {
        let names =
            ["rate.intercept", "rate.soak", "rate.kiln.middle", "rate.kiln.middle:soak", "share.north", "mu", "sd"];
        for (word, found) in [
            ("rate.soke", Some("rate.soak")),
            ("soak", Some("rate.soak")),
            ("soke", Some("rate.soak")),
            ("kiln.middle", Some("rate.kiln.middle")),
            ("rate.kiln.midle", Some("rate.kiln.middle")),
            ("share.nroth", Some("share.north")),
            ("Share.North", Some("share.north")),
            ("mi", Some("mu")),
            ("xq", None),
            ("temperature", None),
            ("", None),
        ] {
            assert_eq!(nearest(word, names), found, "{word}");
        }
        assert_eq!(nearest("x", ["y"]), None, "one letter changed into another is no likeness");
    }
}
