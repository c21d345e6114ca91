//! Held-out ratios, permutation, bootstrap, ratio against C, dimensions above noise: how far the fitted ratios can be trusted.
//!
//! # What is repeated
//! A fold repeats everything from V on with its training windows alone. V is blind to the labels, so a permutation keeps V and
//! repeats all that used the labels: the choice of γ (and of C, for `keep: "best"`), and the decomposition.
pub mod bootstrap;
pub mod dimensions;
pub mod heldout;
pub mod permute;
pub mod signflip;

/// Under this many pairs (or windows a side) p and held-out ratios are withheld.
pub const FEWEST: usize = 10;
