//! The map from dotted key places (`tested.same_slope`, `model.rate.curve`) to the bytes they came from.

use std::collections::BTreeMap;

use super::source::{At, Shown, Sources, encoded};
use crate::expr::Span;

/// Where each key's value stands. Places are the key's pieces joined by dots, without quotes; members of a list are
/// counted from 0.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Places {
    /// The texts.
    pub sources: Sources,
    map: BTreeMap<String, At>,
}

impl Places {
    /// Places in these sources, none known yet.
    pub fn new(sources: Sources) -> Self {
        Places { sources, map: BTreeMap::new() }
    }

    /// Notes where the value of a key stands.
    pub fn note(&mut self, place: impl Into<String>, at: At) {
        self.map.insert(place.into(), at);
    }

    /// The value of this key, or of the nearest table above it.
    pub fn find(&self, place: &str) -> Option<At> {
        let mut rest = place;
        loop {
            if let Some(at) = self.map.get(rest) {
                return Some(*at);
            }
            rest = &rest[..rest.rfind('.')?];
        }
    }

    /// A message at a span of the (decoded) text that stands at a place; without a span at the whole value.
    pub fn show(&self, place: &str, span: Option<Span>, message: &str, advice: Option<&str>) -> Shown {
        let exact = self.map.get(place).copied();
        let at = match (exact, span) {
            (Some(at), Some(span)) => Some(self.within(at, span)),
            _ => self.find(place),
        };
        let shown = self.sources.show(at, message, advice);
        if at.is_none() && !place.is_empty() { Shown { place: place.to_owned(), ..shown } } else { shown }
    }

    fn within(&self, at: At, span: Span) -> At {
        let Some(raw) = self.sources.get(at.source).and_then(|s| s.text.get(at.start..at.end)) else { return at };
        let (start, end) =
            if at.quoted { (encoded(raw, span.start), encoded(raw, span.end)) } else { (span.start, span.end) };
        At { start: (at.start + start).min(at.end), end: (at.start + end).min(at.end), ..at }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::study::source::Source;

    #[test]
    fn a_span_of_the_decoded_text_is_shown_in_the_file() {
        let text = "[tested]\nb = \"x\\t= y\"\n";
        let mut sources = Sources::default();
        sources.push(Source { name: "s.toml".into(), text: text.into(), numbered: true, ..Source::default() });
        let mut places = Places::new(sources);
        places.note("tested.b", At { source: 0, start: 13, end: 21, quoted: true });
        let shown = places.show("tested.b", Some(Span { start: 4, end: 5 }), "m", None);
        assert_eq!(shown.to_string(), "s.toml, line 2: m\n    b = \"x\\t= y\"\n              ^");
        assert_eq!(places.show("tested.b.c", None, "m", None).place, "s.toml, line 2");
        assert_eq!(places.show("model.c", None, "m", None).to_string(), "model.c: m");
    }
}
