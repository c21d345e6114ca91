//! `teasel inspect`: what a recording holds, and a recipe to begin with.
use crate::say::{self, Meter};
use crate::{Given, source};
use serde_json::{Value, json};
use std::fmt::Write as _;
use std::io::Write as _;
use std::path::Path;
use teasel_core::analysis::{Proposal, Summary, propose, summary};
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recording::{Opened, Recording};
use teasel_core::sheet::ChannelCard;
use teasel_core::takeaway::{facts, recipe_json, timelines};

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
        Opened::Whole(recording) => *recording,
        Opened::Large(large) => large.outline().clone(),
    };
    if as_json {
        card(&recording, given)
    } else {
        text(&recording, given).map(Value::String)
    }
}

/// Columns of a timeline of events, and how many labels get one.
const TIMELINE: (usize, usize) = (60, 8);

/// The core's proposal, with what was told on the command line.
fn proposal(recording: &Recording, given: &Given) -> Option<Proposal> {
    propose(recording).map(|mut proposal| {
        proposal.recipe.recording = given.told.given();
        proposal
    })
}

fn card(recording: &Recording, given: &Given) -> Result<Value> {
    let summary = summary(recording);
    let failed = |e: serde_json::Error| {
        Problem::new(
            Kind::Storage,
            format!("the answer could not be put together: {e}"),
            "inspect it without --json",
        )
    };
    let value = |x: &dyn Fn() -> serde_json::Result<Value>| x().map_err(failed);
    let card = &summary.recording;
    Ok(json!({
        "name": card.name,
        "format": card.format,
        "rate_hz": card.rate_hz,
        "duration_s": card.duration_s,
        "samples": recording.sample_count(),
        "starts_at": card.about.start,
        "channels": value(&|| serde_json::to_value(channels(&summary)))?,
        "not_analysed": value(&|| serde_json::to_value(&card.others))?,
        "set_aside": card.about.aside,
        "layout": value(&|| serde_json::to_value(&card.layout))?,
        "positions_from": card.about.positions,
        "reference": card.about.reference,
        "mains_hz": card.about.mains_hz,
        "stretches": value(&|| serde_json::to_value(&card.stretches))?,
        "events": card.events,
        "side_files": card.side_files,
        "warnings": card.warnings,
        "proposal": value(&|| serde_json::to_value(proposal(recording, given)))?,
    }))
}

/// Name, unit, kind and position of each channel.
fn channels(summary: &Summary) -> Vec<Value> {
    let kinds = &summary.recording.about.kinds;
    let one = |c: &ChannelCard| json!({ "name": c.name, "unit": c.unit, "kind": kinds.get(&c.name), "position": c.position });
    summary.channels.iter().map(one).collect()
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
    let summary = summary(recording);
    let mut out = String::new();
    let mut put = |label: &str, value: String| {
        // Writing to a String cannot fail. Spaces that do not break are for pages, and cannot be searched for in a terminal.
        let _ = writeln!(out, "{label:<13}{}", value.replace('\u{a0}', " "));
    };
    put("recording", shown(&recording.name));
    for fact in facts(&summary.recording, &summary.channels) {
        put(&fact.label, shown(&fact.text));
    }
    for (label, line) in timelines(&summary.recording, TIMELINE.0, TIMELINE.1) {
        put("", format!("{line} {}", shown(&label)));
    }
    let names: Vec<String> = recording.channels.iter().map(|c| shown(&c.name)).collect();
    put("names", names.join(", "));
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
