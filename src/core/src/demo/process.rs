//! Random processes in time, each from its own stream of the seed.
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use std::f64::consts::TAU;

/// A generator for one process: another stream never shifts it.
pub(super) fn stream(seed: u64, number: u64) -> ChaCha8Rng {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    random.set_stream(number);
    random
}

/// A standard normal number.
pub(super) fn normal(random: &mut ChaCha8Rng) -> f64 {
    StandardNormal.sample(random)
}

/// Noise whose power falls about as 1/f between 0.3 and 60 Hz; variance about 1. A sum of first-order processes with corner
/// frequencies a factor of 3.5 apart.
pub(super) fn one_over_f(random: &mut ChaCha8Rng, rate_hz: f64, count: usize) -> Vec<f64> {
    const CORNERS_HZ: [f64; 5] = [0.3, 1.05, 3.7, 13.0, 45.0];
    let keep = CORNERS_HZ.map(|f| (-TAU * f / rate_hz).exp());
    let feed = keep.map(|a| (1.0 - a * a).sqrt() / (CORNERS_HZ.len() as f64).sqrt());
    let mut state = [0.0; CORNERS_HZ.len()];
    for value in &mut state {
        *value = normal(random) / (CORNERS_HZ.len() as f64).sqrt();
    }
    (0..count)
        .map(|_| {
            let drive = normal(random);
            for i in 0..state.len() {
                state[i] = keep[i] * state[i] + feed[i] * drive;
            }
            state.iter().sum()
        })
        .collect()
}

/// A rhythm around `hz` with a full width at half power of `width_hz`, variance 1: a damped rotation kicked by noise.
pub(super) fn rhythm(
    random: &mut ChaCha8Rng,
    rate_hz: f64,
    count: usize,
    hz: f64,
    width_hz: f64,
) -> Vec<f64> {
    let keep = (-std::f64::consts::PI * width_hz / rate_hz).exp();
    let (sin, cos) = (TAU * hz / rate_hz).sin_cos();
    let feed = (1.0 - keep * keep).sqrt();
    let (mut re, mut im) = (normal(random), normal(random));
    (0..count)
        .map(|_| {
            let turned = (keep * (re * cos - im * sin), keep * (re * sin + im * cos));
            re = turned.0 + feed * normal(random);
            im = turned.1 + feed * normal(random);
            re
        })
        .collect()
}

/// Rises from 0 to 1 for u from 0 to 1, smoothly.
pub(super) fn smooth_step(u: f64) -> f64 {
    let u = u.clamp(0.0, 1.0);
    u * u * (3.0 - 2.0 * u)
}

/// A bump over u from 0 to 1 with its top of 1 at a third.
pub(super) fn bump(u: f64) -> f64 {
    if u < 1.0 / 3.0 {
        smooth_step(3.0 * u)
    } else {
        smooth_step(1.5 * (1.0 - u))
    }
}
