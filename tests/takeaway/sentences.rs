//! Readings: what they say in each case, how long they are, and that no name becomes markup.
use super::sample;
use teasel_core::recipe::{Contrast, Measure};
use teasel_core::sheet::{ChannelState, End, FoldCard, Sheet};
use teasel_core::takeaway::{Reading, Section, Span, Tone, readings};

fn text(spans: &[Span]) -> String {
    spans
        .iter()
        .map(|s| s.text.as_str())
        .collect::<String>()
        .replace('\u{a0}', " ")
}

fn reading(sheet: &Sheet, section: Section) -> Reading {
    readings(sheet)
        .into_iter()
        .find(|r| r.section == section)
        .unwrap()
}

/// Text and doubt of a section as one string.
fn said(sheet: &Sheet, section: Section) -> String {
    let reading = reading(sheet, section);
    let but = reading
        .but
        .map_or(String::new(), |b| format!(" But {}", text(&b)));
    format!("{}{but}", text(&reading.text))
}

/// Every case below, by name.
fn cases() -> Vec<(&'static str, Sheet)> {
    let full = sample::sheet();
    let change = |f: fn(&mut Sheet)| {
        let mut sheet = full.clone();
        f(&mut sheet);
        sheet
    };
    vec![
        ("full", full.clone()),
        ("bare", sample::bare()),
        ("hostile", sample::hostile()),
        ("few", change(few)),
        ("nothing", change(nothing)),
        ("overfitted", change(overfitted)),
        ("carried", change(carried)),
        ("hidden", change(hidden)),
        (
            "pending",
            change(|s| {
                s.permutation = None;
                for c in s.stronger.iter_mut().chain(&mut s.weaker) {
                    c.p = None;
                }
            }),
        ),
        (
            "fitted",
            change(|s| {
                s.permutation = None;
                s.compare.clear();
                for c in s.stronger.iter_mut().chain(&mut s.weaker) {
                    c.p = None;
                    c.typical.held_out = None;
                    c.typical.interval = None;
                    c.total.held_out = None;
                    c.trials.clear();
                }
            }),
        ),
        (
            "untested",
            change(|s| {
                s.permutation = None;
                s.recipe.evidence.permutations = 0;
                for c in s.stronger.iter_mut().chain(&mut s.weaker) {
                    c.p = None;
                }
            }),
        ),
        ("one end", change(|s| s.weaker.clear())),
        ("other end", change(|s| s.stronger.clear())),
        ("weaker leads", change(|s| s.leading = End::Weaker)),
        (
            "weaker pending",
            change(|s| {
                s.leading = End::Weaker;
                s.permutation = None;
                s.stronger[0].p = None;
                s.weaker[0].p = None;
                s.weaker[0].typical.held_out = Some(1.1);
                s.stronger[0].typical.held_out = Some(0.94);
            }),
        ),
        (
            "total",
            change(|s| {
                s.recipe.measure = Measure::Total;
                s.recipe.filter.high_pass_hz = None;
                s.stronger[0].total.folds = vec![1.7, 3.1, 2.4];
                s.weaker.clear();
            }),
        ),
        ("unpaired", change(unpaired)),
        (
            "many",
            change(|s| {
                for k in 0..30 {
                    s.recording
                        .events
                        .insert(format!("label number {k} of a long list of labels"), k);
                }
            }),
        ),
    ]
}

fn few(sheet: &mut Sheet) {
    let windows = sheet.windows.as_mut().unwrap();
    windows.signal.used = 7;
    windows.reference.used = 7;
    for c in sheet.stronger.iter_mut().chain(&mut sheet.weaker) {
        c.p = None;
        c.typical.held_out = None;
        c.typical.interval = None;
        c.total.held_out = None;
        c.trials.clear();
    }
    sheet.permutation = None;
}

