//! Saved filters on another recording, the lists of works, and the report as a validator reads it.
#![allow(clippy::print_stderr, reason = "a check that is left out says so")]
use super::sample;
use std::process::Command;
use teasel_core::analysis::Analysis;
use teasel_core::demo::night_watch;
use teasel_core::recipe::Keep;
use teasel_core::takeaway::{Weights, bibtex, references, report_html, weights_json};

/// Filters of one night on the next: the planted rhythm is separated without refitting, and nothing is found where the events are
/// moved off the effect.
#[test]
fn filters_of_one_night_separate_the_next() {
    let first = night_watch(1);
    let mut recipe = first.recipe;
    recipe.keep = Keep::Number(16);
    recipe.components = 1;
    recipe.evidence.permutations = 0;
    let mut analysis = Analysis::new(first.recording, recipe.clone()).unwrap();
    analysis.run(|_| {}).unwrap();
    let weights = Weights::from_json(&weights_json(analysis.sheet()).unwrap()).unwrap();
    let mut next = night_watch(2).recording;
    let carried = weights.carry(&next, &recipe).unwrap();
    let row = &carried.rows[0];
    assert!(
        row.typical > 1.2 && row.interval.unwrap()[0] > 1.0,
        "{row:?}"
    );
    assert!(row.reading.contains("still separates"), "{}", row.reading);
    assert_eq!(carried.rows.len(), 2);
    let component = &carried.sheet.stronger[0];
    let peak = component.peak_hz.unwrap();
    assert!((18.0..24.0).contains(&peak), "{peak}");
    assert!(component.image.is_some() && component.course.is_some());
    // Events 2 s before the buoys: both windows lie before the effect.
    next.events.iter_mut().for_each(|e| e.onset_s -= 2.0);
    next.events.retain(|e| e.onset_s > 2.0);
    let nowhere = weights.carry(&next, &recipe).unwrap();
    let interval = nowhere.rows[0].interval.unwrap();
    assert!(interval[0] < 1.0, "{:?}", nowhere.rows[0]);
}

#[test]
fn every_cited_work_is_an_entry_of_its_own() {
    let sheet = sample::sheet();
    let entries = bibtex(&sheet);
    let works = references(&sheet);
    assert_eq!(entries.matches("\n@").count() + 1, works.len(), "{entries}");
    for line in works {
        let year: String = line
            .chars()
            .skip_while(|c| *c != '(')
            .skip(1)
            .take(4)
            .collect();
        assert!(entries.contains(&format!("year = {{{year}}}")), "{line}");
    }
    assert!(
        entries.contains("@article{haufe2014,") && entries.contains("Haynes, J.-D. and"),
        "{entries}"
    );
    assert_eq!(entries.matches('{').count(), entries.matches('}').count());
}

/// html5lib's strict parser (the HTML standard's own parse errors), where the checks' Python has it; also with hostile names.
#[test]
fn the_report_is_valid_html() {
    let Some(python) = std::env::var_os("TEASEL_PYTHON") else {
        eprintln!("TEASEL_PYTHON is not set: the report is not validated here");
        return;
    };
    const SCRIPT: &str = "import sys, html5lib\nhtml5lib.HTMLParser(strict=True).parse(sys.stdin.buffer.read().decode('utf-8'))";
    for sheet in [sample::sheet(), sample::hostile()] {
        let html = report_html(&sheet, &[]);
        let mut child = Command::new(&python)
            .args(["-c", SCRIPT])
            .stdin(std::process::Stdio::piped())
            .stderr(std::process::Stdio::piped())
            .spawn()
            .unwrap();
        std::io::Write::write_all(&mut child.stdin.take().unwrap(), html.as_bytes()).unwrap();
        let output = child.wait_with_output().unwrap();
        assert!(
            output.status.success(),
            "{}",
            String::from_utf8_lossy(&output.stderr)
        );
    }
}
