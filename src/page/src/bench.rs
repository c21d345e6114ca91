//! Kernels by themselves, for `cargo xtask bench`; the page does not call them.
use teasel_core::contrast::linalg::{eigh, gram};
use wasm_bindgen::prelude::wasm_bindgen;

/// Solves a dense symmetric eigenproblem of size `n`; gives its largest eigenvalue.
#[wasm_bindgen(js_name = benchmarkEigen)]
#[must_use]
pub fn benchmark_eigen(n: usize) -> f64 {
    let entry = |i: usize, j: usize| ((i * j + i + j) as f64 * 0.7).sin();
    eigh(&nalgebra::DMatrix::from_fn(n, n, entry)).0[0]
}

/// Multiplies a panel of `samples × n` (n a multiple of 4) with its transpose, `times` over; gives the first entry's sum.
#[wasm_bindgen(js_name = benchmarkGram)]
#[must_use]
pub fn benchmark_gram(n: usize, samples: usize, times: usize) -> f64 {
    let panel: Vec<f64> = (0..n * samples).map(|i| (i as f64 * 0.7).sin()).collect();
    (0..times).map(|_| gram(&panel, n, n)[0]).sum()
}
