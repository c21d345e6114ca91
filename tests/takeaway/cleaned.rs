//! Cleaned recordings: what was removed is gone, what was not is as before, and the files open again.
use teasel_core::analysis::Analysis;
use teasel_core::demo::night_watch;
use teasel_core::recipe::{Keep, Measure, Recipe};
use teasel_core::recording::{MemorySource, OpenOptions, Recording, open};
use teasel_core::takeaway::{Cleaning, Form, Weights, clean, weights_json};

fn analysed(change: impl FnOnce(&mut Recipe)) -> Analysis {
    let demo = night_watch(1);
    let mut recipe = demo.recipe;
    recipe.keep = Keep::Number(16);
    recipe.components = 2;
    recipe.evidence.permutations = 0;
    recipe.evidence.bootstrap = 0;
    change(&mut recipe);
    let mut analysis = Analysis::new(demo.recording, recipe).unwrap();
    analysis.run(|_| {}).unwrap();
    analysis
}

/// wᵀX of a component in samples of the prepared channels.
fn series(filter: &[f64], samples: &[Vec<f32>]) -> Vec<f64> {
    let mut out = vec![0.0; samples[0].len()];
    for (w, channel) in filter.iter().zip(samples) {
        out.iter_mut()
            .zip(channel)
            .for_each(|(o, x)| *o += w * f64::from(*x));
    }
    out
}

fn power(values: &[f64]) -> f64 {
    let mean = values.iter().sum::<f64>() / values.len() as f64;
    values.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / values.len() as f64
}

fn reopened(bytes: Vec<u8>) -> Recording {
    open(
        Box::new(MemorySource::new("cleaned.edf", bytes)),
        Vec::new(),
        OpenOptions::default(),
    )
    .unwrap()
}

#[test]
fn a_removed_component_is_gone_and_the_others_stay() {
    let analysis = analysed(|_| {});
    let sheet = analysis.sheet();
    let before = analysis.series().unwrap();
    let cleaned = clean(
        &analysis,
        &["stronger 1".into(), "weaker-1".into()],
        Cleaning::Remove,
    )
    .unwrap();
    let filters: Vec<&Vec<f64>> = sheet
        .stronger
        .iter()
        .chain(&sheet.weaker)
        .map(|c| &c.filter)
        .collect();
    for (k, name) in before.names.iter().enumerate() {
        let after = series(filters[k], &cleaned.recording.samples);
        if name.ends_with('1') {
            // Samples are f32 (6e-8 of the largest channel); a component is a sum that cancels most of what is large.
            assert!(
                power(&after) < 1e-10 * power(&before.samples[k]),
                "{name}: {:e}",
                power(&after)
            );
        } else {
            let gap = after
                .iter()
                .zip(&before.samples[k])
                .map(|(a, b)| (a - b).powi(2))
                .sum::<f64>();
            let own = before.samples[k].iter().map(|b| b.powi(2)).sum::<f64>();
            assert!(
                (gap / own).sqrt() < 1e-6,
                "{name}: {:e}",
                (gap / own).sqrt()
            );
        }
    }
    assert!(cleaned.others < 1e-6, "{:e}", cleaned.others);
    // The share is most where the pattern is largest among channels of like size: it is positive at both peaks.
    for component in [&sheet.stronger[0], &sheet.weaker[0]] {
        let at = cleaned
            .shares
            .channels
            .iter()
            .position(|c| *c == component.largest_at)
            .unwrap();
        assert!(
            cleaned.shares.removed[at] > 0.02,
            "{}",
            cleaned.shares.removed[at]
        );
    }
}

