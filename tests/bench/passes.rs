//! One pass over a million rows, beside hand-written loops.

fn main() {}
