//! Problems with known answers, by kind.

mod awkward;
mod classical;
mod kinks;
mod likelihoods;
mod random;
