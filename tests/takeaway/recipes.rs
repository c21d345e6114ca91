//! Recipes and links: round trips, and what is refused with which words.
use super::sample;
use std::collections::BTreeMap;
use teasel_core::error::Kind;
use teasel_core::recipe::*;
use teasel_core::takeaway::{
    link_decode, link_encode, recipe_check, recipe_from_json, recipe_json,
};

const LEAST: &str = r#"{"teasel_recipe": 1, "contrast": {"kind": "windows",
  "signal": {"event": "buoy", "from_s": 0, "to_s": 1},
  "reference": {"event": "buoy", "from_s": -1, "to_s": 0}}}"#;

/// The least recipe with more keys.
fn with(more: &str) -> String {
    LEAST.replacen("{", &format!("{{\n  {more},\n  "), 1)
}

#[test]
fn what_is_written_reads_back_the_same() {
    let mut recipe = sample::recipe();
    for keep in [
        Keep::Number(12),
        Keep::Word(KeepWord::Auto),
        Keep::Word(KeepWord::Best),
    ] {
        for reference in [
            Reference::Word(ReferenceWord::AsRecorded),
            Reference::Word(ReferenceWord::Average),
            Reference::Named(vec!["Fz".into(), "\"=Cz".into()]),
        ] {
            recipe.keep = keep;
            recipe.channels.reference = reference;
            let text = recipe_json(&recipe).unwrap();
            assert_eq!(recipe_from_json(&text).unwrap(), recipe);
            assert_eq!(text, recipe_json(&recipe).unwrap());
        }
    }
    recipe.measure = Measure::Total;
    for shrink in [
        Shrink::Word(ShrinkWord::LedoitWolf),
        Shrink::Word(ShrinkWord::Oas),
        Shrink::Number(0.1 + 0.2),
    ] {
        recipe.shrink = shrink;
        assert_eq!(
            recipe_from_json(&recipe_json(&recipe).unwrap()).unwrap(),
            recipe
        );
    }
}

