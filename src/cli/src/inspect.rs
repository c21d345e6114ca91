//! `teasel inspect`: what a recording holds, and a recipe to begin with.
use crate::say::{self, Meter};
use crate::{Given, source};
use serde_json::{Value, json};
use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::io::Write as _;
use std::path::Path;
use teasel_core::analysis::{Proposal, propose};
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recording::{Opened, Recording};
use teasel_core::takeaway::recipe_json;

/// Inspects all recordings; false where one was bad.
pub fn inspect(given: &Given, as_json: bool) -> bool {
    let mut fine = true;
    let mut cards = Vec::new();
    let recordings = given.each();
    for path in &recordings {
        match one(path, given, as_json) {
            Ok(card) => cards.push(card),
            Err(problem) => {
                say::problem(&problem.in_file(source::file_name(path)));
                fine = false;
            }
        }
    }
    let text = if !as_json {
        cards.iter().filter_map(Value::as_str).collect()
    } else if let ([card], 1) = (&cards[..], recordings.len()) {
        format!("{card:#}\n")
    } else if cards.is_empty() {
        String::new()
    } else {
        format!("{:#}\n", Value::Array(cards))
    };
    // A closed pipe (as after `head`) is nobody's problem.
    let _ = std::io::stdout().write_all(text.as_bytes());
    fine
}

fn one(path: &Path, given: &Given, as_json: bool) -> Result<Value> {
    let mut meter = Meter::new(&source::file_name(path));
    let recording = match source::open(path, given, &given.told.given(), &mut meter)? {
        Opened::Whole(recording) => recording,
        Opened::Large(large) => large.outline().clone(),
    };
    if as_json {
        card(&recording, given)
    } else {
        text(&recording, given).map(Value::String)
    }
}

/// The core's proposal, with what was told on the command line.
fn proposal(recording: &Recording, given: &Given) -> Option<Proposal> {
    propose(recording).map(|mut proposal| {
        proposal.recipe.recording = given.told.given();
        proposal
    })
}

fn counts(recording: &Recording) -> BTreeMap<&str, usize> {
    let mut counts = BTreeMap::new();
    for event in &recording.events {
        *counts.entry(event.label.as_str()).or_insert(0) += 1;
    }
    counts
}

fn card(recording: &Recording, given: &Given) -> Result<Value> {
    let failed = |e: serde_json::Error| {
        Problem::new(
            Kind::Storage,
            format!("the answer could not be put together: {e}"),
            "inspect it without --json",
        )
    };
    let value = |x: &dyn Fn() -> serde_json::Result<Value>| x().map_err(failed);
    Ok(json!({
        "name": recording.name,
        "format": recording.format,
        "rate_hz": recording.rate_hz,
        "duration_s": recording.duration_s(),
        "samples": recording.sample_count(),
        "channels": value(&|| serde_json::to_value(&recording.channels))?,
        "not_analysed": value(&|| serde_json::to_value(&recording.others))?,
        "stretches": value(&|| serde_json::to_value(&recording.stretches))?,
        "events": counts(recording),
        "side_files": recording.side_files,
        "warnings": recording.warnings,
        "proposal": value(&|| serde_json::to_value(proposal(recording, given)))?,
    }))
}

/// A name from a file on one line of a terminal: control characters and marks of direction made visible.
fn shown(text: &str) -> String {
    text.chars()
        .flat_map(|c| {
            let unseen = c.is_control()
                || matches!(c, '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}');
            let escaped: String = if unseen {
                c.escape_unicode().collect()
            } else {
                c.into()
            };
            escaped.chars().collect::<Vec<_>>()
        })
        .collect()
}

fn text(recording: &Recording, given: &Given) -> Result<String> {
    let mut out = String::new();
    let mut put = |label: &str, value: String| {
        // Writing to a String cannot fail.
        let _ = writeln!(out, "{label:<13}{value}");
    };
    put("recording", shown(&recording.name));
    put("format", recording.format.clone());
    put(
        "samples",
        format!(
            "{} a channel at {} Hz, {} s",
            recording.sample_count(),
            recording.rate_hz,
            recording.duration_s()
        ),
    );
    if recording.stretches.len() > 1 {
        put(
            "stretches",
            format!("{}, with gaps between them", recording.stretches.len()),
        );
    }
    let units: BTreeMap<&str, Vec<&str>> =
        recording
            .channels
            .iter()
            .fold(BTreeMap::new(), |mut units, c| {
                units
                    .entry(c.unit.as_str())
                    .or_insert_with(Vec::new)
                    .push(c.name.as_str());
                units
            });
    for (unit, names) in units {
        let names: Vec<String> = names.into_iter().map(shown).collect();
        put(
            "channels",
            format!("{} in {}: {}", names.len(), shown(unit), names.join(", ")),
        );
    }
    for other in &recording.others {
        put(
            "not analysed",
            format!("{}: {}", shown(&other.name), shown(&other.reason)),
        );
    }
    for (label, count) in counts(recording) {
        put("event", format!("{} ({count} times)", shown(label)));
    }
    for side in &recording.side_files {
        put("side file", shown(side));
    }
    for warning in &recording.warnings {
        put("note", shown(warning));
    }
    match proposal(recording, given) {
        Some(proposal) => {
            put("proposal", shown(&proposal.why));
            out.push_str(&recipe_json(&proposal.recipe)?);
        }
        None => put("proposal", "none: no event occurs ten times".into()),
    }
    Ok(out)
}
