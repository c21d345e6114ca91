//! Spherical splines (Perrin, Pernier, Bertrand & Echallier 1989, *Electroenceph. clin. Neurophysiol.* 72:184–187):
//!
//! z(q) = c₀ + Σᵢ cᵢ g(q·eᵢ), (G + λI) c + c₀ 1 = z, 1ᵀc = 0, g(x) = 1/(4π) Σₙ (2n+1) / (nᵐ(n+1)ᵐ) Pₙ(x), n = 1 … 50.
//!
//! z is linear in the values, so a spline is kept as the matrix that turns values into coefficients, and many maps are one product.
use crate::error::{Kind, Problem, Result};
use nalgebra::DMatrix;

/// Terms of the sum; what is left out is below 1e-11 for m = 4.
const TERMS: usize = 50;
/// Two positions on the unit sphere closer than this are one: 10 µm on a head of 10 cm.
const SAME_PLACE: f64 = 1e-4;
/// Fewest positions a spline is fitted to.
const FEWEST: usize = 4;

/// 1/(4π) Σ (2n+1) / (nᵖ(n+1)ᵖ) Pₙ(cosine) over n = 1 … `terms`: g for p = m, h (the surface Laplacian's sum) for p = m − 1.
/// The cosine is clipped to [−1, 1].
pub fn legendre_sum(cosine: f64, power: u32, terms: usize) -> f64 {
    Weights::new(power, terms).sum(cosine)
}

/// (2n+1) / (4π nᵖ(n+1)ᵖ) and the factors of the recurrence n Pₙ = (2n−1) x Pₙ₋₁ − (n−1) Pₙ₋₂, for n = 1 ….
#[derive(Debug, Clone)]
struct Weights(Vec<[f64; 3]>);

impl Weights {
    fn new(power: u32, terms: usize) -> Self {
        let weight = |n: f64| {
            (2.0 * n + 1.0) / (n * (n + 1.0)).powi(power as i32) / (4.0 * std::f64::consts::PI)
        };
        Weights(
            (1..=terms)
                .map(|n| n as f64)
                .map(|n| [weight(n), (2.0 * n - 1.0) / n, (n - 1.0) / n])
                .collect(),
        )
    }
    fn sum(&self, cosine: f64) -> f64 {
        let x = cosine.clamp(-1.0, 1.0);
        let (mut before, mut now, mut sum) = (0.0, 1.0, 0.0);
        for [weight, forward, back] in &self.0 {
            let next = forward * x * now - back * before;
            before = now;
            now = next;
            sum += weight * next;
        }
        sum
    }
}

/// A spline fitted to positions; values can then be interpolated again and again.
#[derive(Debug, Clone)]
pub struct Spline {
    positions: Vec<[f64; 3]>,
    weights: Weights,
    /// `(positions + 1) × positions`: from values to c and, in the last row, c₀.
    solve: DMatrix<f64>,
}

