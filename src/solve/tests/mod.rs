//! Problems with known answers, by kind.

mod awkward;
mod classical;
mod likelihoods;
mod random;
