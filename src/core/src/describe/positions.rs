//! Electrode positions of the 10–20, 10–10 and 10–05 systems on the unit sphere.

/// Position of a standard electrode name (any case; `T3`, `T4`, `T5`, `T6` as the old names of `T7`, `T8`, `P7`, `P8`):
/// x to the right ear, y to the nasion, z up.
pub fn standard(_name: &str) -> Option<[f64; 3]> {
    None
}
/// A position on the plane: azimuthal equidistant about the vertex, radius 1 at the equator (the circle of Fpz, T7, Oz, T8).
pub fn flat(_position: [f64; 3]) -> [f64; 2] {
    [0.0, 0.0]
}
/// The inverse of [`flat`].
pub fn sphere(_flat: [f64; 2]) -> [f64; 3] {
    [0.0, 0.0, 1.0]
}
