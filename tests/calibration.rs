//! How often the permutation test finds what is not there.
//!
//! Recordings of noise alone, events at random: p is uniform when the test is right, so the rate of p ≤ 0.05 has to lie in the
//! binomial interval around 0.05. The test suite runs a small form, `cargo xtask bench --null` the full one.
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, StandardNormal, StandardUniform};
use teasel_core::analysis::Analysis;
use teasel_core::recipe::{
    BandReference, Contrast, ContrastKind, EventWindow, Evidence, Keep, Measure, Recipe, Shrink,
    ShrinkWord, Spans,
};
use teasel_core::recording::{Channel, Event, Recording, Stretch};

/// What the noise is like.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Noise {
    /// Independent samples, mixed over channels.
    White,
    /// Power falling as 1/f, mixed over channels: a sum of first-order processes an octave apart (Voss & Clarke 1978 sum such sources).
    Pink,
    /// As `Pink`, with one source, shared by all channels, that swells to twenty times its amplitude and falls again within 4 s (Hann),
    /// at random times, six a minute. Its spectrum stays that of the others above 1 Hz: a shared artefact that is slower than the
    /// rest, or lies in the band, is a difference and will be found.
    Artefact,
    /// As `White`, with a straight drift of random height in every channel over the whole recording: 20 standard deviations.
    Trend,
}

impl Noise {
    /// All of them.
    pub const ALL: [Noise; 4] = [Noise::White, Noise::Pink, Noise::Artefact, Noise::Trend];
    /// As the tables name it.
    pub fn name(self) -> &'static str {
        match self {
            Noise::White => "white",
            Noise::Pink => "1/f",
            Noise::Artefact => "artefact",
            Noise::Trend => "trend",
        }
    }
}

/// A recording of noise: `channels` at 100 Hz with `trials` events "tick" about 2 s apart.
pub fn null_recording(seed: u64, noise: Noise, channels: usize, trials: usize) -> Recording {
    const RATE_HZ: f64 = 100.0;
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let samples = (RATE_HZ * (2.0 * trials as f64 + 4.0)) as usize;
    let mut sources: Vec<Vec<f64>> = (0..channels)
        .map(|_| source(&mut rng, noise, samples))
        .collect();
    if noise == Noise::Artefact {
        swells(&mut rng, &mut sources[0], RATE_HZ);
    }
    let mut mixed: Vec<Vec<f32>> = (0..channels)
        .map(|_| {
            let weights: Vec<f64> = (0..channels)
                .map(|_| StandardNormal.sample(&mut rng))
                .collect();
            (0..samples)
                .map(|t| {
                    weights
                        .iter()
                        .zip(&sources)
                        .map(|(w, s)| w * s[t])
                        .sum::<f64>() as f32
                })
                .collect()
        })
        .collect();
    if noise == Noise::Trend {
        for channel in &mut mixed {
            let height: f64 = StandardNormal.sample(&mut rng);
            for (t, x) in channel.iter_mut().enumerate() {
                *x += (20.0 * height * t as f64 / samples as f64) as f32;
            }
        }
    }
    let mut events: Vec<Event> = (0..trials)
        .map(|k| {
            let jitter: f64 = StandardUniform.sample(&mut rng);
            Event {
                onset_s: 2.0 * k as f64 + 2.0 + 0.3 * jitter,
                duration_s: 0.0,
                label: "tick".into(),
            }
        })
        .collect();
    // Spans "calm" of random length, half of the time or so.
    let mut at = 1.0;
    while at < 2.0 * trials as f64 {
        let [length, gap]: [f64; 2] = [(); 2].map(|()| StandardUniform.sample(&mut rng));
        events.push(Event {
            onset_s: at,
            duration_s: 2.0 + 4.0 * length,
            label: "calm".into(),
        });
        at += 2.0 + 4.0 * length + 2.0 + 4.0 * gap;
    }
    events.sort_by(|a, b| a.onset_s.total_cmp(&b.onset_s));
    Recording {
        name: format!("null-{seed}"),
        format: "synthetic".into(),
        rate_hz: RATE_HZ,
        channels: (1..=channels)
            .map(|i| Channel {
                name: format!("X{i}"),
                unit: "µV".into(),
                position: None,
            })
            .collect(),
        samples: mixed,
        stretches: vec![Stretch {
            first: 0,
            count: samples,
            onset_s: 0.0,
        }],
        events,
        ..Recording::default()
    }
}

