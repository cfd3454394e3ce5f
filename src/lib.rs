//! Constrained maximum likelihood: a likelihood and data are maximised under equality restrictions through the
//! Lagrangian; the answer comes with multipliers, tests and a certificate.
//!
//! Floors, from the ground up: [`math`], [`expr`], [`data`], [`family`], [`likelihood`], [`restriction`], [`solve`],
//! [`infer`], [`study`], [`report`], [`cli`]. A floor imports only floors below it.
#![cfg_attr(test, allow(clippy::unwrap_used))]

pub mod cli;
pub mod data;
pub mod expr;
pub mod family;
pub mod infer;
pub mod likelihood;
pub mod math;
pub mod report;
pub mod restriction;
pub mod solve;
pub mod study;
