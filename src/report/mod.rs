//! One result, rendered as text, JSON and CSV.
