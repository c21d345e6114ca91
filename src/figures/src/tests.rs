//! Checks that hold for every figure.
#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    reason = "tests"
)]
use crate::{
    Figure, Look, Scheme, from_sheet, height, names, plot_box, sample, spoken, svg, table, traces,
};
use teasel_core::recipe::{Contrast, Measure};
use teasel_core::sheet::{ChannelState, Sheet};

const WIDTHS: [u32; 3] = [320, 888, 1200];

fn every(sheet: &Sheet) -> Vec<(String, Figure)> {
    let named = names(sheet).into_iter();
    named
        .map(|(name, _)| (name.clone(), from_sheet(sheet, &name).unwrap()))
        .collect()
}

fn drawn(figure: &Figure, width: u32) -> String {
    svg(figure, width, height(figure, width), &Look::default())
}

/// Parses as XML, holds no number that is none, and every coordinate lies on the sheet.
fn sound(name: &str, text: &str) {
    let document = roxmltree::Document::parse(text).unwrap_or_else(|e| panic!("{name}: {e}"));
    let root = document.root_element();
    assert_eq!(root.tag_name().name(), "svg", "{name}");
    assert!(!root.attribute("aria-label").unwrap().is_empty(), "{name}");
    assert!(!text.contains("NaN") && !text.contains("inf"), "{name}");
    for node in document.descendants() {
        let size = node
            .attribute("font-size")
            .map(|s| s.parse::<f64>().unwrap());
        assert!(
            size.is_none_or(|s| s >= 109.9),
            "{name}: text under 11 px: {size:?}"
        );
        assert!(
            !matches!(node.tag_name().name(), "script" | "a" | "foreignObject"),
            "{name}"
        );
    }
}

#[test]
fn every_figure_draws_at_every_width_and_size_of_recording() {
    for (channels, trials) in [(32, 40), (128, 400), (4, 10)] {
        let sheet = sample::sheet(channels, trials);
        for (name, figure) in every(&sheet) {
            for width in WIDTHS {
                sound(&format!("{name} at {width}"), &drawn(&figure, width));
            }
            sound(&name, &svg(&figure, 1, 1, &Look::default()));
        }
    }
}

#[test]
fn a_full_sheet_gives_every_name_of_the_page() {
    let sheet = sample::sheet(32, 40);
    let all: Vec<String> = names(&sheet).into_iter().map(|n| n.0).collect();
    let whole =
        "overview channels-map channels windows eigenvalues keep beside alike trial-by-trial";
    let each = "map filter spectrum course average trials ratio map-small spectrum-small";
    for name in whole.split(' ') {
        assert!(all.iter().any(|n| n == name), "{name}");
    }
    for part in each.split(' ') {
        for component in ["stronger-1", "stronger-4", "weaker-3"] {
            assert!(
                all.contains(&format!("{component}-{part}")),
                "{component}-{part}"
            );
        }
    }
    for wrong in [
        "",
        "stronger",
        "stronger-0-map",
        "stronger-5-map",
        "stronger-x-map",
        "weaker-1-hat",
        "mean",
    ] {
        assert_eq!(from_sheet(&sheet, wrong), None, "{wrong}");
    }
}

#[test]
fn names_from_a_file_cannot_leave_their_place() {
    let hostile = [
        "<script>alert(1)</script>",
        "\"'&]]><!--",
        "ערוץ אחת \u{202E}gnp",
        "🧠👩‍🔬🧠👩‍🔬🧠👩‍🔬🧠👩‍🔬",
        &"wide ".repeat(40),
        "a\u{0}b\u{1}c\nd\te",
        "",
    ];
    let mut sheet = sample::sheet(32, 40);
    let mut renamed = std::collections::BTreeMap::new();
    for (i, card) in sheet.channels.iter_mut().enumerate() {
        let new = hostile[i % hostile.len()].to_owned();
        renamed.insert(card.name.clone(), new.clone());
        card.name = new.clone();
        card.unit = new.clone();
        card.state = ChannelState::NeedsALook(new);
    }
    for name in &mut sheet.preparation.as_mut().unwrap().channels {
        *name = renamed[name].clone();
    }
    for part in sheet.stronger.iter_mut().chain(&mut sheet.weaker) {
        part.largest_at = hostile[0].into();
        part.course.as_mut().unwrap().event = hostile[4].into();
    }
    for comparator in &mut sheet.compare {
        comparator.chosen = Some(hostile[4].into());
    }
    let Contrast::Windows { signal, reference } = &mut sheet.recipe.contrast else {
        panic!("a contrast of event windows")
    };
    (signal.event, reference.event) = (hostile[2].into(), hostile[0].into());
    for (i, name) in hostile.iter().enumerate() {
        sheet
            .recording
            .event_onsets_s
            .insert((*name).to_owned(), vec![i as f64, 100.0]);
    }
    for (name, figure) in every(&sheet) {
        for width in WIDTHS {
            let text = drawn(&figure, width);
            sound(&name, &text);
            let document = roxmltree::Document::parse(&text).unwrap();
            let longest = document.descendants().filter(|n| n.has_tag_name("text"));
            let longest = longest
                .map(|n| n.text().unwrap_or("").chars().count())
                .max();
            assert!(
                longest.unwrap_or(0) < 110,
                "{name}: a label of {longest:?} characters"
            );
        }
        assert!(!spoken(&figure).contains('\u{0}'));
    }
}

