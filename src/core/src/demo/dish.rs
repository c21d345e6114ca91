//! Drifting dish: a movie of 100 × 100 pixels, 20 frames a second, 140 seconds.
//!
//! A dish lies under a lamp. Two patches that overlap answer to a `puff`: for a second after it one flickers more, the other falls quiet. Both flicker
//! all the time, by about one part in a hundred. Nothing else knows of the puffs: the lamp flickers, the dish drifts over its own texture, the dye
//! bleaches, and every pixel is noisy. These are by far the larger part of the variance.
use super::process::{normal, rhythm, stream};
use super::{Demo, Pattern, Truth};
use crate::recipe::{Contrast, EventWindow, Keep, Recipe};
use crate::recording::{Channel, Event, Layout, Recording, Stretch, pixel_name};
use rand::RngExt;
use std::f64::consts::TAU;

const SIDE: usize = 100;
const RATE_HZ: f64 = 20.0;
const COUNT: usize = 2800;
const PUFFS: usize = 30;
/// Mean time between puffs, and how far each may be from its place.
const EVERY_S: f64 = 4.5;
const JITTER_S: f64 = 0.6;
/// When the patches change, after a puff.
const EFFECT_S: [f64; 2] = [0.0, 1.0];

/// Row, column, half width, and size in counts of the two patches.
const STRONGER: (f64, f64, f64, f64) = (40.0, 44.0, 9.0, 9.0);
const WEAKER: (f64, f64, f64, f64) = (54.0, 57.0, 11.0, 9.0);
/// By how much each flickers after a puff.
const GAIN: [f64; 2] = [2.2, 0.35];
const NOISE_COUNTS: f64 = 6.0;

mod streams {
    pub(super) const EVENTS: u64 = 1;
    pub(super) const STRONGER: u64 = 2;
    pub(super) const WEAKER: u64 = 3;
    pub(super) const LAMP: u64 = 4;
    pub(super) const DRIFT: u64 = 5;
    pub(super) const TEXTURE: u64 = 6;
    pub(super) const NOISE: u64 = 7;
}

/// The movie, what was planted in it, and the recipe that finds it. In `truth` patterns go pixel by pixel, row after row; names of
/// the channels and filters are left out (a filter would need the covariance of all pixels).
pub fn drifting_dish(seed: u64) -> Demo {
    let puffs = puffs(seed);
    let after = |t: f64| {
        puffs
            .iter()
            .any(|p| t >= p + EFFECT_S[0] && t < p + EFFECT_S[1])
    };
    let courses = [
        (streams::STRONGER, 5.0, GAIN[0]),
        (streams::WEAKER, 3.5, GAIN[1]),
    ]
    .map(|(number, hz, gain)| {
        let mut course = rhythm(&mut stream(seed, number), RATE_HZ, COUNT, hz, 2.0);
        for (t, x) in course.iter_mut().enumerate() {
            if after(t as f64 / RATE_HZ) {
                *x *= gain;
            }
        }
        course
    });
    let lamp = lamp(seed);
    let drift = [0, 1].map(|axis| drifting(seed, axis));
    let bleach: Vec<f64> = (0..COUNT)
        .map(|t| 0.75 + 0.25 * (-(t as f64) / RATE_HZ / 60.0).exp())
        .collect();
    let light = light(seed);
    let patches = [STRONGER, WEAKER].map(|(row, column, width, _)| patch(row, column, width));
    let mut random = stream(seed, streams::NOISE);
    let samples: Vec<Vec<f32>> = (0..SIDE * SIDE)
        .map(|p| {
            let slope = slope(&light, p);
            (0..COUNT)
                .map(|t| {
                    let still = light[p] * bleach[t] * lamp[t]
                        + slope[0] * drift[0][t]
                        + slope[1] * drift[1][t];
                    let planted = STRONGER.3 * patches[0][p] * courses[0][t]
                        + WEAKER.3 * patches[1][p] * courses[1][t];
                    (still + planted + NOISE_COUNTS * normal(&mut random)).round() as f32
                })
                .collect()
        })
        .collect();
    let pattern =
        |name: &str, hz: Option<f64>, pattern: &[f64], course: &[f64], size: f64| Pattern {
            name: name.to_owned(),
            hz,
            pattern: pattern
                .iter()
                .map(|x| (x * 1000.0).round() / 1000.0)
                .collect(),
            filter: Vec::new(),
            course: course.iter().map(|x| (size * x) as f32).collect(),
        };
    let truth = Truth {
        channels: Vec::new(),
        stronger: pattern(
            "patch that flickers more after a puff",
            Some(5.0),
            &patches[0],
            &courses[0],
            STRONGER.3,
        ),
        weaker: pattern(
            "patch that falls quiet after a puff",
            Some(3.5),
            &patches[1],
            &courses[1],
            WEAKER.3,
        ),
        nuisance: ["lamp", "drift", "bleaching"]
            .map(|name| pattern(name, None, &[], &[], 0.0))
            .to_vec(),
    };
    Demo {
        recording: recording(samples, &puffs),
        truth,
        recipe: recipe(),
    }
}

