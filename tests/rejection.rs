//! Windows dropped for what is in them: planted faults, thresholds by hand, and the counts on the sheet.
use teasel_core::analysis::Analysis;
use teasel_core::contrast::reject::{judge, measure};
use teasel_core::contrast::windows::Window;
use teasel_core::demo::{WATCH_SEED, night_watch};
use teasel_core::recipe::{AbsoluteLimit, DropWindows, Limit, RobustLimit};
use teasel_core::sheet::End;
use teasel_core::takeaway::{recipe_from_json, recipe_json};
use teasel_tests::close;

fn window(first: usize, signal: bool, trial: usize) -> Window {
    Window {
        first,
        count: 4,
        signal,
        trial,
        onset_s: 0.0,
    }
}

#[test]
fn a_window_is_measured_by_its_extremes() {
    let samples = vec![
        vec![0.0, 1.0, 2.0, 1.0, 100.0],
        vec![5.0, 5.0, 5.5, 5.0, -100.0],
    ];
    // Channel 1 spans 2, channel 2 spans 0.5; the largest step is 1. The fifth sample is outside.
    assert_eq!(measure(&samples, &window(0, true, 0)), [2.0, 1.0, 0.5]);
}

#[test]
fn limits_are_median_and_mad_of_logarithms_over_both_sides() {
    // Logarithms 0, 1, 2, 3, 10: median 2, absolute deviations 2, 1, 0, 1, 8 of median 1.
    let amplitudes = [0.0_f64, 1.0, 2.0, 3.0, 10.0].map(f64::exp);
    let measures: Vec<[f64; 3]> = amplitudes.iter().map(|a| [*a, 1.0, 1.0]).collect();
    let windows: Vec<Window> = (0..5).map(|k| window(0, k % 2 == 1, k)).collect();
    let drop = DropWindows {
        amplitude: Some(Limit::Robust(RobustLimit { z: 3.0 })),
        step: Some(Limit::Absolute(AbsoluteLimit { uv: 0.5 })),
        ..DropWindows::default()
    };
    let (card, why) = judge(&drop, &measures, &[], &windows, "µV");
    close(
        "limit",
        card.criteria[0].limit.ln(),
        2.0 + 3.0 * 1.4826,
        1e-12,
    );
    close("median", card.criteria[0].median, 2f64.exp(), 1e-12);
    assert_eq!(
        card.criteria[0].beyond,
        [0, 1],
        "the fifth window is a reference window"
    );
    assert_eq!(
        card.criteria[1].beyond,
        [2, 3],
        "each criterion counts for itself"
    );
    assert_eq!(why[4], Some("amplitude"));
    assert_eq!(why[0], Some("step"));
}

#[test]
fn dropped_windows_are_counted_and_their_effect_on_the_ratio_is_shown() {
    let demo = night_watch(WATCH_SEED);
    let mut recipe = demo.recipe;
    recipe.evidence.permutations = 0;
    recipe.evidence.bootstrap = 0;
    recipe.drop_windows.amplitude = Some(Limit::Robust(RobustLimit { z: 2.0 }));
    let mut analysis = Analysis::new(demo.recording, recipe.clone()).unwrap();
    analysis.run(|_| ()).unwrap();
    let sheet = analysis.sheet();
    let card = sheet.rejection.as_ref().unwrap();
    let windows = sheet.windows.as_ref().unwrap();
    let dropped = |side: &teasel_core::sheet::SideCard| {
        side.dropped.get("amplitude").copied().unwrap_or(0)
            + side.dropped.get("partner").copied().unwrap_or(0)
    };
    let gone = dropped(&windows.signal) + dropped(&windows.reference);
    assert!(
        gone > 0 && gone == card.windows[0] - card.windows[1],
        "{card:?}"
    );
    assert_eq!(
        card.windows[1],
        windows.signal.used + windows.reference.used
    );
    assert_eq!(
        dropped(&windows.signal),
        dropped(&windows.reference),
        "pairs go together"
    );
    let effect = card.effect.unwrap();
    let end = sheet.leading;
    assert_eq!(effect.typical[1], sheet.first().unwrap().typical.fitted);

    // With every window: what the recipe without criteria gives.
    recipe.drop_windows = DropWindows::default();
    analysis.set_recipe(recipe).unwrap();
    analysis.run(|_| ()).unwrap();
    let whole = analysis.sheet();
    assert!(whole.rejection.is_none());
    let same_end = match end {
        End::Stronger => &whole.stronger[0],
        End::Weaker => &whole.weaker[0],
    };
    let fitted = same_end.typical.fitted;
    close(
        "with every window",
        effect.typical[0],
        fitted,
        1e-9 * fitted,
    );
}

#[test]
fn the_recipe_holds_limits_and_refuses_what_is_none() {
    let text = |drop: &str| {
        let window = r#"{"event": "buoy", "from_s": 0.0, "to_s": 1.0}"#;
        format!(
            r#"{{"teasel_recipe": 1, "drop_windows": {drop},
            "contrast": {{"kind": "windows", "signal": {window}, "reference": {window}}}}}"#
        )
    };
    let good =
        r#"{"amplitude": {"z": 5}, "step": {"uv": 150}, "flat": {"z": 4}, "covariance": {"z": 6}}"#;
    let recipe = recipe_from_json(&text(good)).unwrap();
    let again = recipe_from_json(&recipe_json(&recipe).unwrap()).unwrap();
    assert_eq!(recipe, again);
    assert_eq!(
        recipe.drop_windows.step,
        Some(Limit::Absolute(AbsoluteLimit { uv: 150.0 }))
    );
    let none = recipe_from_json(&text("{}")).unwrap();
    assert!(
        !recipe_json(&none).unwrap().contains("drop_windows"),
        "nothing dropped, nothing written"
    );
    for bad in [
        r#"{"amplitude": {"z": 0.5}}"#,
        r#"{"amplitude": {"z": 5, "uv": 100}}"#,
        r#"{"amplitude": 5}"#,
        r#"{"covariance": {"uv": 5}}"#,
        r#"{"step": {"uv": -1}}"#,
        r#"{"peak": {"z": 5}}"#,
    ] {
        assert!(recipe_from_json(&text(bad)).is_err(), "{bad}");
    }
}
