//! A made-up sheet with plausible numbers, for tests and for looking at every figure.
use std::collections::BTreeMap;
use std::f64::consts::{PI, TAU};
use teasel_core::describe::positions::standard;
use teasel_core::recipe::{Contrast, EventWindow, Evidence, Filter, Keep, Measure, Recipe, Shrink};
use teasel_core::recording::{Channel, Event, Recording, Stretch};
use teasel_core::sheet::*;

/// A small linear congruential generator: the same sample every time.
pub struct Chance(u64);

impl Chance {
    pub fn even(&mut self) -> f64 {
        self.0 = self
            .0
            .wrapping_mul(6364136223846793005)
            .wrapping_add(1442695040888963407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }
    /// Nearly normal: the sum of twelve even numbers.
    pub fn normal(&mut self) -> f64 {
        (0..12).map(|_| self.even()).sum::<f64>() - 6.0
    }
}

const NAMES: [&str; 32] = [
    "Fp1", "Fp2", "AF3", "AF4", "F7", "F3", "Fz", "F4", "F8", "FC5", "FC1", "FC2", "FC6", "T7",
    "C3", "Cz", "C4", "T8", "CP5", "CP1", "CP2", "CP6", "P7", "P3", "Pz", "P4", "P8", "PO3", "PO4",
    "O1", "Oz", "O2",
];

/// A recording of `channels` channels, four minutes, with `trials` events, and everything known about it.
pub fn sheet(channels: usize, trials: usize) -> Sheet {
    let mut chance = Chance(7);
    let names: Vec<String> = (0..channels)
        .map(|i| {
            NAMES
                .get(i)
                .map_or(format!("E{}", i + 1), |n| (*n).to_owned())
        })
        .collect();
    let cards = names
        .iter()
        .enumerate()
        .map(|(i, name)| channel(i, name, channels, &mut chance));
    let cards: Vec<ChannelCard> = cards.collect();
    let used: Vec<String> = names.iter().filter(|n| *n != "T7").cloned().collect();
    let onsets: Vec<f64> = (0..trials)
        .map(|i| 3.0 + 234.0 * (i as f64 + 0.5 * chance.even()) / trials as f64)
        .collect();
    let swell: Vec<f64> = (0..20)
        .map(|i| 8.0 + 225.0 * (i as f64 + 0.6 * chance.even()) / 20.0)
        .collect();
    let window = |from_s, to_s| EventWindow::new("buoy", from_s, to_s);
    let mut stronger: Vec<Component> = [
        (2.83, 0.004, 21.0, "CP1"),
        (1.69, 0.034, 21.0, "C4"),
        (2.29, 0.079, 4.0, "Fp1"),
        (0.89, 0.952, 6.0, "Fp2"),
    ]
    .into_iter()
    .map(|spec| component(spec, &cards, &used, &onsets, 1.0, &mut chance))
    .collect();
    if let Some(first) = stronger.first_mut() {
        first.typical.interval = Some([2.33, 3.47]);
    }
    let weaker = [
        (0.35, 0.004, 10.5, "Oz"),
        (0.74, 0.251, 11.0, "CP5"),
        (0.91, 0.659, 3.0, "Fp1"),
    ]
    .into_iter()
    .map(|spec| component(spec, &cards, &used, &onsets, -1.0, &mut chance))
    .collect();
    let null: Vec<f64> = (0..1000)
        .map(|_| (0.22 + 0.12 * chance.normal().abs().powf(1.2)).exp())
        .collect();
    Sheet {
        recording: recording_card(&onsets, &swell, &mut chance),
        recipe: Recipe {
            filter: Filter {
                high_pass_hz: Some(3.0),
                low_pass_hz: Some(40.0),
                notch_hz: vec![50.0],
                resample_hz: None,
                ..Filter::default()
            },
            keep: Keep::Number(12),
            measure: Measure::Typical,
            shrink: Shrink::default(),
            components: 4,
            evidence: Evidence::default(),
            ..Recipe::asking(Contrast::Windows {
                signal: window(0.2, 1.0),
                reference: window(-1.0, -0.2),
            })
        },
        preparation: Some(PreparationCard {
            rate_hz: 250.0,
            channels: used.clone(),
            rank: used.len() - 1,
            longest_filter_s: 1.0,
            filters: Vec::new(),
            before_filters: Vec::new(),
            ranks: Vec::new(),
            response: None,
        }),
        channels: cards,
        quality: None,
        windows: None,
        rejection: None,
        dimensions: None,
        principal: Vec::new(),
        compression: Some(compression(used.len() - 1)),
        curve: Some(curve(used.len() - 1, &mut chance)),
        leading: teasel_core::sheet::End::Stronger,
        shrinkage: Some(0.1),
        folds: folds(&stronger),
        compare: comparators(),
        stronger,
        weaker,
        held_back: None,
        permutation: Some(Permutation {
            measure: Measure::Typical,
            asked: 1000,
            done: 1000,
            distinct: None,
            exact: false,
            null: String::new(),
            smallest: null.iter().map(|v| 1.0 / v).collect(),
            largest: null,
            observed_stronger: vec![2.54, 1.84, 1.66, 1.2],
            observed_weaker: vec![0.4, 0.7, 0.8],
        }),
        warnings: Vec::new(),
    }
}

fn channel(i: usize, name: &str, of: usize, chance: &mut Chance) -> ChannelCard {
    let spiral = |k: usize| {
        let z = 1.0 - 1.1 * (k as f64 + 0.5) / of as f64;
        let (r, turn) = ((1.0 - z * z).sqrt(), 2.399963 * k as f64);
        [r * turn.cos(), r * turn.sin(), z]
    };
    let state = match name {
        "T7" => ChannelState::LeftOut,
        "P8" => ChannelState::NeedsALook("50 Hz stands 24 dB above its neighbours".into()),
        "FC6" => ChannelState::Interpolated,
        _ => ChannelState::Used,
    };
    let front = if name.starts_with("Fp") { 3.0 } else { 1.0 };
    let sd = if name == "T7" {
        58.0
    } else {
        3.4 * front * (0.25 * chance.normal()).exp()
    };
    ChannelCard {
        name: name.to_owned(),
        unit: "µV".into(),
        sd: Some(sd),
        mains_db: Some(if name == "P8" {
            24.0
        } else {
            5.0 + 2.5 * chance.normal()
        }),
        mains_hz: Some(50.0),
        state,
        position: if i < NAMES.len() {
            standard(name)
        } else {
            Some(spiral(i))
        },
    }
}

fn recording_card(onsets: &[f64], swell: &[f64], chance: &mut Chance) -> RecordingCard {
    let hill = |i: usize| 6.0 + 5.0 * (-((i as f64 - 180.0) / 40.0).powi(2)).exp();
    let envelope = (0..444)
        .map(|i| hill(i) + 2.0 * chance.even() + 6.0 * f64::from(chance.even() > 0.93))
        .collect();
    let labels = [("buoy", onsets), ("swell", swell)];
    RecordingCard {
        name: "night-watch.edf".into(),
        format: "EDF+D".into(),
        rate_hz: 250.0,
        duration_s: 236.0,
        stretches: vec![
            Stretch {
                first: 0,
                count: 29_500,
                onset_s: 0.0,
            },
            Stretch {
                first: 29_500,
                count: 29_500,
                onset_s: 122.0,
            },
        ],
        others: Vec::new(),
        events: labels
            .iter()
            .map(|(l, o)| ((*l).to_owned(), o.len()))
            .collect(),
        event_onsets_s: labels
            .iter()
            .map(|(l, o)| ((*l).to_owned(), o.to_vec()))
            .collect(),
        layout: teasel_core::recording::Layout::default(),
        about: teasel_core::recording::About::default(),
        side_files: Vec::new(),
        warnings: Vec::new(),
        envelope,
    }
}

fn compression(rank: usize) -> CompressionCard {
    let eigenvalues: Vec<f64> = (0..rank + 1)
        .map(|i| 900.0 * (-0.9 * (i as f64).powf(0.62)).exp())
        .collect();
    let kept = 12.min(rank);
    let share = eigenvalues[..kept].iter().sum::<f64>() / eigenvalues.iter().sum::<f64>();
    CompressionCard {
        kept,
        rank,
        eigenvalues,
        share,
        guides: BTreeMap::new(),
    }
}

fn curve(rank: usize, chance: &mut Chance) -> KeepCurve {
    let keep: Vec<usize> = (2..=rank).collect();
    let rise = |c: usize| 1.0 + 1.75 * (1.0 - (-(c as f64 - 1.0) / 3.0).exp());
    KeepCurve {
        fitted: keep
            .iter()
            .map(|c| rise(*c) * (1.0 + 0.025 * *c as f64))
            .collect(),
        held_out: keep
            .iter()
            .map(|c| rise(*c) * (1.0 + 0.02 * chance.normal()))
            .collect(),
        log_se: keep.iter().map(|c| 0.09 + 0.3 / *c as f64).collect(),
        keep,
    }
}

fn component(
    (ratio, p, hz, at): (f64, f64, f64, &str),
    cards: &[ChannelCard],
    used: &[String],
    onsets: &[f64],
    sign: f64,
    chance: &mut Chance,
) -> Component {
    let place = |name: &str| {
        cards
            .iter()
            .find(|c| c.name == name)
            .and_then(|c| c.position)
    };
    let centre = place(at).unwrap_or([0.0, 0.0, 1.0]);
    let near = |name: &String| {
        let p = place(name).unwrap_or([0.0; 3]);
        p.iter().zip(centre).map(|(a, b)| a * b).sum::<f64>()
    };
    let pattern: Vec<f64> = used
        .iter()
        .map(|n| 1.9 * (4.0 * (near(n) - 1.0)).exp() - 0.5 * (-near(n)).max(-0.2))
        .collect();
    let filter: Vec<f64> = used.iter().map(|_| 0.1 * chance.normal()).collect();
    let held = f64::ln(ratio);
    let trials = onsets.iter().enumerate().map(|(i, onset)| TrialScore {
        onset_s: *onset,
        fold: i * 5 / onsets.len(),
        log_ratio: held + 0.5 * chance.normal() + 0.25 * (i as f64 / onsets.len() as f64 - 0.5),
    });
    let trials: Vec<TrialScore> = trials.collect();
    Component {
        typical: TypicalRatio {
            fitted: ratio * 1.1,
            held_out: Some(ratio),
            interval: Some([ratio / 1.4, ratio * 1.4]),
        },
        total: TotalRatio {
            fitted: ratio * 1.2,
            held_out: Some(ratio * 1.05),
            folds: vec![ratio * 0.8, ratio, ratio * 1.1],
        },
        p: Some(p),
        filter_raw: filter.clone(),
        filter,
        pattern,
        largest_at: at.to_owned(),
        peak_hz: Some(hz),
        stability: Some(0.95),
        places_changed: Some(0),
        trials,
        spectra: Some(spectra(hz, ratio, chance)),
        course: Some(course(held, sign, onsets.len(), chance)),
        image: Some(image(held, onsets.len(), chance)),
    }
}

fn spectra(peak: f64, ratio: f64, chance: &mut Chance) -> Spectra {
    let hz: Vec<f64> = (0..126).map(|i| i as f64).collect();
    let base = |f: f64| 10f64.powf(-(24.0 + 6.0 * (f / 3.0 + 0.1).ln().max(0.0)) / 10.0);
    let bump = |f: f64| (-((f - peak) / 2.4).powi(2)).exp() * 0.1;
    let mut noise = || 10f64.powf(0.07 * chance.normal());
    let reference: Vec<f64> = hz.iter().map(|f| (base(*f) + bump(*f)) * noise()).collect();
    let signal: Vec<f64> = hz
        .iter()
        .map(|f| (base(*f) + bump(*f) * ratio * 1.3) * noise())
        .collect();
    let times = |v: &[f64], k: f64| v.iter().map(|x| x * k).collect::<Vec<f64>>();
    Spectra {
        signal_low: times(&signal, 0.75),
        signal_high: times(&signal, 1.33),
        reference_low: times(&reference, 0.75),
        reference_high: times(&reference, 1.33),
        hz,
        signal,
        reference,
        segment: 250,
    }
}

fn course(height: f64, sign: f64, trials: usize, chance: &mut Chance) -> Course {
    let t_s: Vec<f64> = (0..300).map(|i| -1.4 + 0.01 * i as f64).collect();
    let phase = TAU * chance.even();
    let mean_db: Vec<f64> = t_s
        .iter()
        .map(|t| {
            6.0 * height.abs() * sign * (-((t - 0.56) / 0.35).powi(2)).exp()
                + 0.7 * (4.0 * t + phase).sin()
        })
        .collect();
    let average: Vec<f64> = t_s
        .iter()
        .map(|t| 0.5 * (TAU * 4.0 * t).sin() * (-(t - 0.3).powi(2) / 0.05).exp())
        .collect();
    let plus = |v: &[f64], k: f64| v.iter().map(|x| x + k).collect::<Vec<f64>>();
    Course {
        event: "buoy".into(),
        low_db: plus(&mean_db, -1.1),
        high_db: plus(&mean_db, 1.1),
        mean_db,
        average_low: plus(&average, -0.15),
        average_high: plus(&average, 0.15),
        average,
        t_s,
        smoothing_s: 0.2,
        trials,
    }
}

fn image(height: f64, trials: usize, chance: &mut Chance) -> TrialImage {
    let t_s: Vec<f64> = (0..150).map(|i| -1.39 + 0.02 * i as f64).collect();
    let row = |_| {
        let (a, b) = (TAU * chance.even(), TAU * chance.even());
        let gain = 5.0 * height + 2.0 * chance.normal();
        let at = |t: &f64| {
            gain * (-((t - 0.56) / 0.35).powi(2)).exp()
                + 4.0 * (6.0 * t + a).sin() * (11.0 * t + b).sin()
        };
        t_s.iter().map(|t| at(t) as f32).collect()
    };
    let db = (0..trials).map(row).collect();
    TrialImage { t_s, db }
}

fn folds(stronger: &[Component]) -> Vec<FoldCard> {
    let trials = stronger.first().map_or(&[][..], |c| &c.trials);
    (0..5)
        .map(|k| {
            let mine: Vec<f64> = trials
                .iter()
                .filter(|t| t.fold == k)
                .map(|t| t.log_ratio)
                .collect();
            FoldCard {
                trials: mine.len(),
                ratio: (mine.iter().sum::<f64>() / mine.len().max(1) as f64).exp(),
            }
        })
        .collect()
}

fn comparators() -> Vec<Comparator> {
    let one = |kind, chosen: Option<&str>, n, share, ratio: f64, interval| Comparator {
        kind,
        chosen: chosen.map(str::to_owned),
        chosen_in_folds: n,
        share,
        typical: TypicalRatio {
            fitted: ratio * 1.1,
            held_out: Some(ratio),
            interval: Some(interval),
        },
        total: TotalRatio {
            fitted: ratio,
            held_out: Some(ratio),
            folds: vec![ratio * 0.9, ratio * 1.1],
        },
    };
    vec![
        one(
            ComparatorKind::FirstPc,
            None,
            None,
            Some(0.72),
            1.38,
            [0.69, 2.7],
        ),
        one(
            ComparatorKind::BestPc,
            Some("3"),
            Some(5),
            Some(0.06),
            1.74,
            [1.48, 2.05],
        ),
        one(
            ComparatorKind::BestChannel,
            Some("Cz"),
            Some(3),
            None,
            1.59,
            [0.84, 2.85],
        ),
    ]
}

/// Four minutes of noise with a blink now and then and a gap of four seconds in the middle.
pub fn recording(channels: usize) -> Recording {
    let mut chance = Chance(11);
    let n = 59_000;
    let name = |i: usize| {
        NAMES
            .get(i)
            .map_or(format!("E{}", i + 1), |s| (*s).to_owned())
    };
    let line = |i: usize| -> Vec<f32> {
        let mut last = 0.0;
        let hz = 8.0 + 0.3 * i as f64;
        (0..n)
            .map(|s| {
                last = 0.95 * last + chance.normal();
                let t = s as f64 / 250.0;
                let blink = if i < 2 {
                    90.0 * (-((t % 2.7 - 1.3) / 0.09).powi(2)).exp()
                } else {
                    0.0
                };
                (last + 2.0 * (TAU * hz * t + PI * i as f64).sin() + blink) as f32
            })
            .collect()
    };
    Recording {
        name: "night-watch.edf".into(),
        format: "EDF+D".into(),
        rate_hz: 250.0,
        samples: (0..channels).map(line).collect(),
        channels: (0..channels)
            .map(|i| Channel {
                name: name(i),
                unit: "µV".into(),
                position: standard(&name(i)),
            })
            .collect(),
        stretches: vec![
            Stretch {
                first: 0,
                count: 29_500,
                onset_s: 0.0,
            },
            Stretch {
                first: 29_500,
                count: 29_500,
                onset_s: 122.0,
            },
        ],
        events: (0..40)
            .map(|i| Event {
                onset_s: 5.9 * i as f64 + 3.0,
                duration_s: 0.0,
                label: if i % 3 == 1 { "swell" } else { "buoy" }.into(),
            })
            .collect(),
        ..Recording::default()
    }
}
