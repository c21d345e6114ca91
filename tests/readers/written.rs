//! What is written as EDF+ is read again.
use super::{events, read_twice};
use teasel_core::error::Kind;
use teasel_core::recording::{Channel, Event, Recording, Stretch, edf};
use teasel_tests::Lcg;

pub(super) fn recording(
    rate_hz: f64,
    stretches: &[(usize, f64)],
    channels: &[(&str, &str)],
    value: impl Fn(usize, usize) -> f32,
) -> Recording {
    let count = stretches.iter().map(|s| s.0).sum();
    let mut first = 0;
    Recording {
        rate_hz,
        channels: channels
            .iter()
            .map(|&(name, unit)| Channel {
                name: name.to_owned(),
                unit: unit.to_owned(),
                position: None,
            })
            .collect(),
        samples: (0..channels.len())
            .map(|c| (0..count).map(|i| value(c, i)).collect())
            .collect(),
        stretches: stretches
            .iter()
            .map(|&(count, onset_s)| {
                first += count;
                Stretch {
                    first: first - count,
                    count,
                    onset_s,
                }
            })
            .collect(),
        ..Recording::default()
    }
}

pub(super) fn event(onset_s: f64, duration_s: f64, label: &str) -> Event {
    Event {
        onset_s,
        duration_s,
        label: label.to_owned(),
    }
}

type Write = fn(&Recording, &edf::Identity) -> teasel_core::error::Result<Vec<u8>>;

pub(super) fn again_as(recording: &Recording, write: Write) -> Recording {
    let bytes = write(recording, &edf::Identity::default()).unwrap_or_else(|p| panic!("{p}"));
    read_twice("again", &bytes)
}

fn again(recording: &Recording) -> Recording {
    again_as(recording, edf::write)
}

#[test]
fn samples_on_a_decimal_grid_come_back_exactly() {
    let channels = [
        ("whole", "µV"),
        ("tenths", "µV"),
        ("hundredths", "fT"),
        ("zero", "mm"),
    ];
    let steps = [1.0, 10.0, 100.0, 1.0];
    let mut before = recording(250.0, &[(1000, 0.0)], &channels, |c, i| {
        let digital = [(i * 37 % 60_000) as i32 - 30_000, 0][usize::from(c == 3)];
        (f64::from(digital) / steps[c]) as f32
    });
    before.events = vec![
        event(0.5, 0.0, "buoy"),
        event(1.0 / 3.0, 0.1, "Boje → 灯"),
        event(-0.25, 0.0, "before"),
    ];
    let after = again(&before);
    assert_eq!(after.samples, before.samples);
    assert_eq!(after.channels, before.channels);
    assert_eq!(after.rate_hz, 250.0);
    assert_eq!(after.stretches, before.stretches);
    assert_eq!(
        events(&after),
        [
            (-0.25, 0.0, "before"),
            (1.0 / 3.0, 0.1, "Boje → 灯"),
            (0.5, 0.0, "buoy")
        ]
    );
    assert!(after.warnings.is_empty(), "{:?}", after.warnings);
}

#[test]
fn other_samples_come_back_within_half_a_step() {
    for size in [1e-13, 1e-3, 0.7, 250.0, 3e5, 3e6] {
        let mut random = Lcg(11);
        let values: Vec<f32> = (0..500)
            .map(|_| (size * (random.uniform() - 0.3)) as f32)
            .collect();
        let before = recording(100.0, &[(500, 0.0)], &[("A", "T")], |_, i| values[i]);
        let after = again(&before);
        // Rounding the limits outward to 8 characters, three figures at worst, widens the range by up to 2 %.
        let step = 1.02 * size / 65_535.0;
        for (x, y) in before.samples[0].iter().zip(&after.samples[0]) {
            assert!(
                f64::from((x - y).abs()) <= 0.51 * step,
                "{size:e}: {x} came back as {y}"
            );
        }
    }
}

#[test]
fn gaps_rates_and_starts_come_back() {
    for (rate_hz, stretches) in [
        (250.0, vec![(500, 0.0), (250, 7.5), (1000, 20.125)]),
        (250.0, vec![(501, 0.25)]),
        (487.5, vec![(975, 0.0), (1950, 60.0)]),
        (512.0, vec![(5 * 512 + 64, 0.125)]),
        (0.5, vec![(30, 0.0)]),
        (1000.0, vec![(7, 0.0)]),
    ] {
        let before = recording(rate_hz, &stretches, &[("A", "µV")], |_, i| {
            (i % 100) as f32
        });
        let after = again(&before);
        assert_eq!(after.stretches, before.stretches, "{rate_hz} Hz");
        assert_eq!(after.rate_hz, rate_hz);
        assert_eq!(after.samples, before.samples);
        assert_eq!(
            after.format,
            if stretches.len() == 1 {
                "EDF+C"
            } else {
                "EDF+D"
            }
        );
    }
}

#[test]
fn many_events_in_few_records() {
    let mut before = recording(10.0, &[(30, 0.0)], &[("A", "µV")], |_, i| i as f32);
    before.events = (0..500)
        .map(|i| event(1.0, 0.0, &format!("mark {i}")))
        .collect();
    let after = again(&before);
    assert_eq!(after.events, before.events);
}

#[test]
fn nobody_is_named_unless_asked() {
    let before = recording(10.0, &[(10, 0.0)], &[("A", "µV")], |_, i| i as f32);
    let bytes = edf::write(&before, &edf::Identity::default()).unwrap();
    assert_eq!(bytes[8..88].trim_ascii(), b"X X X X");
    assert_eq!(bytes[88..168].trim_ascii(), b"Startdate X X X X");
    assert_eq!(&bytes[168..184], b"01.01.8500.00.00");
    let named = edf::Identity {
        patient: "7 X X X".to_owned(),
        ..edf::Identity::default()
    };
    assert_eq!(
        edf::write(&before, &named).unwrap()[8..88].trim_ascii(),
        b"7 X X X"
    );
}

#[test]
fn what_edf_cannot_hold() {
    let refuse =
        |recording: &Recording| edf::write(recording, &edf::Identity::default()).unwrap_err();
    let good = recording(10.0, &[(10, 0.0)], &[("A", "µV")], |_, i| i as f32);
    let mut bad = good.clone();
    bad.samples[0][3] = f32::NAN;
    assert!(refuse(&bad).what.contains("\"A\""));
    let mut huge = good.clone();
    huge.samples[0][3] = 1e30;
    assert_eq!(refuse(&huge).kind, Kind::Unsupported);
    let odd = Recording {
        rate_hz: 33.3333,
        ..good.clone()
    };
    assert!(refuse(&odd).what.contains("33.3333"));
    assert_eq!(refuse(&Recording::default()).kind, Kind::Unsupported);
}
