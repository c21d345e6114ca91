//! Spherical splines (Perrin, Pernier, Bertrand & Echallier 1989).
use crate::error::Result;

/// A spline fitted to positions; values can then be interpolated again and again.
#[derive(Debug, Clone)]
pub struct Spline {}

impl Spline {
    /// `m` = 4 and λ = 1e-5 serve maps; positions must lie on the unit sphere (they are normalised).
    pub fn new(_positions: &[[f64; 3]], _m: u32, _lambda: f64) -> Result<Self> {
        Ok(Spline {})
    }
    /// Values at `at` from `values` at the fitted positions.
    pub fn interpolate(&self, _values: &[f64], at: &[[f64; 3]]) -> Vec<f64> {
        vec![0.0; at.len()]
    }
    /// The matrix that does [`Self::interpolate`]: `at × positions`.
    pub fn matrix(&self, _at: &[[f64; 3]]) -> nalgebra::DMatrix<f64> {
        nalgebra::DMatrix::zeros(0, 0)
    }
}
