//! Spectra, time courses and maps of components.
//!
//! * [`positions`], [`placing`]: electrode positions by name; where the channels of a recording lie; sphere and plane.
//! * [`spline`], [`map`]: spherical splines, and patterns spread over the head.
//! * [`plate`]: biharmonic splines on a plane.
//! * [`welch`], [`spectra`]: power spectral densities of both sides.
//! * [`course`]: power and average around an event, single trials.
//!
//! Intervals are percentile bootstrap intervals over windows or trials (Efron & Tibshirani 1993, *An Introduction to the Bootstrap*,
//! section 13.3), seeded: the same seed gives the same bytes.
pub(crate) mod bootstrap;
pub mod course;
pub mod map;
pub mod placing;
pub mod plate;
pub mod positions;
pub mod spectra;
pub mod spline;
pub mod welch;
