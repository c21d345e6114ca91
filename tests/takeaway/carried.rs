//! Weights carried to a recording: the same series as the run that made them, and what is refused.
use teasel_core::analysis::{Analysis, Series};
use teasel_core::demo::night_watch;
use teasel_core::recipe::*;
use teasel_core::recording::Recording;
use teasel_core::takeaway::{Weights, weights_json};

/// A run with little evidence, which is not looked at here.
fn run(recording: &Recording, recipe: Recipe) -> (Weights, Series) {
    let mut analysis = Analysis::new(recording.clone(), recipe).unwrap();
    analysis.run(|_| {}).unwrap();
    let text = weights_json(analysis.sheet()).unwrap();
    (
        Weights::from_json(&text).unwrap(),
        analysis.series().unwrap(),
    )
}

fn quick(mut recipe: Recipe) -> Recipe {
    recipe.evidence.permutations = 0;
    recipe.evidence.bootstrap = 0;
    recipe.components = 2;
    recipe.keep = Keep::Number(8);
    recipe
}

/// Largest difference over the largest value, the worst of all components.
fn apart(a: &Series, b: &Series) -> f64 {
    assert_eq!((a.samples.len(), a.rate_hz), (b.samples.len(), b.rate_hz));
    assert_eq!(a.stretches, b.stretches);
    let pairs = a.samples.iter().zip(&b.samples);
    pairs
        .map(|(x, y)| {
            assert_eq!(x.len(), y.len());
            let size = x.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
            let gap = x
                .iter()
                .zip(y)
                .fold(0.0_f64, |m, (v, w)| m.max((v - w).abs()));
            gap / size
        })
        .fold(0.0, f64::max)
}

#[test]
fn applied_weights_give_the_series_of_the_run() {
    let demo = night_watch(1);
    let plain = quick(demo.recipe.clone());
    let mut more = plain.clone();
    more.channels.reference = Reference::Word(ReferenceWord::Average);
    more.channels.interpolate = vec![demo.recording.channels[3].name.clone()];
    more.channels.leave_out = vec![demo.recording.channels[5].name.clone()];
    more.filter.resample_hz = Some(125.0);
    let mut named = plain.clone();
    named.channels.reference = Reference::Named(vec![demo.recording.channels[0].name.clone()]);
    for recipe in [plain, more, named] {
        let (weights, series) = run(&demo.recording, recipe);
        let applied = weights.apply(&demo.recording).unwrap();
        assert!(applied.notes.is_empty(), "{:?}", applied.notes);
        assert_eq!(applied.series.names, series.names);
        // Both round their filtered samples to f32 (6e-8); a component is a sum that cancels most of what is large.
        let gap = apart(&series, &applied.series);
        assert!(gap < 1e-6, "{gap:e}");
    }
}

#[test]
fn a_large_offset_costs_no_precision() {
    let demo = night_watch(1);
    let mut recording = demo.recording.clone();
    for (k, samples) in recording.samples.iter_mut().enumerate() {
        // 20 mV and 0.1 µV steps: as far as f32 goes without losing steps.
        samples
            .iter_mut()
            .for_each(|x| *x += 1024.0 * (k % 5) as f32);
    }
    let (weights, series) = run(&recording, quick(demo.recipe));
    let gap = apart(&series, &weights.apply(&recording).unwrap().series);
    assert!(gap < 1e-6, "{gap:e}");
}

#[test]
fn order_extra_channels_and_units_do_not_matter() {
    let demo = night_watch(1);
    let (weights, series) = run(&demo.recording, quick(demo.recipe.clone()));
    let mut other = demo.recording.clone();
    other.channels.reverse();
    other.samples.reverse();
    other.channels.insert(0, other.channels[0].clone());
    other.channels[0].name = "one more".into();
    other
        .samples
        .insert(0, vec![f32::NAN; other.sample_count()]);
    other.channels[2].unit = "mV".into();
    other.samples[2].iter_mut().for_each(|x| *x /= 1000.0);
    let applied = weights.apply(&other).unwrap();
    assert_eq!(applied.notes.len(), 1, "{:?}", applied.notes);
    assert!(apart(&series, &applied.series) < 1e-6);
}

#[test]
fn what_does_not_fit_is_refused_by_name() {
    let demo = night_watch(1);
    let (weights, series) = run(&demo.recording, quick(demo.recipe.clone()));
    let change = |f: &dyn Fn(&mut Recording)| {
        let mut other = demo.recording.clone();
        f(&mut other);
        weights.apply(&other)
    };
    let lacks = change(&|r| r.channels[4].name = "elsewhere".into()).unwrap_err();
    assert!(lacks.what.contains("lacks channels"), "{lacks}");
    assert!(
        lacks.to_string().contains(&demo.recording.channels[4].name),
        "{lacks}"
    );
    let unit = change(&|r| r.channels[4].unit = "fT".into()).unwrap_err();
    assert!(unit.what.contains("unit of another kind"), "{unit}");
    let holes = change(&|r| r.samples[4][100] = f32::NAN).unwrap_err();
    assert!(holes.what.contains("not numbers"), "{holes}");
    let slow = change(&|r| r.rate_hz = 200.0).unwrap_err();
    assert!(slow.what.contains("more slowly"), "{slow}");
    for problem in [lacks, unit, holes, slow] {
        assert_eq!(problem.file.as_deref(), Some(demo.recording.name.as_str()));
    }
    // Sampled faster: resampled to the weights' rate, and said.
    let fast = change(&|r| r.rate_hz = 500.0).unwrap();
    assert_eq!(fast.series.rate_hz, series.rate_hz);
    assert_eq!(fast.notes.len(), 1);
}