#[test]
fn missing_numbers_leave_gaps_and_nothing_else() {
    let mut sheet = sample::sheet(32, 40);
    for part in sheet.stronger.iter_mut().chain(&mut sheet.weaker) {
        let spectra = part.spectra.as_mut().unwrap();
        spectra.signal[4..9].fill(f64::NAN);
        spectra.reference[20] = 0.0;
        let course = part.course.as_mut().unwrap();
        course.mean_db[10] = f64::NAN;
        course.low_db[100] = f64::INFINITY;
        part.image.as_mut().unwrap().db[3].fill(f32::NAN);
        part.pattern[2] = f64::NAN;
        part.filter[0] = f64::NAN;
        part.typical.held_out = None;
        part.trials[0].log_ratio = f64::NAN;
    }
    sheet.channels[3].sd = None;
    sheet.channels[4].sd = Some(0.0);
    sheet.channels[5].mains_db = Some(f64::NAN);
    sheet.recording.envelope[7] = f64::NAN;
    sheet.curve.as_mut().unwrap().held_out[3] = f64::NAN;
    sheet.compression.as_mut().unwrap().eigenvalues[5] = -1.0;
    sheet.permutation.as_mut().unwrap().largest[0] = f64::NAN;
    let before = names(&sheet).len();
    for (name, figure) in every(&sheet) {
        sound(&name, &drawn(&figure, 888));
        let json = serde_json::to_string(&figure).unwrap();
        let back: Figure = serde_json::from_str(&json).unwrap_or_else(|e| panic!("{name}: {e}"));
        assert!(
            drawn(&back, 520) == drawn(&figure, 520),
            "{name} changed on its way through JSON"
        );
    }
    assert_eq!(before, names(&sample::sheet(32, 40)).len());
}

#[test]
fn an_early_sheet_gives_only_what_it_knows() {
    let mut sheet = sample::sheet(32, 40);
    sheet.preparation = None;
    sheet.compression = None;
    sheet.curve = None;
    sheet.stronger.clear();
    sheet.weaker.clear();
    sheet.compare.clear();
    sheet.permutation = None;
    let early: Vec<String> = names(&sheet).into_iter().map(|n| n.0).collect();
    assert_eq!(early, ["overview", "channels-map", "channels", "windows"]);
    every(&sheet)
        .iter()
        .for_each(|(name, figure)| sound(name, &drawn(figure, 888)));
    sheet.channels.clear();
    sheet.recording.envelope.clear();
    assert_eq!(names(&sheet).len(), 1);
}

#[test]
fn plot_boxes_say_where_the_axes_were_drawn() {
    let sheet = sample::sheet(32, 40);
    for (name, figure) in every(&sheet) {
        for width in WIDTHS {
            let tall = height(&figure, width);
            let Some(plot) = plot_box(&figure, width, tall) else {
                continue;
            };
            assert!(
                plot.left >= 0.0 && plot.left < plot.right && plot.right <= f64::from(width),
                "{name}"
            );
            assert!(
                plot.top >= 0.0 && plot.top < plot.bottom && plot.bottom <= f64::from(tall),
                "{name}"
            );
        }
    }
    // The marker at C = 12 stands where the plot box says: a filled rectangle 2 px wide (1.5 on whole pixels) about x.
    let keep = from_sheet(&sheet, "keep").unwrap();
    let plot = plot_box(&keep, 888, height(&keep, 888)).unwrap();
    let same = plot_box(&from_sheet(&sheet, "eigenvalues").unwrap(), 888, 150).unwrap();
    assert_eq!(
        (plot.left, plot.right, plot.x0, plot.x1),
        (same.left, same.right, same.x0, same.x1)
    );
    assert_eq!((plot.left, plot.x0, plot.x1), (66.0, 1.0, 30.0));
    let x = plot.left + (12.0 - plot.x0) / (plot.x1 - plot.x0) * (plot.right - plot.left);
    let text = drawn(&keep, 888);
    let document = roxmltree::Document::parse(&text).unwrap();
    let number =
        |n: &roxmltree::Node, name: &str| n.attribute(name).unwrap().parse::<f64>().unwrap() / 10.0;
    let marker = document
        .descendants()
        .filter(|n| n.has_tag_name("rect"))
        .find(|n| {
            let (left, wide) = (number(n, "x"), number(n, "width"));
            (left + wide / 2.0 - x).abs() <= 1.0 && number(n, "height") > 100.0 && wide < 3.0
        });
    assert!(marker.is_some(), "no line at {x}");
}

