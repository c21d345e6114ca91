//! BDF and BDF+ against pyEDFlib (`reference/make_bdf.py`), and what is written as BDF+ read again.
use super::written::{again_as, event, recording};
use super::{events, read_twice};
use serde_json::Value;
use teasel_core::recording::edf;
use teasel_tests::{Lcg, close, close_all, number, numbers, reference};

#[test]
fn samples_annotations_and_trigger_codes() {
    let all = reference("edf/bdf");
    let files = all["files"].as_array().unwrap();
    assert_eq!(files.len(), 2);
    for file in files {
        let name = file["file"].as_str().unwrap();
        let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/reference/edf");
        let recording = read_twice(name, &std::fs::read(format!("{folder}/{name}")).unwrap());
        let plus = file["reserved"] == "BDF+C";
        assert_eq!(recording.format, if plus { "BDF+C" } else { "BDF" });
        assert!(recording.warnings.is_empty(), "{:?}", recording.warnings);
        assert_eq!(recording.others[0].name, "Status");
        assert_eq!(recording.others[0].reason, "it holds trigger codes");
        for (signal, got) in file["signals"]
            .as_array()
            .unwrap()
            .iter()
            .zip(&recording.samples)
        {
            let factor = if signal["unit"] == "mV" { 1e3 } else { 1.0 };
            let got: Vec<f64> = got.iter().map(|&x| f64::from(x)).collect();
            assert_eq!(got.len() as f64, number(&signal["count"]));
            // A sample of 24 bits fits into the 24 of an f32, but for the gain and the offset: one unit in the last place of the largest.
            let rounding = 262_144.0 * f64::from(f32::EPSILON);
            let ends = [("first", &got[..20]), ("last", &got[got.len() - 20..])];
            for (key, part) in ends {
                let wanted: Vec<f64> = numbers(&signal[key]).iter().map(|x| x * factor).collect();
                close_all(name, part, &wanted, rounding);
            }
            let sum: f64 = got.iter().sum();
            close(
                name,
                sum,
                number(&signal["sum"]) * factor,
                rounding * got.len() as f64,
            );
        }
        let rate_hz = number(&file["rate_hz"]);
        let code = |c: &Value| (number(&c[0]) / rate_hz, 0.0, c[1].to_string());
        let text = |a: &Value| {
            (
                number(&a[0]),
                number(&a[1]),
                a[2].as_str().unwrap().to_owned(),
            )
        };
        let codes = file["codes"].as_array().unwrap();
        assert!(codes.len() > 3);
        let texts = file["annotations"].as_array().unwrap();
        let mut wanted: Vec<_> = codes
            .iter()
            .map(code)
            .chain(texts.iter().map(text))
            .collect();
        // Two at one time come in either order.
        wanted.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.2.cmp(&b.2)));
        let mut got = events(&recording);
        got.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.2.cmp(b.2)));
        for (got, wanted) in got.into_iter().zip(&wanted) {
            close(name, got.0, wanted.0, 1e-9);
            close(name, got.1, wanted.1, 1e-9);
            assert_eq!(got.2, wanted.2);
        }
        assert_eq!(recording.events.len(), wanted.len());
    }
}

#[test]
fn samples_on_a_decimal_grid_come_back_exactly() {
    let channels = [("whole", "µV"), ("tenths", "µV"), ("thousandths", "fT")];
    let mut before = recording(250.0, &[(500, 0.0), (250, 7.5)], &channels, |c, i| {
        let digital = (i as i32 * 7919 % 1_900_000) - 950_000;
        (f64::from(digital) / [1.0, 10.0, 1000.0][c]) as f32
    });
    before.events = vec![event(0.5, 0.0, "buoy"), event(8.0, 0.25, "灯")];
    let after = again_as(&before, edf::write_24_bit);
    assert_eq!(after.format, "BDF+D");
    assert_eq!(after.samples, before.samples);
    assert_eq!(after.stretches, before.stretches);
    assert_eq!(after.events, before.events);
}

#[test]
fn other_samples_come_back_within_half_a_step_or_their_own_precision() {
    let mut random = Lcg(13);
    let values: Vec<f32> = (0..500)
        .map(|_| (250.0 * (random.uniform() - 0.3)) as f32)
        .collect();
    let before = recording(100.0, &[(500, 0.0)], &[("A", "µV")], |_, i| values[i]);
    let after = again_as(&before, edf::write_24_bit);
    let step = 1.02 * 250.0 / 16_777_215.0 + 175.0 * f64::from(f32::EPSILON);
    for (x, y) in before.samples[0].iter().zip(&after.samples[0]) {
        assert!(
            f64::from((x - y).abs()) <= 0.51 * step,
            "{x} came back as {y}"
        );
    }
}
