//! Helpers shared by the checks: see `all.rs`.
pub mod calibration;

use serde_json::Value;

/// A file of reference values in `reference/`, without its `.json`.
///
/// # Panics
/// When it is missing or is no JSON.
pub fn reference(name: &str) -> Value {
    let path = format!("{}/reference/{name}.json", env!("CARGO_MANIFEST_DIR"));
    let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}"));
    serde_json::from_str(&text).unwrap_or_else(|e| panic!("{path}: {e}"))
}

/// A number of a reference file.
///
/// # Panics
/// When the value is no number.
pub fn number(value: &Value) -> f64 {
    value
        .as_f64()
        .unwrap_or_else(|| panic!("a number stands here: {value}"))
}

/// A list of numbers of a reference file.
///
/// # Panics
/// When the value is no list of numbers.
pub fn numbers(value: &Value) -> Vec<f64> {
    let list = value
        .as_array()
        .unwrap_or_else(|| panic!("a list stands here: {value}"));
    list.iter().map(number).collect()
}

/// A list of lists of numbers of a reference file.
///
/// # Panics
/// When the value is none.
pub fn rows(value: &Value) -> Vec<Vec<f64>> {
    let list = value
        .as_array()
        .unwrap_or_else(|| panic!("a list stands here: {value}"));
    list.iter().map(numbers).collect()
}

/// Fails unless |a − b| ≤ `tolerance` for every pair; `what` opens the message.
///
/// # Panics
/// At the first pair that is too far apart (or not a number), and when the lengths differ.
pub fn close_all(what: &str, a: &[f64], b: &[f64], tolerance: f64) {
    assert_eq!(a.len(), b.len(), "{what}: lengths differ");
    for (i, (x, y)) in a.iter().zip(b).enumerate() {
        close(&format!("{what}[{i}]"), *x, *y, tolerance);
    }
}

/// Fails unless |a − b| ≤ `tolerance`; `what` opens the message.
///
/// # Panics
/// When they are farther apart, or not numbers.
pub fn close(what: &str, a: f64, b: f64, tolerance: f64) {
    let apart = (a - b).abs();
    assert!(
        apart <= tolerance,
        "{what}: {a} against {b}, {apart:e} apart, {tolerance:e} allowed"
    );
}

/// The largest magnitude: tolerances are stated relative to it.
pub fn largest(values: &[f64]) -> f64 {
    values.iter().fold(0.0, |most, v| v.abs().max(most))
}

/// The generator of `reference/README.md`: Knuth's 64-bit linear congruential generator.
#[derive(Debug, Clone)]
pub struct Lcg(pub u64);

impl Lcg {
    /// Uniform in [0, 1).
    pub fn uniform(&mut self) -> f64 {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 * 2f64.powi(-53)
    }
    /// Mean 0, variance 1, nearly normal: the sum of 12 uniforms less 6.
    pub fn normal12(&mut self) -> f64 {
        let first = self.uniform();
        (1..12).fold(first, |sum, _| sum + self.uniform()) - 6.0
    }
}