fn puffs(seed: u64) -> Vec<f64> {
    let mut random = stream(seed, streams::EVENTS);
    (0..PUFFS)
        .map(|i| {
            let place = 3.0 + EVERY_S * i as f64 + JITTER_S * random.random::<f64>();
            // On a frame: a camera knows no other times.
            (place * RATE_HZ).round() / RATE_HZ
        })
        .collect()
}

/// Flicker about 1: a slow wander, a hum that the shutter folds to 3.1 Hz, and noise.
fn lamp(seed: u64) -> Vec<f64> {
    let mut random = stream(seed, streams::LAMP);
    let mut slow = 0.0;
    (0..COUNT)
        .map(|t| {
            slow = 0.98 * slow + 0.002 * normal(&mut random);
            let hum = 0.012 * (TAU * 3.1 * t as f64 / RATE_HZ).sin();
            1.0 + slow + hum + 0.006 * normal(&mut random)
        })
        .collect()
}

/// Displacement in pixels along one axis.
fn drifting(seed: u64, axis: u64) -> Vec<f64> {
    let mut random = stream(seed, streams::DRIFT + 100 * axis);
    let (mut speed, mut at) = (0.0, 0.0);
    (0..COUNT)
        .map(|_| {
            speed = 0.9 * speed + 0.05 * normal(&mut random);
            at = 0.97 * at + speed;
            at
        })
        .collect()
}

/// Light of every pixel at rest, in counts: a lamp that falls off to the rim, over a texture of soft spots.
fn light(seed: u64) -> Vec<f64> {
    let mut random = stream(seed, streams::TEXTURE);
    let mut place = || random.random::<f64>() * SIDE as f64;
    let spots: Vec<(f64, f64, f64)> = (0..60)
        .map(|i| (place(), place(), 2.0 + f64::from(i % 5)))
        .collect();
    let half = SIDE as f64 / 2.0;
    (0..SIDE * SIDE)
        .map(|p| {
            let (row, column) = ((p / SIDE) as f64, (p % SIDE) as f64);
            let away = ((row - half).powi(2) + (column - half).powi(2)) / half.powi(2);
            let texture: f64 = spots
                .iter()
                .map(|(r, c, w)| {
                    let square = ((row - r).powi(2) + (column - c).powi(2)) / (w * w);
                    (-0.5 * square).exp()
                })
                .sum();
            1100.0 * (-0.5 * away).exp() * (0.8 + 0.2 * texture.min(2.0))
        })
        .collect()
}

/// How much a pixel changes for a pixel of drift along rows and columns.
fn slope(light: &[f64], pixel: usize) -> [f64; 2] {
    let (row, column) = (pixel / SIDE, pixel % SIDE);
    let at = |r: usize, c: usize| light[r.min(SIDE - 1) * SIDE + c.min(SIDE - 1)];
    [
        0.5 * (at(row + 1, column) - at(row.saturating_sub(1), column)),
        0.5 * (at(row, column + 1) - at(row, column.saturating_sub(1))),
    ]
}

fn patch(row: f64, column: f64, width: f64) -> Vec<f64> {
    (0..SIDE * SIDE)
        .map(|p| {
            let (r, c) = ((p / SIDE) as f64, (p % SIDE) as f64);
            (-0.5 * ((r - row).powi(2) + (c - column).powi(2)) / (width * width)).exp()
        })
        .collect()
}

fn recording(samples: Vec<Vec<f32>>, puffs: &[f64]) -> Recording {
    let channels = (0..SIDE * SIDE).map(|p| Channel {
        name: pixel_name((p / SIDE) as u32, (p % SIDE) as u32),
        unit: "counts".to_owned(),
        position: None,
    });
    Recording {
        name: "drifting-dish".to_owned(),
        format: "synthetic".to_owned(),
        rate_hz: RATE_HZ,
        channels: channels.collect(),
        samples,
        layout: Layout::Frames {
            height: SIDE as u32,
            width: SIDE as u32,
            pixels: (0..(SIDE * SIDE) as u32).collect(),
        },
        stretches: vec![Stretch {
            first: 0,
            count: COUNT,
            onset_s: 0.0,
        }],
        events: puffs
            .iter()
            .map(|onset_s| Event {
                onset_s: *onset_s,
                duration_s: 0.0,
                label: "puff".to_owned(),
            })
            .collect(),
        ..Recording::default()
    }
}

fn recipe() -> Recipe {
    let window = |from_s, to_s| EventWindow::new("puff", from_s, to_s);
    Recipe {
        keep: Keep::Number(20),
        ..Recipe::asking(Contrast::Windows {
            signal: window(0.0, 1.0),
            reference: window(-1.0, 0.0),
        })
    }
}
