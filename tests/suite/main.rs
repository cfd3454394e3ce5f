//! The integration suite: one binary, a module a subject.
#![allow(clippy::unwrap_used, clippy::print_stdout, clippy::print_stderr)]

#[path = "../generate/tiles.rs"]
mod tiles;

mod harness;

mod bad_input;
mod datasets;
mod equivalence;
mod families;
mod layers;
mod many_rows;
mod nist;
mod nist_nonlinear;
mod own_cases;
mod published;
mod readme;
mod refusals;
mod regression;
mod reports;
mod study;
mod threads;
mod worked_examples;