fn nothing(sheet: &mut Sheet) {
    for (c, p) in sheet
        .stronger
        .iter_mut()
        .chain(&mut sheet.weaker)
        .zip([0.31, 0.6, 0.4, 0.9])
    {
        c.p = Some(p);
        c.typical.fitted = 1.3;
        c.typical.held_out = Some(1.2);
        c.total.held_out = Some(1.15);
    }
}

fn overfitted(sheet: &mut Sheet) {
    nothing(sheet);
    sheet.stronger[0].typical.fitted = 3.9;
    sheet.stronger[0].typical.held_out = Some(1.1);
    sheet.stronger[0].typical.interval = Some([0.9, 1.3]);
}

fn carried(sheet: &mut Sheet) {
    let first = &mut sheet.stronger[0];
    first.typical.held_out = Some(1.04);
    first.typical.fitted = 1.1;
    first.total.held_out = Some(2.9);
    for (k, t) in first.trials.iter_mut().enumerate() {
        t.log_ratio = if k < 3 { 2.0 } else { 0.0 };
    }
}

fn hidden(sheet: &mut Sheet) {
    sheet.stronger[0].total.held_out = Some(1.2);
}

fn unpaired(sheet: &mut Sheet) {
    let Contrast::Windows { reference, .. } = &mut sheet.recipe.contrast else {
        panic!("a contrast of event windows")
    };
    reference.event = "swell".into();
    let windows = sheet.windows.as_mut().unwrap();
    windows.paired = false;
    windows.signal.used = 41;
    windows.reference.used = 20;
    windows.reference.samples = 50;
    windows.reference.seconds = 0.2;
    for c in sheet.stronger.iter_mut().chain(&mut sheet.weaker) {
        c.trials.clear();
    }
}

#[test]
fn the_whole_story_of_a_good_recording() {
    let sheet = sample::sheet();
    let expected = [
        (
            Section::SoFar,
            "After buoy, a component peaking at 21 Hz, largest at CP1, has 2.83 times its reference variance in a typical trial; one at 10.5 Hz, largest at Oz, falls to 0.35 times. But windows of 0.80 s hold less than one cycle of the high-pass (1 Hz), so only a part of rhythms under 1.2 Hz; 95 % intervals 2.33–3.47 and 0.27–0.46, 40 pairs; p = 0.004 and 0.004.",
        ),
        (
            Section::Recording,
            "8 channels at 250 Hz for 4 min 0 s, in µV, without gaps; 42 buoy and 20 swell. But one channel is listed and not analysed: Airflow (sampled at 25 Hz, most channels at 250 Hz).",
        ),
        (
            Section::Windows,
            "40 of 42 buoy events give a pair of windows of 0.80 s. Component 1, held-out, rises in 34 of 40 trials. But windows of 0.80 s hold less than one cycle of the high-pass (1 Hz), so only a part of rhythms under 1.2 Hz; of the windows on either side one lies beyond the end and one lost its partner.",
        ),
        (
            Section::Compression,
            "5 of 6 dimensions hold 99.1 % of the variance, and the held-out ratio is highest there: 2.83×. From 4 up it changes by less than one standard error.",
        ),
        (
            Section::Components,
            "One component is stronger in signal and one is weaker at p ≤ 0.05. Component 1 has 2.83× in a typical held-out trial and 3.06× over all power, so a few trials are not the reason.",
        ),
        (
            Section::Evidence,
            "On windows it never saw, component 1 reaches 2.83× in a typical trial; the best principal component 1.74× and the best single channel 1.59×. Of 1,000 swapped arrangements 3 did as well: p = 0.004. But the folds come from one recording. The first principal component, 72 % of the variance, reaches 1.38× on the same windows.",
        ),
        (Section::TakeAway, "Four filters for 7 channels."),
    ];
    for (section, start) in expected {
        let said = said(&sheet, section);
        assert!(said.starts_with(start), "\n{said}\n{start}");
    }
    assert_eq!(readings(&sheet).len(), 8);
}

