//! A sheet with plausible numbers, for checks of what is written from it.
use std::collections::BTreeMap;
use teasel_core::recipe::*;
use teasel_core::recording::{OtherChannel, Stretch};
use teasel_core::sheet::*;

pub const CHANNELS: [&str; 8] = ["Fp1", "Fz", "C3", "CP1", "C4", "Pz", "Oz", "T7"];

pub fn recipe() -> Recipe {
    Recipe {
        channels: Channels {
            leave_out: vec!["T7".into()],
            interpolate: vec![],
            reference: Reference::Word(ReferenceWord::Average),
            ..Channels::default()
        },
        filter: Filter {
            high_pass_hz: Some(1.0),
            low_pass_hz: Some(40.0),
            notch_hz: vec![50.0],
            resample_hz: None,
            ..Filter::default()
        },
        keep: Keep::Number(5),
        measure: Measure::Typical,
        shrink: Shrink::Word(ShrinkWord::Auto),
        components: 2,
        evidence: Evidence::default(),
        ..Recipe::asking(Contrast::Windows {
            signal: EventWindow::new("buoy", 0.2, 1.0),
            reference: EventWindow::new("buoy", -1.0, -0.2),
        })
    }
}

fn component(k: usize, typical: f64, total: f64, interval: [f64; 2], p: f64) -> Component {
    let wave = |n: usize, phase: f64| -> Vec<f64> {
        (0..n)
            .map(|c| ((c as f64 + 1.3) * (k as f64 + 0.7) + phase).sin() / 3.0)
            .collect()
    };
    let mut raw = wave(8, 0.1);
    raw[7] = 0.0;
    Component {
        typical: TypicalRatio {
            fitted: typical * 1.1,
            held_out: Some(typical),
            interval: Some(interval),
        },
        total: TotalRatio {
            fitted: total * 1.1,
            held_out: Some(total),
            folds: vec![total * 0.8, total, total * 1.2],
        },
        p: Some(p),
        filter: wave(7, 0.0),
        filter_raw: raw,
        pattern: wave(7, 0.5),
        largest_at: "CP1".into(),
        peak_hz: Some(21.0),
        stability: Some(0.99),
        places_changed: Some(0),
        trials: (0..40)
            .map(|t| TrialScore {
                onset_s: 3.0 + 5.5 * t as f64,
                fold: t / 8,
                log_ratio: typical.ln() + 1.2 * (t as f64 * 1.7).sin(),
            })
            .collect(),
        spectra: None,
        course: None,
        image: None,
    }
}

fn comparator(kind: ComparatorKind, chosen: &str, share: Option<f64>, ratio: f64) -> Comparator {
    Comparator {
        kind,
        chosen: Some(chosen.into()),
        chosen_in_folds: Some(5),
        share,
        typical: TypicalRatio {
            fitted: ratio * 1.05,
            held_out: Some(ratio),
            interval: Some([ratio * 0.8, ratio * 1.25]),
        },
        total: TotalRatio {
            fitted: ratio,
            held_out: Some(ratio * 0.95),
            folds: vec![],
        },
    }
}

fn card() -> RecordingCard {
    RecordingCard {
        name: "night-watch.edf".into(),
        format: "EDF+C".into(),
        rate_hz: 250.0,
        duration_s: 240.0,
        stretches: vec![Stretch {
            first: 0,
            count: 60_000,
            onset_s: 0.0,
        }],
        others: vec![OtherChannel {
            name: "Airflow".into(),
            unit: "au".into(),
            rate_hz: 25.0,
            reason: "sampled at 25 Hz, most channels at 250 Hz".into(),
        }],
        events: BTreeMap::from([("buoy".into(), 42), ("swell".into(), 20)]),
        event_onsets_s: BTreeMap::new(),
        layout: teasel_core::recording::Layout::default(),
        about: teasel_core::recording::About::default(),
        side_files: vec![],
        warnings: vec![],
        envelope: vec![10.0, 11.0, 52.0, 9.0, 10.0, 12.0],
    }
}