#[test]
fn the_times_of_windows_that_touch_stand_side_by_side() {
    let mut sheet = sample::sheet(32, 40);
    let Contrast::Windows { signal, reference } = &mut sheet.recipe.contrast else {
        panic!("a contrast of event windows")
    };
    (signal.from_s, reference.to_s) = (0.0, 0.0);
    let text = drawn(&from_sheet(&sheet, "windows").unwrap(), 888);
    let document = roxmltree::Document::parse(&text).unwrap();
    let both = document
        .descendants()
        .filter(|n| n.text() == Some("0.00 s") && n.has_tag_name("text"));
    let x: Vec<f64> = both
        .map(|n| n.attribute("x").unwrap().parse::<f64>().unwrap() / 10.0)
        .collect();
    let plot = plot_box(&from_sheet(&sheet, "windows").unwrap(), 888, 304).unwrap();
    let zero = plot.left - plot.x0 / (plot.x1 - plot.x0) * (plot.right - plot.left);
    assert!(
        x[1] - x[0] > 40.0 && ((x[0] + x[1]) / 2.0 - zero).abs() < 1.0,
        "{x:?} about {zero}"
    );
}

#[test]
fn windows_of_two_events_stand_one_above_the_other() {
    let mut sheet = sample::sheet(32, 40);
    let Contrast::Windows { reference, .. } = &mut sheet.recipe.contrast else {
        panic!("a contrast of event windows")
    };
    (reference.event, reference.from_s, reference.to_s) = ("swell".into(), 0.2, 1.0);
    let figure = from_sheet(&sheet, "windows").unwrap();
    let text = drawn(&figure, 888);
    assert!(text.contains("signal, from buoy") && text.contains("reference, from swell"));
    assert_eq!(
        from_sheet(&sheet, "stronger-1-trials")
            .map(|f| matches!(f, Figure::Trials(t) if t.windows.is_none())),
        Some(true)
    );
}

#[test]
fn rows_share_an_axis_that_holds_every_interval() {
    let mut sheet = sample::sheet(32, 40);
    let ends = |sheet: &Sheet, name: &str| {
        let plot = plot_box(&from_sheet(sheet, name).unwrap(), 210, 40).unwrap();
        (plot.x0, plot.x1)
    };
    assert_eq!(ends(&sheet, "stronger-1-ratio"), (0.25, 4.0));
    sheet.weaker[0].typical.interval = Some([0.09, 0.3]);
    for name in ["stronger-1-ratio", "weaker-3-ratio", "ratio-axis"] {
        assert_eq!(ends(&sheet, name), (1.0 / 16.0, 16.0), "{name}");
    }
    let hollow = |sheet: &Sheet, name: &str| match from_sheet(sheet, name) {
        Some(Figure::Ratio(row)) => row.hollow,
        other => panic!("{other:?}"),
    };
    assert!(!hollow(&sheet, "stronger-1-ratio") && hollow(&sheet, "stronger-3-ratio"));
    sheet.stronger[0].typical.interval = Some([0.98, 4.0]);
    assert!(hollow(&sheet, "stronger-1-ratio"));
    sheet.recipe.measure = Measure::Total;
    assert!(
        !hollow(&sheet, "stronger-1-ratio"),
        "no interval to cross 1, and p = 0.004"
    );
}

#[test]
fn a_pattern_without_positions_is_shown_in_order_of_size() {
    let mut sheet = sample::sheet(32, 40);
    sheet.channels[0].position = None;
    let text = drawn(&from_sheet(&sheet, "stronger-1-map").unwrap(), 250);
    assert!(text.contains("1 channel without a position left off"));
    sheet.channels.iter_mut().for_each(|c| c.position = None);
    let text = drawn(&from_sheet(&sheet, "stronger-1-map").unwrap(), 250);
    assert!(text.contains("no map: 31 channels without a position") && text.contains("by size"));
    assert_eq!(from_sheet(&sheet, "channels-map"), None);
}