#[test]
fn each_case_has_its_words() {
    let expected: &[(&str, Section, &[&str])] = &[
        (
            "bare",
            Section::SoFar,
            &[
                "What differs between 0.20 to 1.00 s from buoy (signal) and −1.00 to −0.20 s from it (reference)?",
            ],
        ),
        (
            "few",
            Section::SoFar,
            &["Only 7 pairs", "both are withheld"],
        ),
        ("few", Section::Evidence, &["withheld", "ten are the least"]),
        ("few", Section::Windows, &["7 pairs are too few"]),
        (
            "nothing",
            Section::SoFar,
            &[
                "no component passes (smallest p = 0.31)",
                "no proof of sameness",
                "After buoy, nothing differs that 40 pairs could show",
                "under about 2.05",
            ],
        ),
        (
            "nothing",
            Section::Components,
            &["No component passes (smallest p = 0.31)"],
        ),
        (
            "overfitted",
            Section::SoFar,
            &[
                "After buoy, nothing differs",
                "(fitted 3.90 times, held-out 1.10 times): the filters learnt these trials, not the difference",
            ],
        ),
        (
            "overfitted",
            Section::Components,
            &["Keep fewer dimensions"],
        ),
        ("carried", Section::SoFar, &["a few large windows carry it"]),
        (
            "carried",
            Section::Components,
            &["1.04×", "2.90×", "3 of 40 trials reach that", "anecdote"],
        ),
        (
            "hidden",
            Section::Components,
            &["2.83×", "only 1.20×", "large for other reasons"],
        ),
        ("pending", Section::SoFar, &["p is not computed yet"]),
        ("pending", Section::Evidence, &["p is not computed yet"]),
        (
            "fitted",
            Section::SoFar,
            &["still being computed", "a fit always flatters"],
        ),
        (
            "untested",
            Section::Evidence,
            &["No permutations were asked for, so there is no p."],
        ),
        ("one end", Section::Components, &["none is weaker"]),
        (
            "other end",
            Section::SoFar,
            &["falls to 0.35 times its reference variance"],
        ),
        (
            "weaker leads",
            Section::SoFar,
            &[
                "After buoy, a component peaking at 10.5 Hz, largest at Oz, falls to 0.35 times its reference variance in a typical trial; one at 21 Hz, largest at CP1, has 2.83 times.",
            ],
        ),
        (
            "weaker leads",
            Section::Evidence,
            &["weaker component 1 falls to 0.35×"],
        ),
        (
            "weaker leads",
            Section::Windows,
            &["Weaker component 1, held-out, falls in "],
        ),
        (
            "weaker leads",
            Section::Components,
            &["Weaker component 1 has 0.35×"],
        ),
        (
            "weaker pending",
            Section::SoFar,
            &[
                "After buoy, nothing stands out so far: what was fitted as weaker has 1.10 times",
                "p is not computed yet",
            ],
        ),
        (
            "weaker pending",
            Section::Components,
            &["Held-out, 1 of 2 stronger and 1 of 2 weaker components keep to their side of 1."],
        ),
        (
            "total",
            Section::SoFar,
            &["total ratio ranges over 1.70–3.10, from 40 pairs of one recording; p = 0.004"],
        ),
        (
            "unpaired",
            Section::Windows,
            &["signal windows last 0.80 s, reference windows 0.20 s"],
        ),
        (
            "unpaired",
            Section::SoFar,
            &["After buoy, compared with before swell"],
        ),
        (
            "unpaired",
            Section::Windows,
            &[
                "41 signal windows at buoy of 0.80 s stand against 20 reference windows at swell of 0.20 s",
            ],
        ),
        ("unpaired", Section::Evidence, &["shuffled arrangements"]),
        ("many", Section::Recording, &["more kinds of events"]),
    ];
    let cases = cases();
    for (name, section, parts) in expected {
        let sheet = &cases.iter().find(|c| c.0 == *name).unwrap().1;
        let said = said(sheet, *section);
        for part in *parts {
            assert!(said.contains(part), "{name}: {part}\n{said}");
        }
    }
}

