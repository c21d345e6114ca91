//! Choices about a movie: which pixels, how coarse, against which baseline.
use super::check::out;
use crate::error::Result;
use serde::{Deserialize, Serialize};

/// What becomes of a movie's pixels before they are channels: binned, then masked, then set against their baseline.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Movie {
    /// Pixels along a side that are averaged into one; 1 when it is not given. Rows and columns that fill no whole bin are left off.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub bin: Option<u32>,
    /// Which pixels are used; all when it is not given.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub mask: Option<Mask>,
    /// Change against a running baseline, as a share of it.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub dff: Option<Dff>,
}

/// Which pixels are used.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Mask {
    /// Those brighter, on average over all frames, than a value.
    Above(Above),
    /// Those brighter than a quantile of the mean image.
    Quantile(Quantile),
    /// Painted runs: row, first and last column of the movie as recorded, counted from 1. A bin is used where at least half of its pixels are painted.
    Painted(Vec<[u32; 3]>),
}

/// See [`Mask::Above`].
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Above {
    /// In the movie's unit.
    pub above: f64,
}

/// See [`Mask::Quantile`].
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Quantile {
    /// From 0 up to, but not including, 1; linear between order statistics.
    pub quantile: f64,
}

/// ΔF/F = (F − F₀)/F₀, F₀ a running percentile.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Dff {
    /// Percentile, 0 to 100.
    pub percentile: f64,
    /// Width of the window that it is taken in, centred on each frame.
    pub window_s: f64,
}

impl Default for Dff {
    fn default() -> Self {
        Dff {
            percentile: 10.0,
            window_s: 30.0,
        }
    }
}

impl Movie {
    /// Whether every pixel stays as it was recorded.
    pub fn is_plain(&self) -> bool {
        self.side() == 1 && self.mask.is_none() && self.dff.is_none()
    }
    /// Pixels along a side of a bin.
    pub fn side(&self) -> u32 {
        self.bin.unwrap_or(1)
    }
}

/// Ranges that hold whatever the movie.
pub(super) fn check_movie(movie: &Movie) -> Result<()> {
    if !(1..=64).contains(&movie.side()) {
        let expected = "a whole number from 1 to 64";
        return Err(out("movie.bin", expected, movie.side()));
    }
    match &movie.mask {
        Some(Mask::Above(Above { above })) if !above.is_finite() => {
            return Err(out("movie.mask.above", "a number", above));
        }
        Some(Mask::Quantile(Quantile { quantile })) if !(0.0..1.0).contains(quantile) => {
            let expected = "a number from 0 up to, but not including, 1";
            return Err(out("movie.mask.quantile", expected, quantile));
        }
        Some(Mask::Painted(runs)) => {
            let wrong = runs
                .iter()
                .find(|[row, first, last]| *row == 0 || *first == 0 || last < first);
            if let Some([row, first, last]) = wrong {
                let expected = "row, first and last column, counted from 1, first up to last";
                return Err(out(
                    "movie.mask",
                    expected,
                    format!("{row}, {first}, {last}"),
                ));
            }
        }
        _ => {}
    }
    if let Some(dff) = movie.dff {
        if !(0.0..=100.0).contains(&dff.percentile) {
            let expected = "a number from 0 to 100";
            return Err(out("movie.dff.percentile", expected, dff.percentile));
        }
        if !(dff.window_s > 0.0 && dff.window_s <= 1e6) {
            let expected = "a number of seconds above 0";
            return Err(out("movie.dff.window_s", expected, dff.window_s));
        }
    }
    Ok(())
}
