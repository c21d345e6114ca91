//! Night watch: a helmsman in a ship's-bridge simulator, 32 scalp channels at 250 Hz, four minutes.
//!
//! Lights come up on the dark sea. A `buoy` has to be reported; a `swell` is nothing to do. From 0.2 to 1.0 s after a buoy a 21 Hz
//! rhythm under CP1 grows and a 10.5 Hz rhythm under Oz falls, more in one trial than in another. Nothing else knows of the buoys:
//! ongoing rhythms that overlap the planted two and share part of their waves, 1/f activity of many sources, blinks, jaw muscle,
//! mains that is worst at P8, and a T7 that drifts. These are by far the larger part of the variance.
use super::head::{CHANNELS, Dipole, pattern, point};
use super::process::{bump, normal, one_over_f, rhythm, smooth_step, stream};
use super::{Demo, Pattern, Truth};
use crate::recipe::{Contrast, EventWindow, Filter, Recipe};
use crate::recording::{Channel, Event, Recording, Stretch};
use nalgebra::{DMatrix, DVector};
use rand::RngExt;
use rand::seq::SliceRandom;
use rand_chacha::ChaCha8Rng;
use std::f64::consts::TAU;

const RATE_HZ: f64 = 250.0;
const COUNT: usize = 60_000;
const SECONDS: f64 = COUNT as f64 / RATE_HZ;
/// Samples are multiples of 1/10 µV.
const STEPS_A_MICROVOLT: f64 = 10.0;

const BUOYS: usize = 42;
const SWELLS: usize = 20;
/// Shortest time between two events: windows of a second on both sides of each do not meet.
const APART_S: f64 = 2.3;
/// No event nearer to either end.
const MARGIN_S: f64 = 2.0;

/// When the planted rhythms change, after a buoy.
const EFFECT_S: [f64; 2] = [0.2, 1.0];
/// How long the change takes to come and to go.
const RAMP_S: f64 = 0.1;

/// One process each, by the number of its stream.
mod streams {
    pub(super) const EVENTS: u64 = 1;
    pub(super) const STRONGER: u64 = 2;
    pub(super) const WEAKER: u64 = 3;
    pub(super) const BLINKS: u64 = 4;
    pub(super) const JAW: u64 = 5;
    pub(super) const MAINS: u64 = 6;
    pub(super) const DRIFT: u64 = 7;
    pub(super) const SENSORS: u64 = 8;
    pub(super) const ONGOING: u64 = 100;
    pub(super) const BACKGROUND: u64 = 1000;
}

/// The recording, what was planted in it, and the recipe that finds it.
pub fn night_watch(seed: u64) -> Demo {
    let events = events(&mut stream(seed, streams::EVENTS));
    let buoys: Vec<f64> = events
        .iter()
        .filter(|e| e.label == "buoy")
        .map(|e| e.onset_s)
        .collect();
    let mut scalp = Scalp::new();
    let (stronger, weaker) = plant(seed, &buoys, &mut scalp);
    background(seed, &mut scalp);
    let nuisance = nuisances(seed, &mut scalp);
    sensors(seed, &mut scalp);

    let samples = scalp.rounded();
    let covariance = covariance(&samples);
    let with_filter = |mut source: Pattern| {
        source.filter = filter(&covariance, &source.pattern);
        source
    };
    let names: Vec<String> = CHANNELS.iter().map(|c| c.0.to_owned()).collect();
    let truth = Truth {
        channels: names.clone(),
        stronger: with_filter(stronger),
        weaker: with_filter(weaker),
        nuisance,
    };
    Demo {
        recording: recording(names, samples, events),
        truth,
        recipe: recipe(),
    }
}

fn recording(names: Vec<String>, samples: Vec<Vec<f32>>, events: Vec<Event>) -> Recording {
    Recording {
        name: "night-watch.edf".to_owned(),
        format: "synthetic".to_owned(),
        rate_hz: RATE_HZ,
        channels: names
            .into_iter()
            .map(|name| Channel {
                name,
                unit: "µV".to_owned(),
                position: None,
            })
            .collect(),
        samples,
        stretches: vec![Stretch {
            first: 0,
            count: COUNT,
            onset_s: 0.0,
        }],
        events,
        ..Recording::default()
    }
}

fn recipe() -> Recipe {
    let window = |from_s, to_s| EventWindow::new("buoy", from_s, to_s);
    Recipe {
        filter: Filter {
            high_pass_hz: Some(1.0),
            low_pass_hz: Some(40.0),
            ..Filter::default()
        },
        ..Recipe::asking(Contrast::Windows {
            signal: window(0.2, 1.0),
            reference: window(-1.0, -0.2),
        })
    }
}