fn source(rng: &mut ChaCha8Rng, noise: Noise, samples: usize) -> Vec<f64> {
    match noise {
        Noise::White | Noise::Trend => (0..samples).map(|_| StandardNormal.sample(rng)).collect(),
        Noise::Pink | Noise::Artefact => {
            let mut out = vec![0.0; samples];
            for octave in 0..8 {
                let memory = 1.0 - 0.5f64.powi(octave + 1);
                let scale = (1.0 - memory * memory).sqrt();
                let mut state: f64 = StandardNormal.sample(rng);
                for x in &mut out {
                    *x += state;
                    let fresh: f64 = StandardNormal.sample(rng);
                    state = memory * state + scale * fresh;
                }
            }
            out
        }
    }
}

/// Twenty times the amplitude at the top of swells of 4 s at random times, six a minute.
fn swells(rng: &mut ChaCha8Rng, source: &mut [f64], rate_hz: f64) {
    let (length, count) = (
        (4.0 * rate_hz) as usize,
        source.len() as f64 / rate_hz / 10.0,
    );
    for _ in 0..count.ceil() as usize {
        let at: f64 = StandardUniform.sample(rng);
        let first = (at * (source.len() - length) as f64) as usize;
        for (i, x) in source[first..first + length].iter_mut().enumerate() {
            let phase = 2.0 * std::f64::consts::PI * i as f64 / length as f64;
            *x *= 1.0 + 19.0 * 0.5 * (1.0 - phase.cos());
        }
    }
}

/// The question put to every null recording, of windows around events.
pub fn null_recipe(measure: Measure, permutations: usize) -> Recipe {
    null_question(ContrastKind::Windows, measure, permutations)
}

/// The question of each kind put to every null recording.
pub fn null_question(kind: ContrastKind, measure: Measure, permutations: usize) -> Recipe {
    let window = |from_s, to_s| EventWindow::new("tick", from_s, to_s);
    let contrast = match kind {
        ContrastKind::Windows => Contrast::Windows {
            signal: window(0.0, 0.8),
            reference: window(-0.8, 0.0),
        },
        ContrastKind::Spans => Contrast::Spans {
            signal: Spans::Label("calm".into()),
            reference: Spans::rest(),
            piece_s: None,
        },
        ContrastKind::Band => Contrast::Band {
            centre_hz: 10.0,
            half_width_hz: 2.0,
            reference: BandReference::Flanks,
            within: None,
            piece_s: None,
        },
        ContrastKind::Repeatable => Contrast::Repeatable(window(0.0, 0.8)),
        ContrastKind::Slow => Contrast::Slow {
            lag_s: 0.02,
            within: None,
            piece_s: None,
        },
    };
    Recipe {
        keep: Keep::Number(6),
        measure,
        shrink: Shrink::Word(ShrinkWord::Auto),
        components: 1,
        evidence: Evidence {
            folds: 4,
            permutations,
            bootstrap: 0,
            seed: 1,
        },
        ..Recipe::asking(contrast)
    }
}

/// Of `count` null recordings from `first` on: how many reach p ≤ 0.05 at the stronger and at the weaker end.
pub fn rejections(
    first: u64,
    count: u64,
    kind: ContrastKind,
    noise: Noise,
    measure: Measure,
    permutations: usize,
) -> [u64; 2] {
    let mut hits = [0; 2];
    for seed in first..first + count {
        let mut recipe = null_question(kind, measure, permutations);
        if noise == Noise::Trend {
            // Without it a drift is what repeats, and what changes slowly: the page proposes it for the same reason.
            recipe.filter.high_pass_hz = Some(1.0);
        }
        let mut analysis = Analysis::new(null_recording(seed, noise, 8, 20), recipe).unwrap();
        analysis.run(|_| ()).unwrap();
        let sheet = analysis.sheet();
        for (hit, end) in hits.iter_mut().zip([&sheet.stronger, &sheet.weaker]) {
            *hit += u64::from(end.first().and_then(|c| c.p).is_some_and(|p| p <= 0.05));
        }
    }
    hits
}

/// The central 99 % of a binomial distribution (n, 0.05): smallest and largest count inside.
pub fn binomial_99(n: u64) -> [u64; 2] {
    let mut probability = 0.95f64.powi(n as i32);
    let (mut below, mut low, mut high) = (0.0, None, n);
    for k in 0..=n {
        let up_to = below + probability;
        if low.is_none() && up_to > 0.005 {
            low = Some(k);
        }
        if up_to >= 0.995 {
            high = k;
            break;
        }
        below = up_to;
        probability *= (n - k) as f64 / (k + 1) as f64 * 0.05 / 0.95;
    }
    [low.unwrap_or(0), high]
}
