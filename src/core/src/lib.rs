//! Everything Teasel computes or parses. No WebAssembly, no DOM, no input or output beyond the [`recording::Source`] trait.
//!
//! Data flows one way, and no room imports one to its right:
//! [`recording`] → [`prepare`] → [`contrast`] → [`evidence`] / [`describe`] → [`takeaway`].
//!
//! * [`recording`]: what a recording is; one file per format behind one probe.
//! * [`recipe`]: all choices of the user as one fixed structure.
//! * [`prepare`]: channel matrix, filters, resampling.
//! * [`contrast`]: windows, covariances, compression, the two measures.
//! * [`evidence`]: held-out ratios, permutation, bootstrap, the curve that helps to choose C.
//! * [`describe`]: spectra, time courses, maps. Its `positions`, `spline` and `welch` are plain mathematics that
//!   [`prepare`] uses too.
//! * [`analysis`]: the steps in order, with what is stale recomputed; ends in a [`sheet::Sheet`].
//! * [`sheet`]: everything known so far, as plain data: what figures, readings and take-aways are made from.
//! * [`takeaway`]: weights, results, report, archive.
//! * [`demo`]: the invented demo recordings.
#![forbid(unsafe_code)]

pub mod analysis;
pub mod contrast;
pub mod demo;
pub mod describe;
pub mod error;
pub mod evidence;
mod fourier;
pub mod prepare;
pub mod recipe;
pub mod recording;
pub mod sheet;
pub mod takeaway;

/// The program's name and version, as written into take-aways.
pub const PROGRAM: &str = "Teasel";
/// See [`PROGRAM`].
pub const VERSION: &str = env!("CARGO_PKG_VERSION");

/// The sentence that stands wherever results are shown or exported.
pub const CAUTION: &str = "Teasel is for research. It makes no diagnosis and replaces no licensed reading of a recording; \
licensed practice and local rules come first.";