/// Buoys and swells in random order, at random times that keep their distance; onsets on whole milliseconds.
fn events(random: &mut ChaCha8Rng) -> Vec<Event> {
    let mut labels = [vec!["buoy"; BUOYS], vec!["swell"; SWELLS]].concat();
    labels.shuffle(random);
    let spare_s = SECONDS - 2.0 * MARGIN_S - APART_S * (labels.len() - 1) as f64;
    let mut waits: Vec<f64> = labels
        .iter()
        .map(|_| spare_s * random.random::<f64>())
        .collect();
    waits.sort_by(f64::total_cmp);
    labels
        .into_iter()
        .zip(waits)
        .enumerate()
        .map(|(i, (label, wait_s))| Event {
            onset_s: ((MARGIN_S + APART_S * i as f64 + wait_s) * 1000.0).round() / 1000.0,
            duration_s: 0.0,
            label: label.to_owned(),
        })
        .collect()
}

/// What the channels pick up, `channels × samples` in µV.
struct Scalp(Vec<Vec<f64>>);

impl Scalp {
    fn new() -> Self {
        Scalp(vec![vec![0.0; COUNT]; CHANNELS.len()])
    }
    fn add(&mut self, pattern: &[f64], course: &[f64]) {
        for (channel, weight) in self.0.iter_mut().zip(pattern) {
            for (sample, value) in channel.iter_mut().zip(course) {
                *sample += weight * value;
            }
        }
    }
    fn rounded(self) -> Vec<Vec<f32>> {
        let round = |x: f64| ((x * STEPS_A_MICROVOLT).round() / STEPS_A_MICROVOLT) as f32;
        let channels = self.0.into_iter();
        channels
            .map(|channel| channel.into_iter().map(round).collect())
            .collect()
    }
}

fn index(name: &str) -> usize {
    CHANNELS.iter().position(|c| c.0 == name).unwrap_or(0)
}

fn source(name: &str, hz: Option<f64>, pattern: Vec<f64>, course: &[f64]) -> Pattern {
    Pattern {
        name: name.to_owned(),
        hz,
        pattern,
        filter: Vec::new(),
        course: course.iter().map(|&x| x as f32).collect(),
    }
}

/// A source that goes on whatever happens: place, amplitude in µV, frequency and width.
struct Ongoing {
    down_deg: f64,
    round_deg: f64,
    microvolts: f64,
    hz: f64,
    width_hz: f64,
    /// Shares this part of its wave with the planted rhythm of the same band.
    shared: f64,
}

const NEAR_STRONGER: [Ongoing; 2] = [
    Ongoing {
        down_deg: 42.0,
        round_deg: 85.0,
        microvolts: 3.0,
        hz: 20.0,
        width_hz: 3.0,
        shared: 0.4,
    },
    Ongoing {
        down_deg: 40.0,
        round_deg: -60.0,
        microvolts: 2.5,
        hz: 18.5,
        width_hz: 4.0,
        shared: 0.3,
    },
];
const NEAR_WEAKER: [Ongoing; 3] = [
    Ongoing {
        down_deg: 70.0,
        round_deg: 140.0,
        microvolts: 6.0,
        hz: 9.6,
        width_hz: 1.6,
        shared: 0.4,
    },
    Ongoing {
        down_deg: 62.0,
        round_deg: -135.0,
        microvolts: 5.0,
        hz: 9.9,
        width_hz: 1.6,
        shared: 0.3,
    },
    Ongoing {
        down_deg: 40.0,
        round_deg: -95.0,
        microvolts: 4.0,
        hz: 11.2,
        width_hz: 2.0,
        shared: 0.2,
    },
];

/// The two rhythms that the buoys change, and the ongoing ones that overlap them.
fn plant(seed: u64, buoys: &[f64], scalp: &mut Scalp) -> (Pattern, Pattern) {
    let random = &mut stream(seed, streams::STRONGER);
    let wave = rhythm(random, RATE_HZ, COUNT, 21.0, 2.5);
    let level = level(random, buoys, STRONGER_RISE, 0.35);
    let pattern_21 = pattern(&[Dipole::outward(point(0.78, 30.0, -126.0))]);
    let course_21 = at_level(&wave, &level, STRONGER_MICROVOLTS);
    scalp.add(&pattern_21, &course_21);
    ongoing(seed, streams::ONGOING, &NEAR_STRONGER, &wave, scalp);

    let random = &mut stream(seed, streams::WEAKER);
    let wave = rhythm(random, RATE_HZ, COUNT, 10.5, 1.8);
    let level = self::level(random, buoys, WEAKER_FALL, 0.25);
    let pattern_10 = pattern(&[Dipole::outward(point(0.74, 82.0, 180.0))]);
    let course_10 = at_level(&wave, &level, WEAKER_MICROVOLTS);
    scalp.add(&pattern_10, &course_10);
    ongoing(seed, streams::ONGOING + 10, &NEAR_WEAKER, &wave, scalp);

    (
        source(
            "21 Hz rhythm that grows after buoy",
            Some(21.0),
            pattern_21,
            &course_21,
        ),
        source(
            "10.5 Hz rhythm that falls after buoy",
            Some(10.5),
            pattern_10,
            &course_10,
        ),
    )
}