#[test]
fn what_is_kept_alone_is_the_rest_of_what_is_removed() {
    let analysis = analysed(|_| {});
    let chosen = ["weaker 1".to_string()];
    let removed = clean(&analysis, &chosen, Cleaning::Remove).unwrap();
    let kept = clean(&analysis, &chosen, Cleaning::KeepOnly).unwrap();
    let prepared = analysis.prepared().unwrap();
    for (c, channel) in prepared.samples.iter().enumerate() {
        let size = channel.iter().fold(0.0_f32, |m, x| m.max(x.abs()));
        for (k, x) in channel.iter().enumerate() {
            let sum = removed.recording.samples[c][k] + kept.recording.samples[c][k];
            assert!((sum - x).abs() <= 4.0 * f32::EPSILON * size);
        }
    }
}

/// By the total measure components overlap in P: the removed ones are gone all the same, and how much the others change is said.
#[test]
fn by_the_total_measure_the_change_of_the_others_is_told() {
    let analysis = analysed(|recipe| recipe.measure = Measure::Total);
    let cleaned = clean(&analysis, &["stronger 1".into()], Cleaning::Remove).unwrap();
    let sheet = analysis.sheet();
    let before = analysis.series().unwrap();
    let gone = series(&sheet.stronger[0].filter, &cleaned.recording.samples);
    assert!(power(&gone) < 1e-10 * power(&before.samples[0]));
    let mut most = 0.0_f64;
    for (k, component) in sheet
        .stronger
        .iter()
        .chain(&sheet.weaker)
        .enumerate()
        .skip(1)
    {
        let after = series(&component.filter, &cleaned.recording.samples);
        let gap = after
            .iter()
            .zip(&before.samples[k])
            .map(|(a, b)| (a - b).powi(2))
            .sum::<f64>();
        let own = before.samples[k].iter().map(|b| b.powi(2)).sum::<f64>();
        most = most.max((gap / own).sqrt());
    }
    assert!(
        (cleaned.others - most).abs() < 1e-6,
        "{} and {most}",
        cleaned.others
    );
}

/// The EDF+ written, opened again and seen through the saved filters: the removed component has no power on either side, another one
/// keeps its ratio as far as 16 bits allow.
#[test]
fn the_written_file_opens_again_without_the_component() {
    let analysis = analysed(|recipe| {
        // The filters are in the samples already: applying them again to what was filtered would change them.
        recipe.filter.high_pass_hz = None;
        recipe.filter.low_pass_hz = None;
        recipe.filter.notch_hz.clear();
    });
    let weights = Weights::from_json(&weights_json(analysis.sheet()).unwrap()).unwrap();
    let before = weights
        .carry(analysis.recording(), analysis.recipe())
        .unwrap();
    let cleaned = clean(&analysis, &["stronger 1".into()], Cleaning::Remove).unwrap();
    let bytes = cleaned.bytes(Form::Edf).unwrap();
    let header = String::from_utf8_lossy(&bytes[..256]).into_owned();
    assert!(
        header.contains("_removed_stronger-1") && header.contains("X X X X"),
        "{header}"
    );
    let again = reopened(bytes);
    assert_eq!(again.events, analysis.recording().events);
    let after = weights.carry(&again, analysis.recipe()).unwrap();
    let mean = |carried: &teasel_core::takeaway::Carried, k: usize| {
        power(&carried.applied.series.samples[k])
    };
    assert!(
        mean(&after, 0) < 1e-5 * mean(&before, 0),
        "{:e}",
        mean(&after, 0) / mean(&before, 0)
    );
    for (was, is) in before.rows.iter().zip(&after.rows).skip(1) {
        let apart = (is.typical / was.typical).ln().abs();
        // Steps of the 16 bits are about 1e-4 of a channel's standard deviation.
        assert!(apart < 1e-2, "{}: {apart:e}", was.name);
    }
}

#[test]
fn a_choice_that_fits_nothing_is_refused() {
    let analysis = analysed(|_| {});
    let nothing = clean(&analysis, &[], Cleaning::Remove).unwrap_err();
    assert_eq!(nothing.what, "no component is chosen");
    let unknown = clean(&analysis, &["stronger 9".into()], Cleaning::Remove).unwrap_err();
    assert!(
        unknown.to_string().contains("stronger 1, stronger 2"),
        "{unknown}"
    );
}
