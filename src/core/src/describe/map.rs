//! Maps: a pattern over channels spread over the plane on which the head lies flat.
use super::positions::{flat, sphere};
use super::spline::Spline;
use crate::error::Result;
use nalgebra::{DMatrix, DVector};

/// Half the side of the square that a map covers: the circle of Fpz, T7, Oz, T8 has radius 1.
pub const EXTENT: f64 = 1.12;

/// A square grid over the plane [−1.12, 1.12]² of [`flat`], with the spherical spline of its channels ready: a map is one product.
///
/// # Axis order
/// Row-major; row 0 is the front (y = 1.12), column 0 the left (x = −1.12).
///
/// # Outside the head
/// Every value is finite: points beyond [`Self::radius`] continue the spline, so that contours can be cut at the circle exactly.
/// They are extrapolated and not to be shown. Points farther than 1.12 from the vertex repeat the value at 1.12 in their direction.
#[derive(Debug, Clone)]
pub struct MapGrid {
    /// Points a side.
    pub side: usize,
    /// Where the map ends: 1, or as far as the farthest channel where that lies farther, at most 1.12.
    pub radius: f64,
    /// Channels on the plane, in the order they were given; channels below the equator lie beyond 1 and may lie beyond 1.12.
    pub places: Vec<[f64; 2]>,
    /// `side² × channels`.
    matrix: DMatrix<f64>,
}

impl MapGrid {
    /// A grid of `side` × `side` points for channels at these positions (m = 4, λ = 1e-5).
    ///
    /// # Errors
    /// Those of [`Spline::new`].
    pub fn new(positions: &[[f64; 3]], side: usize) -> Result<Self> {
        Self::smoothed(positions, side, 1e-5)
    }
    /// The same with another λ. At 1e-5 a pattern that is large at one channel of 32 loses up to half of its height there; from
    /// 1e-8 down the map passes through every channel's value to within 1 %.
    ///
    /// # Errors
    /// Those of [`Spline::new`].
    pub fn smoothed(positions: &[[f64; 3]], side: usize, lambda: f64) -> Result<Self> {
        let spline = Spline::new(positions, 4, lambda)?;
        let places: Vec<[f64; 2]> = positions.iter().map(|&p| flat(p)).collect();
        let farthest = places.iter().map(|p| p[0].hypot(p[1])).fold(1.0, f64::max);
        let points: Vec<[f64; 3]> = (0..side * side)
            .map(|k| sphere(within(at(side, k / side, k % side))))
            .collect();
        Ok(MapGrid {
            side,
            radius: farthest.min(EXTENT),
            places,
            matrix: spline.matrix(&points),
        })
    }
    /// The map of a pattern over the channels, row by row.
    pub fn values(&self, pattern: &[f64]) -> Vec<f64> {
        let product = &self.matrix * DVector::from_column_slice(pattern);
        product.as_slice().to_vec()
    }
    /// Where on the plane a point of the grid lies.
    pub fn at(&self, row: usize, column: usize) -> [f64; 2] {
        at(self.side, row, column)
    }
}

fn at(side: usize, row: usize, column: usize) -> [f64; 2] {
    let step = 2.0 * EXTENT / (side.max(2) - 1) as f64;
    [column as f64 * step - EXTENT, EXTENT - row as f64 * step]
}

fn within([x, y]: [f64; 2]) -> [f64; 2] {
    let radius = x.hypot(y);
    let scale = if radius > EXTENT {
        EXTENT / radius
    } else {
        1.0
    };
    [x * scale, y * scale]
}