/// Amplitude of the 21 Hz rhythm before a buoy, and the factor by which it grows in a middling trial.
const STRONGER_MICROVOLTS: f64 = 4.2;
const STRONGER_RISE: f64 = 1.75;
/// Amplitude of the 10.5 Hz rhythm before a buoy, and the factor to which it falls in a middling trial.
const WEAKER_MICROVOLTS: f64 = 10.0;
const WEAKER_FALL: f64 = 0.54;

/// An amplitude over time that is 1 and, after each buoy, about `factor`; its logarithm varies over trials by `spread`.
fn level(random: &mut ChaCha8Rng, buoys: &[f64], factor: f64, spread: f64) -> Vec<f64> {
    let mut level = vec![1.0; COUNT];
    for &onset_s in buoys {
        let change = factor * (spread * normal(random)).exp() - 1.0;
        let from = ((onset_s + EFFECT_S[0] - RAMP_S) * RATE_HZ).max(0.0) as usize;
        let to = (((onset_s + EFFECT_S[1] + RAMP_S) * RATE_HZ) as usize).min(COUNT);
        for (i, value) in level.iter_mut().enumerate().take(to).skip(from) {
            let t_s = i as f64 / RATE_HZ - onset_s;
            let come = smooth_step((t_s - EFFECT_S[0]) / RAMP_S + 0.5);
            let go = smooth_step((t_s - EFFECT_S[1]) / RAMP_S + 0.5);
            *value += change * (come - go);
        }
    }
    level
}

fn at_level(wave: &[f64], level: &[f64], microvolts: f64) -> Vec<f64> {
    wave.iter()
        .zip(level)
        .map(|(wave, level)| microvolts * level * wave)
        .collect()
}

fn ongoing(seed: u64, first_stream: u64, sources: &[Ongoing], wave: &[f64], scalp: &mut Scalp) {
    for (i, s) in sources.iter().enumerate() {
        let random = &mut stream(seed, first_stream + i as u64);
        let own = rhythm(random, RATE_HZ, COUNT, s.hz, s.width_hz);
        let rest = (1.0 - s.shared * s.shared).sqrt();
        let course: Vec<f64> = own
            .iter()
            .zip(wave)
            .map(|(own, wave)| s.microvolts * (rest * own + s.shared * wave))
            .collect();
        let dipole = Dipole::outward(point(0.72, s.down_deg, s.round_deg));
        scalp.add(&pattern(&[dipole]), &course);
    }
}

/// Many sources of 1/f activity anywhere in the head, pointing anywhere.
fn background(seed: u64, scalp: &mut Scalp) {
    const SOURCES: u64 = 60;
    const MICROVOLTS: f64 = 1.5;
    for number in 0..SOURCES {
        let random = &mut stream(seed, streams::BACKGROUND + number);
        let radius = 0.15 + 0.4 * random.random::<f64>();
        let down_deg = 115.0 * random.random::<f64>().sqrt();
        let at = point(radius, down_deg, 360.0 * random.random::<f64>());
        let moment = [0; 3].map(|_| normal(random));
        let course: Vec<f64> = one_over_f(random, RATE_HZ, COUNT)
            .into_iter()
            .map(|x| MICROVOLTS * x)
            .collect();
        scalp.add(&pattern(&[Dipole { at, moment }]), &course);
    }
}

/// Blinks, jaw muscle, mains: large, and blind to the buoys.
fn nuisances(seed: u64, scalp: &mut Scalp) -> Vec<Pattern> {
    let eye = |round_deg| Dipole {
        at: point(0.93, 104.0, round_deg),
        moment: [0.0, 0.3, 1.0],
    };
    let blink = pattern(&[eye(-19.0), eye(19.0)]);
    let blinks = bursts(
        &mut stream(seed, streams::BLINKS),
        4.2,
        [0.28, 0.4],
        |_, u| bump(u),
        130.0,
    );
    scalp.add(&blink, &blinks);
    let mut all = vec![source("blinks", None, blink, &blinks)];

    for (side, name, round_deg, microvolts) in [
        (0, "left jaw muscle", -86.0, 34.0),
        (1, "right jaw muscle", 86.0, 28.0),
    ] {
        let random = &mut stream(seed, streams::JAW);
        let noise = &mut stream(seed, streams::JAW + 10 + side);
        let mut last = 0.0;
        let roar = move |_: &mut ChaCha8Rng, u: f64| {
            let white = normal(noise);
            let rough = white - 0.6 * last;
            last = white;
            rough * smooth_step(4.0 * u) * smooth_step(4.0 * (1.0 - u))
        };
        let course = bursts(random, 6.0, [0.5, 1.3], roar, microvolts);
        let jaw = pattern(&[Dipole::outward(point(0.86, 92.0, round_deg))]);
        scalp.add(&jaw, &course);
        all.push(source(name, None, jaw, &course));
    }
    all.push(mains(seed, scalp));
    all
}