/// A recipe with this contrast.
fn asking(contrast: &str) -> String {
    format!(r#"{{"teasel_recipe": 1, "contrast": {contrast}}}"#)
}

#[test]
fn every_kind_of_contrast_is_read_and_written() {
    let total = r#"{"kind": "repeatable", "event": "buoy", "from_s": 0, "to_s": 0.5, "first": 20, "leave_out": [3, 4]}"#;
    let kinds = [
        r#"{"kind": "windows", "signal": {"event": "buoy*", "also": ["gull"], "from_s": 0, "to_s": 0, "until": "press"},
            "reference": {"event": "swell", "from_s": 0, "to_s": 1, "last": 5, "equal": true}}"#,
        r#"{"kind": "spans", "signal": [[0, 10], [20.5, 30]], "reference": "rest"}"#,
        r#"{"kind": "spans", "signal": "drowsy", "reference": "awake", "piece_s": 2}"#,
        r#"{"kind": "band", "centre_hz": 10, "half_width_hz": 2, "reference": "broadband"}"#,
        r#"{"kind": "band", "centre_hz": 10, "half_width_hz": 2, "within": {"event": "buoy", "from_s": 0, "to_s": 1}}"#,
        r#"{"kind": "band", "centre_hz": 10, "half_width_hz": 2, "within": [[0, 60]]}"#,
        total,
        r#"{"kind": "slow", "lag_s": 0.02, "within": "calm"}"#,
    ];
    for kind in kinds {
        let more = format!(r#"{kind}, "not_used": [[1, 2.5]], "hold_back": {{"last": 0.25}}"#);
        let recipe = recipe_from_json(&asking(&more)).unwrap();
        let text = recipe_json(&recipe).unwrap();
        assert_eq!(recipe_from_json(&text).unwrap(), recipe, "{kind}");
        assert_eq!(recipe.not_used, [[1.0, 2.5]]);
        let expected = if kind == total {
            Measure::Total
        } else {
            Measure::Typical
        };
        assert_eq!(recipe.measure, expected, "{kind}");
        // A link without names holds none of them, and takes the most frequent event in their place.
        use base64::Engine;
        let link = link_encode(&recipe, false);
        let inside = base64::engine::general_purpose::URL_SAFE_NO_PAD
            .decode(&link)
            .unwrap();
        let inside = String::from_utf8(inside).unwrap();
        for name in ["buoy", "gull", "press", "swell", "drowsy", "awake", "calm"] {
            assert!(!inside.contains(name), "{inside}");
        }
        let events = BTreeMap::from([("a".to_string(), 30), ("b".to_string(), 12)]);
        let (completed, _) = link_decode(&link).unwrap().complete(&events).unwrap();
        assert_eq!(completed.contrast.kind(), recipe.contrast.kind());
    }
}

#[test]
fn the_least_recipe_takes_every_default() {
    let recipe = recipe_from_json(LEAST).unwrap();
    assert_eq!(recipe.keep, Keep::Word(KeepWord::Auto));
    assert_eq!(recipe.measure, Measure::Typical);
    assert_eq!(recipe.components, 4);
    assert_eq!(recipe.evidence, Evidence::default());
    assert_eq!(
        recipe.channels.reference,
        Reference::Word(ReferenceWord::AsRecorded)
    );
}

#[test]
fn each_refusal_says_where_what_was_expected_and_what_was_found() {
    let cases: &[(String, &str, &str, &str)] = &[
        (String::new(), "the recipe is empty", "", ""),
        (
            "{".into(),
            "the recipe is not JSON",
            "line 1, column 1",
            "valid JSON",
        ),
        (
            "[]".into(),
            "breaks its rules",
            "line 1, column 1",
            "an object",
        ),
        (
            "{\"teasel_recipe\": 1}".into(),
            "breaks its rules",
            "line 1, column 1",
            "the key \"contrast\"",
        ),
        (
            LEAST.replace("1, \"contrast\"", "2, \"contrast\""),
            "another version",
            "line 1, column 19",
            "1",
        ),
        (
            with("\"kep\": 3"),
            "breaks its rules",
            "line 2, column 10",
            "keep",
        ),
        (
            with("\"keep\": 1"),
            "With C = 1 the direction is chosen by size alone and nothing is left to compare",
            "line 2, column 11, \"keep\"",
            "above 1",
        ),
        (with("\"keep\": 0"), "out of range", "\"keep\"", "above 1"),
        (
            with("\"keep\": 2.5"),
            "breaks its rules",
            "\"keep\"",
            "a whole number above 1",
        ),
        (
            with("\"keep\": \"most\""),
            "breaks its rules",
            "\"keep\"",
            "\"auto\" or \"best\"",
        ),
        (
            with("\"keep\": 3, \"keep\": 4"),
            "breaks its rules",
            "line 2, column 22",
            "each key once",
        ),
        (
            with("\"components\": 0"),
            "out of range",
            "\"components\"",
            "from 1 to 20",
        ),
        (
            with("\"components\": 21"),
            "out of range",
            "\"components\"",
            "from 1 to 20",
        ),
        (
            with("\"components\": -1"),
            "breaks its rules",
            "\"components\"",
            "whole number",
        ),
        (
            with("\"evidence\": {\"folds\": 1}"),
            "out of range",
            "\"evidence.folds\"",
            "from 2 to 50",
        ),
        (
            with("\"evidence\": {\"folds\": 51}"),
            "out of range",
            "\"evidence.folds\"",
            "from 2 to 50",
        ),
        (
            with("\"evidence\": {\"permutations\": 100001}"),
            "out of range",
            "\"evidence.permutations\"",
            "100000",
        ),
        (
            with("\"evidence\": {\"bootstrap\": 20001}"),
            "out of range",
            "\"evidence.bootstrap\"",
            "20000",
        ),
        (
            with("\"evidence\": {\"seed\": 9007199254740992}"),
            "breaks its rules",
            "\"evidence.seed\"",
            "9007199254740991",
        ),
        (
            with("\"evidence\": {\"sead\": 1}"),
            "breaks its rules",
            "\"evidence\"",
            "folds, permutations, bootstrap, seed",
        ),
        (
            with("\"filter\": {\"high_pass_hz\": 0}"),
            "out of range",
            "\"filter.high_pass_hz\"",
            "above 0",
        ),
        (
            with("\"filter\": {\"high_pass_hz\": \"1\"}"),
            "breaks its rules",
            "\"filter.high_pass_hz\"",
            "a number",
        ),
        (
            with("\"filter\": {\"high_pass_hz\": 40, \"low_pass_hz\": 1}"),
            "out of range",
            "\"filter.low_pass_hz\"",
            "above the high-pass, 40",
        ),
        (
            with("\"filter\": {\"notch_hz\": 50}"),
            "breaks its rules",
            "\"filter.notch_hz\"",
            "a list",
        ),
        (
            with("\"filter\": {\"notch_hz\": [50, -1]}"),
            "out of range",
            "\"filter.notch_hz\"",
            "above 0",
        ),
        (
            with("\"filter\": {\"notch_hz\": [50, null]}"),
            "breaks its rules",
            "\"filter.notch_hz.2\"",
            "a number",
        ),
        (
            with("\"filter\": {\"resample_hz\": -250}"),
            "out of range",
            "\"filter.resample_hz\"",
            "above 0",
        ),
        (
            with("\"filter\": {\"resample_hz\": 1e999}"),
            "not JSON",
            "line 2",
            "valid JSON",
        ),
        (
            with("\"shrink\": 1"),
            "out of range",
            "\"shrink\"",
            "not including, 1",
        ),
        (
            with("\"shrink\": -0.1"),
            "out of range",
            "\"shrink\"",
            "not including, 1",
        ),
        (
            with("\"shrink\": \"oas\""),
            "belongs to the measure total",
            "\"shrink\"",
            "\"auto\" or a number",
        ),
        (
            with("\"measure\": \"both\""),
            "breaks its rules",
            "\"measure\"",
            "\"typical\" or \"total\"",
        ),
        (
            with("\"channels\": {\"reference\": \"linked\"}"),
            "breaks its rules",
            "\"channels.reference\"",
            "as recorded",
        ),
        (
            with("\"channels\": {\"reference\": []}"),
            "out of range",
            "\"channels.reference\"",
            "at least one",
        ),
        (
            with("\"channels\": {\"leave_out\": [1]}"),
            "breaks its rules",
            "\"channels.leave_out.1\"",
            "a text",
        ),
        (
            LEAST.replace("\"windows\"", "\"band\""),
            "breaks its rules",
            "\"contrast\"",
            "one of the keys kind, centre_hz, half_width_hz, reference, within, piece_s",
        ),
        (
            LEAST.replace("\"windows\"", "\"repeatable\""),
            "breaks its rules",
            "\"contrast\"",
            "one of the keys kind, event",
        ),
        (
            asking(r#"{"kind": "spans", "signal": [[1, 2, 3]], "reference": "rest"}"#),
            "breaks its rules",
            "\"contrast.signal.1\"",
            "two numbers [from, to]",
        ),
        (
            asking(r#"{"kind": "spans", "signal": "rest", "reference": [[0, 1]]}"#),
            "the signal spans is out of range",
            "\"contrast.signal\"",
            "everything that is not signal",
        ),
        (
            asking(r#"{"kind": "spans", "signal": [[2, 1]], "reference": "rest"}"#),
            "out of range",
            "\"contrast.signal\"",
            "end after they begin",
        ),
        (
            asking(r#"{"kind": "band", "centre_hz": 6, "half_width_hz": 2}"#),
            "the half width of the band",
            "\"contrast.half_width_hz\"",
            "less than 1.714 Hz",
        ),
        (
            asking(r#"{"kind": "slow", "lag_s": 0}"#),
            "the lag",
            "\"contrast.lag_s\"",
            "above 0",
        ),
        (
            asking(
                r#"{"kind": "repeatable", "event": "a", "from_s": 0, "to_s": 1, "equal": true}"#,
            ),
            "has no meaning here",
            "\"contrast.equal\"",
            "",
        ),
        (
            asking(
                r#"{"kind": "repeatable", "event": "a", "from_s": 0, "to_s": 1}, "measure": "typical""#,
            ),
            "has no ratio in a single trial",
            "\"measure\"",
            "total",
        ),
        (
            asking(r#"{"kind": "slow", "lag_s": 0.1}, "hold_back": {"last": 0.9}"#),
            "locked away",
            "\"hold_back.last\"",
            "from 0.05 to 0.5",
        ),
        (
            asking(r#"{"kind": "slow", "lag_s": 0.1}, "not_used": [[5, 5]]"#),
            "not to be used",
            "\"not_used\"",
            "end after they begin",
        ),
        (
            LEAST.replace("\"windows\"", "\"door\""),
            "breaks its rules",
            "\"contrast\"",
            "one of the kinds \"windows\"",
        ),
        (
            LEAST.replace("\"kind\": \"windows\",", ""),
            "breaks its rules",
            "\"contrast\"",
            "the key \"kind\"",
        ),
        (
            LEAST.replace("\"to_s\": 1}", "\"to_s\": 0}"),
            "out of range",
            "line 2, column 52, \"contrast.signal.to_s\"",
            "after their start, 0 s",
        ),
        (
            LEAST.replace("\"from_s\": -1,", ""),
            "breaks its rules",
            "line 3",
            "the key \"from_s\"",
        ),
        (
            LEAST.replace("\"buoy\", \"from_s\": 0", "\"\", \"from_s\": 0"),
            "out of range",
            "\"contrast.signal.event\"",
            "the label of an event",
        ),
        (
            format!("{LEAST}{}", " ".repeat(1 << 20)),
            "too long",
            "",
            "1048576 bytes",
        ),
        (format!("{LEAST} x"), "not JSON", "line 3", "valid JSON"),
    ];
    for (text, what, place, expected) in cases {
        let start: String = text.chars().take(200).collect();
        let problem = recipe_from_json(text).expect_err(&start);
        assert_eq!(problem.kind, Kind::Recipe, "{start}");
        assert!(problem.what.contains(what), "{start}\n{problem}");
        let said = problem.place.clone().unwrap_or_default();
        assert!(said.contains(place), "{start}\n{problem}");
        let wanted = problem.expected.clone().unwrap_or_default();
        assert!(wanted.contains(expected), "{start}\n{problem}");
        assert!(problem.advice.len() > 10, "{problem}");
        assert!(!problem.to_string().contains('\n'), "{problem}");
    }
}

#[test]
fn hostile_keys_are_quoted_short_and_on_one_line() {
    let key = format!("\\u202e\\n{}", "k".repeat(500));
    let problem = recipe_from_json(&with(&format!("\"{key}\": 1"))).unwrap_err();
    let line = problem.to_string();
    assert!(
        line.chars().count() < 400 && !line.contains('\n') && !line.contains('\u{202e}'),
        "{line}"
    );
}

#[test]
fn recipe_check_refuses_numbers_that_json_cannot_hold() {
    let mut recipe = sample::recipe();
    recipe.filter.resample_hz = Some(f64::NAN);
    assert!(recipe_check(&recipe).is_err());
    let mut recipe = sample::recipe();
    let Contrast::Windows { signal, .. } = &mut recipe.contrast else {
        panic!("a contrast of event windows")
    };
    signal.to_s = f64::INFINITY;
    assert!(recipe_check(&recipe).is_err());
    assert!(recipe_check(&sample::recipe()).is_ok());
}

#[test]
fn a_link_with_names_is_the_recipe() {
    let recipe = sample::recipe();
    let link = link_encode(&recipe, true);
    assert!(
        link.chars()
            .all(|c| c.is_ascii_alphanumeric() || c == '-' || c == '_'),
        "{link}"
    );
    for text in [
        link.clone(),
        format!("#recipe={link}"),
        format!("recipe={link}\n"),
        format!("{link}=="),
    ] {
        let Ok(open) = link_decode(&text) else {
            // Padding of the wrong length is not base64; of the right length it is read.
            assert!(text.ends_with("=="));
            continue;
        };
        assert_eq!(open.recipe, recipe);
        assert_eq!(
            open.complete(&BTreeMap::new()).unwrap(),
            (recipe.clone(), vec![])
        );
    }
    // A recipe file as a person would write it works as well.
    use base64::Engine;
    let by_hand = base64::engine::general_purpose::URL_SAFE.encode(LEAST);
    assert_eq!(
        link_decode(&by_hand).unwrap().recipe,
        recipe_from_json(LEAST).unwrap()
    );
}

#[test]
fn a_link_without_names_holds_none_and_takes_the_events_of_the_recording() {
    let mut recipe = sample::recipe();
    recipe.channels.leave_out = vec!["Zelda-1".into()];
    recipe.channels.reference = Reference::Named(vec!["Zelda-2".into()]);
    let Contrast::Windows { signal, reference } = &mut recipe.contrast else {
        panic!("a contrast of event windows")
    };
    signal.event = "Zelda-3".into();
    reference.event = "Zelda-4".into();
    let link = link_encode(&recipe, false);
    use base64::Engine;
    let inside = base64::engine::general_purpose::URL_SAFE_NO_PAD
        .decode(&link)
        .unwrap();
    assert!(!String::from_utf8(inside).unwrap().contains("Zelda"));

    let events = BTreeMap::from([
        ("a".to_string(), 3),
        ("b".to_string(), 30),
        ("c".to_string(), 12),
    ]);
    let open = link_decode(&link).unwrap();
    let (completed, notes) = open.complete(&events).unwrap();
    let (signal, reference) = completed.contrast.event_windows().unwrap();
    assert_eq!(
        (signal.event.as_str(), reference.event.as_str()),
        ("b", "c")
    );
    assert_eq!((signal.from_s, reference.to_s), (0.2, -0.2));
    assert_eq!(completed.keep, recipe.keep);
    assert_eq!(completed.filter, recipe.filter);
    assert_eq!(notes.len(), 3, "{notes:?}");
    assert_eq!(
        open.complete(&BTreeMap::new()).unwrap_err().kind,
        Kind::Contrast
    );

    // One event on both sides stays one event.
    let open = link_decode(&link_encode(&sample::recipe(), false)).unwrap();
    let (completed, _) = open.complete(&events).unwrap();
    let (signal, reference) = completed.contrast.event_windows().unwrap();
    assert_eq!(
        (signal.event.as_str(), reference.event.as_str()),
        ("b", "b")
    );
}

#[test]
fn damaged_links_are_refused() {
    use base64::Engine;
    let encode = |text: &str| base64::engine::general_purpose::URL_SAFE_NO_PAD.encode(text);
    let good = link_encode(&sample::recipe(), false);
    let cases = [
        String::new(),
        "§§§".into(),
        good[..good.len() / 2].into(),
        encode("{}"),
        encode("not json"),
        encode(&LEAST.replace(
            "\"teasel_recipe\": 1",
            "\"teasel_recipe\": 1, \"without\": []",
        )),
        encode(
            &LEAST
                .replace(
                    "\"teasel_recipe\": 1",
                    "\"teasel_recipe\": 1, \"without\": 3",
                )
                .replace("\"buoy\"", "1"),
        ),
        encode(
            &LEAST
                .replace(
                    "\"teasel_recipe\": 1",
                    "\"teasel_recipe\": 1, \"without\": [\"samples\"]",
                )
                .replace("\"buoy\"", "1"),
        ),
        encode(
            &LEAST
                .replace(
                    "\"teasel_recipe\": 1",
                    "\"teasel_recipe\": 1, \"without\": [], \"more\": 1",
                )
                .replace("\"buoy\"", "1"),
        ),
        base64::engine::general_purpose::URL_SAFE_NO_PAD.encode([0xff, 0xfe]),
        "A".repeat(3 << 20),
    ];
    for link in cases {
        let start: String = link.chars().take(60).collect();
        assert_eq!(
            link_decode(&link).expect_err(&start).kind,
            Kind::Recipe,
            "{start}"
        );
    }
}
