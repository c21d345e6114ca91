//! Biharmonic splines on a plane (Sandwell 1987, *Geophys. Res. Lett.* 14:139–142, equations 2–4 for two dimensions), with the affine part of
//! thin-plate splines (Duchon 1977), so that a constant and a slope are kept exactly:
//!
//! z(q) = a₀ + a₁ x + a₂ y + Σᵢ cᵢ φ(|q − eᵢ|), φ(r) = r² ln r, (Φ + λI) c + [1 x y] a = z, [1 x y]ᵀ c = 0.
//!
//! z is linear in the values, so a spline is kept as the matrix that turns values into coefficients, as
//! [`Spline`](super::spline::Spline) does on the sphere.
use crate::error::{Kind, Problem, Result};
use nalgebra::{DMatrix, DVector};

/// Fewest places a plate is fitted to: three decide a plane.
const FEWEST: usize = 4;
/// Two places closer than this share of the whole extent are one.
const SAME_PLACE: f64 = 1e-6;

/// A spline fitted to places on a plane; values can then be interpolated again and again.
#[derive(Debug, Clone)]
pub struct Plate {
    /// Places about their middle, in units of their extent.
    places: Vec<[f64; 2]>,
    middle: [f64; 2],
    extent: f64,
    /// `(places + 3) × places`: from values to c and, in the last rows, a.
    solve: DMatrix<f64>,
}

impl Plate {
    /// λ = 0 passes through every value.
    ///
    /// # Errors
    /// Fewer than 4 places, places on one line, and two in one place.
    pub fn new(places: &[[f64; 2]], lambda: f64) -> Result<Self> {
        let n = places.len();
        let refuse = |what: &str| Problem::new(Kind::Contrast, what, "correct the positions");
        if n < FEWEST {
            return Err(refuse("too few positions are known for a map")
                .expected_found(format!("at least {FEWEST}"), n));
        }
        let side = |k: usize, pick: fn(f64, f64) -> f64| places.iter().map(|p| p[k]).reduce(pick);
        let range = |k| Some((side(k, f64::min)?, side(k, f64::max)?));
        let (x, y) = (range(0).unwrap_or_default(), range(1).unwrap_or_default());
        let middle = [f64::midpoint(x.0, x.1), f64::midpoint(y.0, y.1)];
        let extent = ((x.1 - x.0).max(y.1 - y.0) / 2.0).max(f64::MIN_POSITIVE);
        let places: Vec<[f64; 2]> = places
            .iter()
            .map(|p| [(p[0] - middle[0]) / extent, (p[1] - middle[1]) / extent])
            .collect();
        for i in 0..n {
            if let Some(j) = (0..i).find(|&j| distance(places[i], places[j]) < SAME_PLACE) {
                return Err(refuse("two electrodes have the same position").at(format!(
                    "positions {} and {}",
                    j + 1,
                    i + 1
                )));
            }
        }
        let mut system = DMatrix::zeros(n + 3, n + 3);
        for i in 0..n {
            for j in 0..i {
                let value = green(distance(places[i], places[j]));
                system[(i, j)] = value;
                system[(j, i)] = value;
            }
            system[(i, i)] = lambda;
            for (k, value) in [1.0, places[i][0], places[i][1]].into_iter().enumerate() {
                system[(i, n + k)] = value;
                system[(n + k, i)] = value;
            }
        }
        let right = DMatrix::from_fn(n + 3, n, |i, j| f64::from(u8::from(i == j)));
        let solve = system.lu().solve(&right);
        let solve = solve
            .filter(|s| s.iter().all(|v| v.is_finite() && v.abs() < 1e12))
            .ok_or_else(|| refuse("the electrodes lie on one line: there is no map of a plane"))?;
        Ok(Plate {
            places,
            middle,
            extent,
            solve,
        })
    }

    /// Values at `at` from `values` at the fitted places.
    pub fn interpolate(&self, values: &[f64], at: &[[f64; 2]]) -> Vec<f64> {
        let product = self.matrix(at) * DVector::from_column_slice(values);
        product.as_slice().to_vec()
    }

    /// The matrix that does [`Self::interpolate`]: `at × places`; every row sums to 1.
    pub fn matrix(&self, at: &[[f64; 2]]) -> DMatrix<f64> {
        let n = self.places.len();
        let at: Vec<[f64; 2]> = at
            .iter()
            .map(|q| [0, 1].map(|k| (q[k] - self.middle[k]) / self.extent))
            .collect();
        DMatrix::from_fn(at.len(), n + 3, |i, j| match j.checked_sub(n) {
            None => green(distance(at[i], self.places[j])),
            Some(0) => 1.0,
            Some(k) => at[i][k - 1],
        }) * &self.solve
    }
}

/// φ(r) = r² ln r, 0 at 0.
fn green(r: f64) -> f64 {
    if r > 0.0 { r * r * r.ln() } else { 0.0 }
}

fn distance(a: [f64; 2], b: [f64; 2]) -> f64 {
    (a[0] - b[0]).hypot(a[1] - b[1])
}

/// The convex hull of some places, against the clock (Andrew 1979, monotone chain).
pub fn hull(places: &[[f64; 2]]) -> Vec<[f64; 2]> {
    let mut sorted: Vec<[f64; 2]> = places.to_vec();
    sorted.sort_by(|a, b| a[0].total_cmp(&b[0]).then(a[1].total_cmp(&b[1])));
    sorted.dedup();
    if sorted.len() < 3 {
        return sorted;
    }
    let turn = |o: [f64; 2], a: [f64; 2], b: [f64; 2]| {
        (a[0] - o[0]) * (b[1] - o[1]) - (a[1] - o[1]) * (b[0] - o[0])
    };
    let half = |points: &mut dyn Iterator<Item = [f64; 2]>| {
        let mut chain: Vec<[f64; 2]> = Vec::new();
        for p in points {
            while let [.., o, a] = chain[..]
                && turn(o, a, p) <= 0.0
            {
                chain.pop();
            }
            chain.push(p);
        }
        chain.pop();
        chain
    };
    let mut lower = half(&mut sorted.iter().copied());
    lower.extend(half(&mut sorted.iter().rev().copied()));
    lower
}
