//! Names of things: pieces joined by dots (or colons, for products of terms), written plain or quoted.

/// How a piece is joined to the one before it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Joiner {
    /// `.` (also that of the first piece)
    Dot,
    /// `:`, joining the factors of a product of terms
    Colon,
}

/// One piece of a name.
#[derive(Debug, Clone, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Piece {
    /// How it is joined to the piece before.
    pub joiner: Joiner,
    /// The text without quotes; `None` is the wildcard `*`.
    pub text: Option<String>,
}

/// A name such as `rate.kiln.middle:soak` or `share.'2'`, or a pattern such as `share.*`.
#[derive(Debug, Clone, PartialEq, Eq, Hash, PartialOrd, Ord, Default)]
pub struct Name {
    /// The pieces in order; at least one.
    pub pieces: Vec<Piece>,
}
