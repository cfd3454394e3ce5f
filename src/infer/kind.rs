//! The kinds of information by name.

use crate::likelihood::Information;

impl Information {
    /// All kinds, in the order they are offered.
    pub const ALL: [Information; 4] =
        [Information::Expected, Information::Observed, Information::Outer, Information::Robust];

    /// The word of the command line.
    pub fn text(self) -> &'static str {
        match self {
            Information::Expected => "expected",
            Information::Observed => "observed",
            Information::Outer => "outer",
            Information::Robust => "robust",
        }
    }

    /// The kind of this word.
    pub fn named(word: &str) -> Option<Information> {
        Information::ALL.into_iter().find(|kind| kind.text() == word)
    }

    /// Whether it rests on minus the Hessian.
    pub fn uses_hessian(self) -> bool {
        matches!(self, Information::Observed | Information::Robust)
    }
}