#[test]
fn tables_give_every_number_back() {
    let sheet = sample::sheet(32, 40);
    for (name, figure) in every(&sheet) {
        let table = table(&figure);
        assert!(name == "ratio-axis" || !table.rows.is_empty(), "{name}");
        assert!(
            table.rows.iter().all(|r| r.len() == table.columns.len()),
            "{name}"
        );
    }
    let spectra = sheet.stronger[0].spectra.as_ref().unwrap();
    let shown = table(&from_sheet(&sheet, "stronger-1-spectrum").unwrap());
    assert_eq!(shown.columns[1], "signal_dB");
    assert_eq!(shown.rows[0][0].parse::<f64>().unwrap(), 3.0);
    assert_eq!(
        shown.rows[0][1].parse::<f64>().unwrap(),
        10.0 * spectra.signal[3].log10()
    );
    let map = table(&from_sheet(&sheet, "stronger-1-map").unwrap());
    assert_eq!(
        map.rows[5][1].parse::<f64>().unwrap(),
        sheet.stronger[0].pattern[5]
    );
}

#[test]
fn traces_break_at_gaps_and_keep_extremes() {
    let mut recording = sample::recording(6);
    recording.samples[0][29_000] = 5000.0;
    recording.samples[1][100] = f32::NAN;
    let Figure::Traces(minute) = traces(&recording, 70.0, 60.0, &[0, 1, 99]) else {
        panic!("not traces");
    };
    assert_eq!(minute.lines.len(), 2, "index 99 does not exist");
    assert_eq!(minute.gaps, vec![[118.0, 122.0]]);
    assert!(minute.t_s.len() < 3000, "{} values", minute.t_s.len());
    let largest = minute.lines[0]
        .values
        .iter()
        .copied()
        .filter(|v| v.is_finite())
        .fold(0.0, f64::max);
    assert!(largest > 4990.0, "the one large sample is kept: {largest}");
    assert!(
        minute
            .t_s
            .iter()
            .filter(|t| t.is_finite())
            .all(|t| !(118.0..122.0).contains(t))
    );
    for (from, long) in [
        (-5.0, 10.0),
        (119.0, 2.0),
        (235.0, 20.0),
        (500.0, 10.0),
        (0.0, 0.004),
        (0.0, 240.0),
    ] {
        let figure = traces(&recording, from, long, &[0, 1, 2, 3, 4, 5]);
        for width in WIDTHS {
            sound(&format!("traces from {from}"), &drawn(&figure, width));
        }
        let back: Figure = serde_json::from_str(&serde_json::to_string(&figure).unwrap()).unwrap();
        assert!(drawn(&back, 888) == drawn(&figure, 888));
        table(&figure);
    }
    sound(
        "no channel",
        &drawn(&traces(&recording, 0.0, 10.0, &[]), 888),
    );
}

#[test]
fn the_dark_scheme_changes_colours_and_nothing_else() {
    let sheet = sample::sheet(32, 40);
    let dark = Look {
        scheme: Scheme::Dark,
        ..Look::default()
    };
    for (name, figure) in every(&sheet) {
        let tall = height(&figure, 520);
        let (a, b) = (drawn(&figure, 520), svg(&figure, 520, tall, &dark));
        assert!(a.contains("#FFFFFF") && !b.contains("#FFFFFF"), "{name}");
        sound(&name, &b);
    }
}

#[test]
fn a_map_shows_the_value_of_every_channel() {
    let mut sheet = sample::sheet(32, 40);
    for i in [3, 12, 19, 29] {
        let pattern = &mut sheet.stronger[0].pattern;
        pattern.fill(0.0);
        pattern[i] = 3.0;
        let Some(Figure::Map(map)) = from_sheet(&sheet, "stronger-1-map") else {
            panic!("no map");
        };
        // The spline passes within 1 % of every channel; the nearest point of the grid lies up to half a step away.
        let [x, y] = map.places[i].unwrap();
        let side = (map.grid.len() as f64).sqrt() as usize;
        let index = |v: f64| ((v / 1.12 + 1.0) / 2.0 * (side - 1) as f64).round() as usize;
        let shown = map.grid[index(-y) * side + index(x)];
        assert!((shown - 3.0).abs() < 0.2, "channel {i}: {shown}");
    }
}

#[test]
fn labels_drop_what_nearly_all_names_share() {
    let names = ["EEG Fp1-REF", "EEG Cz-REF", "EEG O2-REF"];
    let shared = crate::text::Shared::of(names.into_iter());
    assert_eq!(names.map(|n| shared.without(n)), ["Fp1", "Cz", "O2"]);
    // Nearly all is enough.
    let names = ["EEG Fz", "EEG Cz", "EEG Pz", "EEG Oz", "EOG"];
    let shared = crate::text::Shared::of(names.into_iter());
    assert_eq!(
        names.map(|n| shared.without(n)),
        ["Fz", "Cz", "Pz", "Oz", "EOG"]
    );
    for names in [
        ["Fp1", "Fp2", "Fpz"],
        ["A-1", "A-1", "B-2"],
        ["x y", "x z", "x "],
        ["-", "-", "-"],
    ] {
        let shared = crate::text::Shared::of(names.into_iter());
        assert_eq!(names.map(|n| shared.without(n)), names);
    }
}