/// Bursts at random times, a mean of `every_s` apart, of random length and size.
fn bursts(
    random: &mut ChaCha8Rng,
    every_s: f64,
    seconds: [f64; 2],
    mut shape: impl FnMut(&mut ChaCha8Rng, f64) -> f64,
    microvolts: f64,
) -> Vec<f64> {
    let mut course = vec![0.0; COUNT];
    let mut start_s = 0.0;
    loop {
        start_s += every_s * (0.4 + 1.2 * random.random::<f64>());
        let length_s = seconds[0] + (seconds[1] - seconds[0]) * random.random::<f64>();
        let size = microvolts * (0.3 * normal(random)).exp();
        let from = (start_s * RATE_HZ) as usize;
        let count = (length_s * RATE_HZ) as usize;
        if from + count >= COUNT {
            return course;
        }
        for i in 0..count {
            course[from + i] += size * shape(random, i as f64 / count as f64);
        }
    }
}

/// 50 Hz with a little of its third harmonic, strongest at a loose electrode.
fn mains(seed: u64, scalp: &mut Scalp) -> Pattern {
    const MICROVOLTS: f64 = 24.0;
    let random = &mut stream(seed, streams::MAINS);
    let mut weights: Vec<f64> = CHANNELS
        .iter()
        .map(|_| 0.05 + 0.12 * random.random::<f64>())
        .collect();
    weights[index("P8")] = 1.0;
    let slow = one_over_f(random, RATE_HZ, COUNT / 250);
    let course: Vec<f64> = (0..COUNT)
        .map(|i| {
            let turn = TAU * 50.0 * i as f64 / RATE_HZ;
            let size = MICROVOLTS * (1.0 + 0.05 * slow[(i / 250).min(slow.len() - 1)]);
            size * turn.sin()
        })
        .collect();
    scalp.add(&weights, &course);
    source("mains", Some(50.0), weights, &course)
}

/// Noise of every sensor, and the drift of one.
fn sensors(seed: u64, scalp: &mut Scalp) {
    const MICROVOLTS: f64 = 0.6;
    const DRIFT_MICROVOLTS: f64 = 140.0;
    let random = &mut stream(seed, streams::SENSORS);
    for channel in &mut scalp.0 {
        for sample in channel {
            *sample += MICROVOLTS * normal(random);
        }
    }
    let random = &mut stream(seed, streams::DRIFT);
    let keep = (-TAU * 0.01 / RATE_HZ).exp();
    let feed = DRIFT_MICROVOLTS * (1.0 - keep * keep).sqrt();
    let mut drift = DRIFT_MICROVOLTS * normal(random);
    for sample in &mut scalp.0[index("T7")] {
        drift = keep * drift + feed * normal(random);
        *sample += drift;
    }
}

fn covariance(samples: &[Vec<f32>]) -> DMatrix<f64> {
    let centred: Vec<Vec<f64>> = samples
        .iter()
        .map(|channel| {
            let mean = channel.iter().map(|&x| f64::from(x)).sum::<f64>() / COUNT as f64;
            channel.iter().map(|&x| f64::from(x) - mean).collect()
        })
        .collect();
    DMatrix::from_fn(samples.len(), samples.len(), |i, j| {
        if j > i {
            return 0.0;
        }
        let products = centred[i].iter().zip(&centred[j]).map(|(x, y)| x * y);
        products.sum::<f64>() / (COUNT - 1) as f64
    })
}

/// w = P⁻¹a / (aᵀP⁻¹a); P's lower triangle is read.
fn filter(covariance: &DMatrix<f64>, pattern: &[f64]) -> Vec<f64> {
    let a = DVector::from_column_slice(pattern);
    let Some(cholesky) = covariance.clone().cholesky() else {
        return Vec::new();
    };
    let w = cholesky.solve(&a);
    let gain = a.dot(&w);
    w.iter().map(|w| w / gain).collect()
}