pub fn sheet() -> Sheet {
    Sheet {
        recording: card(),
        recipe: recipe(),
        channels: CHANNELS
            .iter()
            .map(|name| ChannelCard {
                name: (*name).into(),
                unit: "µV".into(),
                sd: Some(if *name == "T7" { 180.0 } else { 13.0 }),
                mains_db: Some(if *name == "Pz" { 17.0 } else { 3.0 }),
                mains_hz: Some(50.0),
                state: if *name == "T7" {
                    ChannelState::LeftOut
                } else {
                    ChannelState::Used
                },
                position: Some([0.0, 0.0, 1.0]),
            })
            .collect(),
        preparation: Some(PreparationCard {
            rate_hz: 250.0,
            channels: CHANNELS[..7].iter().map(|n| (*n).into()).collect(),
            rank: 6,
            longest_filter_s: 3.3,
            filters: vec![
                "high-pass 1 Hz, 1 Hz transition, 825 taps".into(),
                "low-pass 40 Hz, 10 Hz transition, 83 taps".into(),
            ],
            before_filters: Vec::new(),
            ranks: Vec::new(),
            response: None,
        }),
        quality: None,
        rejection: None,
        dimensions: None,
        principal: Vec::new(),
        windows: Some(WindowsCard {
            paired: true,
            signal: side(40, &[("outside", 1), ("partner", 1)]),
            reference: side(40, &[("outside", 1), ("partner", 1)]),
            trials: (0..42)
                .map(|t| Trial {
                    onset_s: 3.0 + 5.5 * t as f64,
                    event: "buoy".into(),
                    dropped: (t >= 40).then(|| "outside".into()),
                })
                .collect(),
        }),
        compression: Some(CompressionCard {
            kept: 5,
            rank: 6,
            eigenvalues: vec![400.0, 120.0, 33.0, 12.0, 6.0, 1.5, 1e-13],
            share: 0.991,
            guides: BTreeMap::from([
                ("share_95".into(), 3),
                ("one_standard_error".into(), 4),
                ("held_out_peak".into(), 5),
            ]),
        }),
        curve: Some(KeepCurve {
            keep: vec![2, 3, 4, 5, 6],
            fitted: vec![1.9, 2.4, 2.9, 3.1, 3.3],
            held_out: vec![1.6, 2.1, 2.7, 2.83, 2.8],
            log_se: vec![0.1; 5],
        }),
        leading: teasel_core::sheet::End::Stronger,
        shrinkage: Some(0.1),
        stronger: vec![
            component(0, 2.83, 3.06, [2.33, 3.47], 0.004),
            component(1, 1.2, 1.1, [0.9, 1.6], 0.4),
        ],
        weaker: vec![
            Component {
                peak_hz: Some(10.5),
                largest_at: "Oz".into(),
                ..component(2, 0.35, 0.36, [0.27, 0.46], 0.004)
            },
            component(3, 0.9, 0.92, [0.8, 1.03], 0.7),
        ],
        compare: vec![
            comparator(ComparatorKind::FirstPc, "1", Some(0.72), 1.38),
            comparator(ComparatorKind::BestPc, "3", Some(0.06), 1.74),
            comparator(ComparatorKind::BestChannel, "C3", None, 1.59),
        ],
        held_back: None,
        permutation: Some(Permutation {
            measure: Measure::Typical,
            asked: 1000,
            done: 1000,
            distinct: Some(2_f64.powi(40)),
            exact: false,
            null: "Within each trial the two windows could be exchanged.".into(),
            largest: (0..1000).map(|k| 1.2 + 0.9 * (k as f64 / 1000.0)).collect(),
            smallest: (0..1000).map(|k| 0.4 + 0.4 * (k as f64 / 1000.0)).collect(),
            observed_stronger: vec![2.9, 1.3],
            observed_weaker: vec![0.33, 0.9],
        }),
        folds: [2.4, 3.1, 2.6, 3.0, 2.7]
            .iter()
            .map(|r| FoldCard {
                trials: 8,
                ratio: *r,
            })
            .collect(),
        warnings: vec!["T7 was left out.".into()],
    }
}

fn side(used: usize, dropped: &[(&str, usize)]) -> SideCard {
    SideCard {
        used,
        dropped: dropped.iter().map(|(k, n)| ((*k).into(), *n)).collect(),
        samples: 200,
        seconds: 0.8,
    }
}

/// The same before anything is computed.
pub fn bare() -> Sheet {
    Sheet {
        preparation: None,
        windows: None,
        compression: None,
        curve: None,
        shrinkage: None,
        stronger: vec![],
        weaker: vec![],
        compare: vec![],
        permutation: None,
        folds: vec![],
        warnings: vec![],
        ..sheet()
    }
}

pub const HOSTILE: [&str; 9] = [
    "<script>alert(1)</script>",
    "=1+1",
    "\"quoted\", 'twice' & more",
    "F\u{202e}z\u{200f}",
    "@SUM(A1)",
    "-2+3",
    "🦔 hedgehog",
    "line\nbreak\tand tab",
    "x\u{0}y",
];

/// Every name a file could give, hostile: the k-th channel is `HOSTILE[k]`, the event is the first.
pub fn hostile() -> Sheet {
    let mut sheet = sheet();
    let long = "n".repeat(200);
    for (k, channel) in sheet.channels.iter_mut().enumerate() {
        channel.name = HOSTILE[k].into();
        channel.unit = "<b>V".into();
    }
    sheet.channels[6].name = long;
    let names: Vec<String> = sheet.channels.iter().map(|c| c.name.clone()).collect();
    if let Some(prepared) = &mut sheet.preparation {
        prepared.channels = names[..7].to_vec();
    }
    sheet.recording.name = "../<img src=x onerror=alert(1)>\u{202e}fde.edf".into();
    sheet.recording.events = BTreeMap::from([(HOSTILE[0].into(), 42), (HOSTILE[1].into(), 20)]);
    sheet.recording.others[0].name = HOSTILE[0].into();
    sheet.recording.others[0].reason = "</style><script>x</script>".into();
    sheet.recording.warnings = vec!["<svg onload=alert(1)>".into()];
    sheet.warnings = vec!["<svg onload=alert(1)>".into()];
    sheet.channels[5].state = ChannelState::NeedsALook("the same as <script>".into());
    let Contrast::Windows { signal, reference } = &mut sheet.recipe.contrast else {
        panic!("a contrast of event windows")
    };
    signal.event = HOSTILE[0].into();
    reference.event = HOSTILE[0].into();
    sheet.recipe.channels.leave_out = vec![names[7].clone()];
    for component in sheet.stronger.iter_mut().chain(&mut sheet.weaker) {
        component.largest_at = HOSTILE[0].into();
    }
    sheet.compare[2].chosen = Some(HOSTILE[1].into());
    sheet
}