impl Spline {
    /// `m` = 4 and λ = 1e-5 serve maps; positions must lie on the unit sphere (they are normalised).
    ///
    /// # Errors
    /// Fewer than 4 positions, a position without direction, and two positions in one place.
    pub fn new(positions: &[[f64; 3]], m: u32, lambda: f64) -> Result<Self> {
        let positions = checked(positions)?;
        let weights = Weights::new(m, TERMS);
        let n = positions.len();
        let mut system = DMatrix::from_element(n + 1, n + 1, 1.0);
        system[(n, n)] = 0.0;
        for i in 0..n {
            for j in 0..=i {
                let g = weights.sum(dot(positions[i], positions[j]));
                system[(i, j)] = g;
                system[(j, i)] = g;
            }
            system[(i, i)] += lambda;
        }
        let right = DMatrix::from_fn(n + 1, n, |i, j| f64::from(u8::from(i == j)));
        let solve = system.lu().solve(&right).ok_or_else(|| {
            Problem::new(
                Kind::Contrast,
                "no map can be fitted to these electrode positions",
                "check the positions in the side file",
            )
        })?;
        Ok(Spline {
            positions,
            weights,
            solve,
        })
    }
    /// Values at `at` from `values` at the fitted positions.
    pub fn interpolate(&self, values: &[f64], at: &[[f64; 3]]) -> Vec<f64> {
        let coefficients = &self.solve * nalgebra::DVector::from_column_slice(values);
        let n = self.positions.len();
        at.iter()
            .map(|&q| {
                let q = normalised(q).unwrap_or(q);
                let sum: f64 = (0..n).map(|i| coefficients[i] * self.g(q, i)).sum();
                coefficients[n] + sum
            })
            .collect()
    }
    /// The coefficients c, then c₀, for `values` at the fitted positions.
    pub fn coefficients(&self, values: &[f64]) -> Vec<f64> {
        let all = &self.solve * nalgebra::DVector::from_column_slice(values);
        all.as_slice().to_vec()
    }
    /// The matrix that does [`Self::interpolate`]: `at × positions`; every row sums to 1.
    pub fn matrix(&self, at: &[[f64; 3]]) -> DMatrix<f64> {
        let n = self.positions.len();
        let at: Vec<[f64; 3]> = at.iter().map(|&q| normalised(q).unwrap_or(q)).collect();
        DMatrix::from_fn(
            at.len(),
            n + 1,
            |i, j| if j < n { self.g(at[i], j) } else { 1.0 },
        ) * &self.solve
    }
    /// The weights with which every fitted position is estimated from all others: `positions × positions`, zero diagonal, rows sum to 1.
    ///
    /// With A the system's matrix, xᵢ less its estimate from the others is (A⁻¹x)ᵢ / (A⁻¹)ᵢᵢ (Rippa 1999, *Adv. Comput. Math.*
    /// 11:193–210): one inverse serves all.
    pub fn leave_one_out(&self) -> DMatrix<f64> {
        let n = self.positions.len();
        DMatrix::from_fn(n, n, |i, j| match i == j {
            true => 0.0,
            false => -self.solve[(i, j)] / self.solve[(i, i)],
        })
    }
    fn g(&self, q: [f64; 3], i: usize) -> f64 {
        self.weights.sum(dot(q, self.positions[i]))
    }
}

fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

fn normalised(position: [f64; 3]) -> Option<[f64; 3]> {
    let length = dot(position, position).sqrt();
    (length.is_finite() && length > 0.0).then(|| position.map(|v| v / length))
}

fn checked(positions: &[[f64; 3]]) -> Result<Vec<[f64; 3]>> {
    if positions.len() < FEWEST {
        return Err(Problem::new(
            Kind::Contrast,
            "too few electrode positions are known for a map",
            "name the channels by the 10–20 system or add a file with their positions",
        )
        .expected_found(format!("at least {FEWEST}"), positions.len()));
    }
    let mut all = Vec::with_capacity(positions.len());
    for (index, &position) in positions.iter().enumerate() {
        let place = normalised(position).ok_or_else(|| {
            Problem::new(
                Kind::Contrast,
                "an electrode position has no direction from the centre of the head",
                "correct it in the file with the positions",
            )
            .at(format!("position {}", index + 1))
            .expected_found(
                "three finite numbers, not all zero",
                format!("{position:?}"),
            )
        })?;
        if let Some(other) = all.iter().position(|&p| near(p, place)) {
            return Err(Problem::new(
                Kind::Contrast,
                "two electrodes have the same position",
                "leave one of the two channels out or correct the positions",
            )
            .at(format!("positions {} and {}", other + 1, index + 1)));
        }
        all.push(place);
    }
    Ok(all)
}

fn near(a: [f64; 3], b: [f64; 3]) -> bool {
    let apart = [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
    dot(apart, apart) < SAME_PLACE * SAME_PLACE
}
