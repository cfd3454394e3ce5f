//! Constrained maximum likelihood: a likelihood and data are maximised under equality restrictions through the
//! Lagrangian; the answer comes with multipliers, tests and a certificate.
//!
//! ```
//! use guyline::data::{self, Request, Source};
//! use guyline::infer::{self, Options};
//! use guyline::likelihood::{self, LogLikelihood, Model, model::Response};
//! use guyline::restriction::{Draft, Quantities, Role, System};
//!
//! # fn main() -> Result<(), Box<dyn std::error::Error>> {
//! // Flaws on single tiles of two kilns: is the rate in the north twice that in the south?
//! let csv = "kiln,flaws\nnorth,12\nnorth,9\nnorth,11\nsouth,4\nsouth,6\nsouth,8\n";
//! let model = Model {
//!     family: "poisson".into(),
//!     response: Response::Column("flaws".into()),
//!     per: Some("kiln".into()),
//!     ..Model::default()
//! };
//! let (wanted, pairs) = likelihood::wanted(&model)?;
//! let table = data::read(&Source::text("flaws.csv", csv), &Request { wanted, pairs, ..Request::default() })?;
//! let sample = likelihood::prepare(&model, &table)?;
//! let names: Vec<String> = sample.parameters().iter().map(|p| p.name.clone()).collect();
//! let ratio = Draft::from_option(Role::Tested, "ratio: north.rate = 2 * south.rate", "here");
//! let system = System::compile(&[ratio], &names, sample.known())?;
//! let outcome = infer::run(&sample, &system, &Quantities::default(), &Options::default())?;
//! // 50 flaws in all, shared 2 to 1; Pearson's statistic of 32 and 18 against 33.3 and 16.7
//! assert!((outcome.restricted.estimates[0].value - 100.0 / 9.0).abs() < 1e-9);
//! assert!((outcome.score?.chi_square - 0.16).abs() < 1e-9);
//! # Ok(())
//! # }
//! ```
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