#[test]
fn no_fitted_ratio_stands_alone_and_none_at_all_when_withheld() {
    let mut sheet = sample::sheet();
    few(&mut sheet);
    for reading in readings(&sheet) {
        assert!(
            !text(&reading.text).contains('×') || reading.section == Section::Compression,
            "{reading:?}"
        );
    }
}

#[test]
fn order_changes_trends_and_rivals_are_told() {
    let mut sheet = sample::sheet();
    sheet.stronger[1].places_changed = Some(3);
    assert!(
        said(&sheet, Section::Components)
            .contains("component 2 changes places in a third of the folds or more")
    );
    sheet.folds = [1.93, 2.2, 2.6, 2.5, 3.45]
        .iter()
        .map(|r| FoldCard {
            trials: 8,
            ratio: *r,
        })
        .collect();
    assert!(
        said(&sheet, Section::Evidence)
            .contains("rises from 1.93× in the first fold to 3.45× in the last")
    );
    sheet.compare[2].typical.held_out = Some(3.0);
    assert!(
        said(&sheet, Section::Evidence).contains("the best single channel does as well (3.00×)")
    );
    let mut sheet = sample::sheet();
    sheet.stronger[0].typical.interval = Some([0.98, 2.77]);
    assert!(
        said(&sheet, Section::Components).contains("its held-out interval (0.98–2.77) takes in 1")
    );
    let mut sheet = sample::sheet();
    sheet.curve = None;
    assert!(said(&sheet, Section::Compression).contains("the rank is 6 for 7 channels"));
}

#[test]
fn readings_are_short_clean_and_end_in_a_full_stop() {
    for (name, sheet) in cases() {
        for reading in readings(&sheet) {
            let body = text(&reading.text);
            let strong = reading
                .text
                .iter()
                .filter(|s| {
                    s.tone != Tone::Plain
                        && s.text.chars().any(|c| c.is_ascii_digit())
                        && !s.text.starts_with('<')
                })
                .count();
            let words = body.split_whitespace().count();
            assert!(words <= 45, "{name} {words}: {body}");
            assert!(strong <= 4, "{name} {strong}: {body}");
            assert!(body.ends_with(['.', '?']), "{name}: {body}");
            let but = reading.but.as_deref().map(text).unwrap_or_default();
            assert!(but.split_whitespace().count() <= 40, "{name}: {but}");
            assert!(but.is_empty() || but.ends_with('.'), "{name}: {but}");
            for part in [&body, &but] {
                let odd = part.contains("  ")
                    || part.contains("..")
                    || part.contains(" .")
                    || part.contains('\u{202e}')
                    || part.contains("NaN")
                    || part.contains('!');
                assert!(!odd, "{name}: {part}");
                // A hyphen before a digit would be a minus of the wrong kind.
                let letters: Vec<char> = part.chars().collect();
                assert!(
                    name == "hostile"
                        || !letters
                            .windows(2)
                            .any(|w| w[0] == '-' && w[1].is_ascii_digit()),
                    "{name}: {part}"
                );
            }
        }
    }
}

#[test]
fn doubtful_channels_are_named_with_their_twins_and_others_by_name() {
    let mut sheet = sample::sheet();
    sheet.channels[2].name = "F8".into();
    sheet.channels[2].state = ChannelState::NeedsALook("the same as F4".into());
    let other = sheet.recording.others[0].clone();
    for k in 0..5 {
        let mut more = other.clone();
        more.name = format!("Aux {k}");
        sheet.recording.others.push(more);
    }
    let said = said(&sheet, Section::Channels);
    assert!(said.contains("F8 is the same as F4"), "{said}");
    assert!(
        said.contains("not analysed: Airflow, Aux 0, Aux 1, Aux 2 and 2 more"),
        "{said}"
    );
}
