//! Spectra, time courses and maps of components.
pub mod positions;
pub mod spline;
pub mod welch;
