//! The report and the methods paragraph: what must be in them, and that no name becomes markup.
use super::sample;
use teasel_core::CAUTION;
use teasel_core::recipe::*;
use teasel_core::sheet::Sheet;
use teasel_core::takeaway::{methods, references, report_html};

fn drawn(sheet: &Sheet) -> Vec<(String, String, String)> {
    teasel_figures::names(sheet)
        .into_iter()
        .filter_map(|(name, caption)| {
            let figure = teasel_figures::from_sheet(sheet, &name)?;
            let height = teasel_figures::height(&figure, 680);
            let svg = teasel_figures::svg(&figure, 680, height, &teasel_figures::Look::default());
            Some((name, caption, svg))
        })
        .collect()
}

/// Every tag of the page in order: its name, and whether it closes.
fn tags(html: &str) -> Vec<(String, bool)> {
    html.split('<')
        .skip(1)
        .filter(|t| !t.starts_with('!') && !t.starts_with('?'))
        .map(|t| {
            let closing = t.starts_with('/');
            let name: String = t
                .trim_start_matches('/')
                .chars()
                .take_while(|c| c.is_ascii_alphanumeric())
                .collect();
            (name.to_ascii_lowercase(), closing)
        })
        .collect()
}

#[test]
fn the_report_is_whole_and_needs_nothing_else() {
    let sheet = sample::sheet();
    let figures = drawn(&sheet);
    assert!(figures.len() > 5);
    let html = report_html(&sheet, &figures);
    assert_eq!(html, report_html(&sheet, &figures));
    assert!(html.starts_with("<!DOCTYPE html><html lang=\"en\">"));
    let parts = [
        CAUTION,
        teasel_core::VERSION,
        "night-watch.edf",
        "2.83×",
        "2.33–3.47",
        "p\u{a0}≤\u{a0}0.05",
        "Within each trial the two windows could be exchanged.",
        "Best channel",
        "T7 was left out.",
        "&quot;teasel_recipe&quot;: 1",
        "Haufe",
        "default-src 'none'",
        "high-pass 1 Hz, 1 Hz transition, 825 taps",
    ];
    for part in parts {
        assert!(html.contains(part), "{part}");
    }
    // Nothing is loaded, nothing runs.
    let names: Vec<String> = tags(&html).into_iter().map(|t| t.0).collect();
    for none in [
        "script",
        "link",
        "img",
        "iframe",
        "object",
        "embed",
        "form",
        "base",
        "foreignobject",
    ] {
        assert!(!names.iter().any(|n| n == none), "{none}");
    }
    for none in [
        " src=",
        "url(",
        "@import",
        "javascript:",
        " onload",
        " onerror",
    ] {
        assert!(!html.contains(none), "{none}");
    }
    // Every figure stands in it but those that no section shows.
    let shown = figures
        .iter()
        .filter(|(_, _, svg)| html.contains(svg.as_str()))
        .count();
    assert!(shown >= 5, "{shown} of {}", figures.len());
}

#[test]
fn elements_close_in_the_order_they_open() {
    for sheet in [sample::sheet(), sample::hostile(), sample::bare()] {
        let html = report_html(&sheet, &[]);
        let mut open: Vec<String> = Vec::new();
        for (name, closing) in tags(&html) {
            if ["meta", "br"].contains(&name.as_str()) {
                continue;
            }
            if closing {
                assert_eq!(open.pop().as_deref(), Some(name.as_str()));
            } else {
                open.push(name);
            }
        }
        assert!(open.is_empty(), "{open:?}");
    }
}

#[test]
fn hostile_names_stay_text() {
    let sheet = sample::hostile();
    let html = report_html(&sheet, &drawn(&sheet));
    let names: Vec<String> = tags(&html).into_iter().map(|t| t.0).collect();
    for none in ["script", "img", "b0"] {
        assert!(!names.iter().any(|n| n == none), "{none}");
    }
    assert!(!html.contains("<svg onload") && html.contains("&lt;svg onload"));
    assert!(html.contains("&lt;script&gt;alert(1)&lt;/script&gt;"));
    for mark in ["\u{202e}", "\u{200f}"] {
        let around = html
            .find(mark)
            .map(|at| html[..at].chars().rev().take(80).collect::<String>());
        assert_eq!(around, None);
    }
    assert!(!html.contains('\0') && !html.contains('\u{b}'));
    assert_eq!(html.matches("</style>").count(), 1);
}

#[test]
fn a_ratio_that_was_withheld_is_not_in_the_report() {
    let mut sheet = sample::sheet();
    let windows = sheet.windows.as_mut().unwrap();
    windows.signal.used = 7;
    windows.reference.used = 7;
    for c in sheet.stronger.iter_mut().chain(&mut sheet.weaker) {
        c.p = None;
        c.typical.fitted = 7.77;
        c.typical.held_out = None;
        c.typical.interval = None;
        c.total.held_out = None;
    }
    sheet.permutation = None;
    sheet.compare.clear();
    sheet.curve = None;
    let html = report_html(&sheet, &[]);
    assert!(html.contains("both are withheld") && !html.contains("7.77"));
}

#[test]
fn the_methods_paragraph_holds_every_choice() {
    let sheet = sample::sheet();
    let text = methods(&sheet).replace('\u{a0}', " ");
    let parts = [
        "7 of 8 channels sampled at 250 Hz",
        "left out: T7",
        "referred to their average",
        "high-pass 1 Hz",
        "low-pass 40 Hz",
        "0.20 to 1.00 s relative to the onset of “buoy”",
        "−1.00 to −0.20 s relative to the same onset (40 pairs; 2 left out)",
        "rank 6",
        "5 dimensions (99.1 % of the variance; set by hand)",
        "neither the held-out ratios nor p would account for that",
        "without use of the labels",
        "log-Euclidean",
        "ρ = 0.1",
        "5 folds",
        "500 samples",
        "1,000 random swaps",
        "within each trial the two windows could be exchanged",
        "p = (b + 1)/(m + 1)",
        "Teasel 0.1.0 (seed 1",
    ];
    for part in parts {
        assert!(text.contains(part), "{part}\n{text}");
    }
    assert!(!text.contains("night-watch"), "no file name");
}

#[test]
fn every_citation_has_its_reference_and_every_reference_its_citation() {
    let mut total = sample::sheet();
    total.recipe.measure = Measure::Total;
    total.recipe.shrink = Shrink::Word(ShrinkWord::Oas);
    total.recipe.keep = Keep::Word(KeepWord::Best);
    let mut wolf = total.clone();
    wolf.recipe.shrink = Shrink::Word(ShrinkWord::LedoitWolf);
    for sheet in [sample::sheet(), total, wolf, sample::bare()] {
        let text = methods(&sheet);
        let list = references(&sheet);
        let cited = text.matches(", 19").count() + text.matches(", 20").count();
        assert!(cited >= list.len(), "{text}");
        for entry in &list {
            let author = entry.split(',').next().unwrap();
            let year = &entry[entry.find('(').unwrap() + 1..entry.find(')').unwrap()];
            assert!(text.contains(author) && text.contains(year), "{entry}");
        }
        let mut sorted = list.clone();
        sorted.sort();
        assert_eq!(list, sorted);
        // Whatever looks like a citation is in the list.
        for (at, _) in text.match_indices(" et al., ") {
            let author = text[..at].rsplit([' ', '(', ';', '\u{a0}']).next().unwrap();
            let year = &text[at + 9..at + 13];
            assert!(
                list.iter()
                    .any(|e| e.starts_with(author) && e.contains(year)),
                "{author} {year}"
            );
        }
    }
}
