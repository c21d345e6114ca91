//! A recipe inside an address: `#recipe=<base64url of recipe.json>`.
//!
//! A link holds settings only. Channel and event names can tell about a person or a study, so they go in only when the
//! user ticks them in; otherwise an event is written as its rank (1, 2) and is filled in from the recording that the link is
//! opened with: rank k is its k-th most frequent event. What else was left out is listed under `without`.
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Contrast, Pairs, Recipe, Reference, Spans, Within};
use base64::Engine;
use base64::alphabet::URL_SAFE;
use base64::engine::{DecodePaddingMode, GeneralPurpose, GeneralPurposeConfig};
use serde::{Deserialize, Serialize};
use serde_json::{Value, json};
use std::collections::BTreeMap;

/// No padding is written; with and without is read.
const ENGINE: GeneralPurpose = GeneralPurpose::new(
    &URL_SAFE,
    GeneralPurposeConfig::new()
        .with_encode_padding(false)
        .with_decode_padding_mode(DecodePaddingMode::Indifferent),
);

/// Names that a link without names can leave out.
const LEFT_OUT: [(&str, &str); 7] = [
    (
        "channels.leave_out",
        "The link names no channels: what its sender left out is not left out here.",
    ),
    (
        "channels.interpolate",
        "The link names no channels: what its sender interpolated is used as recorded here.",
    ),
    (
        "channels.reference",
        "The link names no channels: its sender's reference channels are replaced by the reference as recorded.",
    ),
    (
        "channels.keep",
        "The link names no channels: which doubtful ones its sender looked at and kept is not told here.",
    ),
    (
        "recording.variable",
        "The link does not name the array that its sender opened.",
    ),
    (
        "channels.positions",
        "The link names no channels: its sender's positions are not used here.",
    ),
    (
        "recording.events",
        "The link names no columns: the table of events has to be told anew.",
    ),
];

/// Further labels of a window.
const MORE_LABELS: (&str, &str) = (
    "contrast.also",
    "The link names no events: further labels that its sender counted in, or waited for, are not used here.",
);

/// Where a recipe can name an event.
const SLOTS: [&str; 7] = [
    "/contrast/signal/event",
    "/contrast/reference/event",
    "/contrast/within/event",
    "/contrast/event",
    "/contrast/signal",
    "/contrast/reference",
    "/contrast/within",
];

/// The names of events in a question, each with its place as a JSON pointer (RFC 6901): two at most.
fn slots(contrast: &Contrast) -> Vec<(&'static str, &str)> {
    let windows = contrast.around();
    let places: &[&str] = match contrast {
        Contrast::Windows { .. } => &SLOTS[..2],
        Contrast::Repeatable(_) => &SLOTS[3..4],
        _ => &SLOTS[2..3],
    };
    let named = (places.iter().copied()).zip(windows.into_iter().map(|w| w.event.as_str()));
    let spans = contrast.spans().into_iter().filter_map(|(side, spans)| {
        let place = SLOTS[4..].iter().find(|p| p.ends_with(side))?;
        match spans {
            Spans::Label(label) if !spans.is_rest() => Some((*place, label.as_str())),
            _ => None,
        }
    });
    named.chain(spans).collect()
}

/// What a link holds: a recipe, whole or with its events left to the recording.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RecipeLink {
    /// The recipe; where `events` is set, its event labels are empty until [`RecipeLink::complete`].
    pub recipe: Recipe,
    /// Ranks of the signal and the reference event among the recording's events by number of occurrences, from 1.
    pub events: Option<[usize; 2]>,
    /// Paths of the settings that were left out because they hold names.
    pub without: Vec<String>,
}

/// The fragment's text for a recipe.
pub fn link_encode(recipe: &Recipe, with_names: bool) -> String {
    let value = serde_json::to_value(recipe).unwrap_or(Value::Null);
    let value = if with_names {
        value
    } else {
        strip(recipe, value)
    };
    ENGINE.encode(value.to_string())
}

fn strip(recipe: &Recipe, mut value: Value) -> Value {
    let mut without = Vec::new();
    let slots = slots(&recipe.contrast);
    for (pointer, label) in &slots {
        let rank = if slots.first().is_some_and(|(_, first)| first == label) {
            1
        } else {
            2
        };
        if let Some(event) = value.pointer_mut(pointer) {
            *event = json!(rank);
        }
    }
    let mut more = false;
    for at in [
        "/contrast/signal",
        "/contrast/reference",
        "/contrast/within",
        "/contrast",
    ] {
        if let Some(Value::Object(window)) = value.pointer_mut(at) {
            more |= window.remove("also").is_some();
            if window.remove("until").is_some() {
                more = true;
                // Without the event that ends it a window needs a length of its own.
                let end = window.get("from_s").and_then(Value::as_f64).unwrap_or(0.0) + 1.0;
                window.insert("to_s".into(), json!(end));
            }
        }
    }
    if more {
        without.push(MORE_LABELS.0);
    }
    let channels = &recipe.channels;
    let named = [
        !channels.leave_out.is_empty(),
        !channels.interpolate.is_empty(),
        matches!(&channels.reference, Reference::Named(_))
            || matches!(&channels.reference, Reference::Bipolar(b) if matches!(b.bipolar, Pairs::List(_))),
        !channels.keep.is_empty(),
        recipe.recording.variable.is_some(),
        channels.positions.is_some(),
        recipe.recording.events.is_some(),
    ];
    for ((path, _), _) in LEFT_OUT.iter().zip(named).filter(|(_, named)| *named) {
        without.push(*path);
        if let Some((part, key)) = path.split_once('.')
            && let Some(Value::Object(map)) = value.get_mut(part)
        {
            map.remove(key);
        }
    }
    if let Value::Object(map) = &mut value {
        map.insert("without".into(), json!(without));
    }
    value
}

/// Reads the fragment's text (what stands after `#recipe=`). As strict as [`super::recipe_from_json`].
pub fn link_decode(text: &str) -> Result<RecipeLink> {
    let damaged = |found: String| {
        Problem::new(
            Kind::Recipe,
            "the link does not hold a recipe",
            "copy the whole link again",
        )
        .expected_found("base64url of a recipe", found)
    };
    let text = text.trim();
    let text = text.strip_prefix('#').unwrap_or(text);
    let text = text.strip_prefix("recipe=").unwrap_or(text);
    if text.len() > super::strict::RECIPE_BYTES * 2 {
        return Err(damaged(format!("{} characters", text.len())));
    }
    let bytes = ENGINE.decode(text).map_err(|e| damaged(e.to_string()))?;
    let json = String::from_utf8(bytes).map_err(|e| {
        damaged(format!(
            "a byte that is no text at {}",
            e.utf8_error().valid_up_to()
        ))
    })?;
    let mut value: Value = match serde_json::from_str(&json) {
        Ok(value) => value,
        Err(_) => return super::recipe_from_json(&json).map(RecipeLink::whole),
    };
    let Some(without) = value.as_object_mut().and_then(|map| map.remove("without")) else {
        return super::recipe_from_json(&json).map(RecipeLink::whole);
    };
    RecipeLink::open(value, without).map_err(|found| damaged(found.to_string()))?
}

impl RecipeLink {
    fn whole(recipe: Recipe) -> Self {
        RecipeLink {
            recipe,
            events: None,
            without: Vec::new(),
        }
    }

    /// The outer error names a part of the link's own; the inner one is the recipe's.
    fn open(mut value: Value, without: Value) -> std::result::Result<Result<Self>, &'static str> {
        let mut ranks = Vec::new();
        for pointer in SLOTS {
            let Some(event) = value.pointer_mut(pointer) else {
                continue;
            };
            let place_of_label = pointer.ends_with("/event") || event.is_number();
            if !place_of_label {
                continue;
            }
            let rank = event.as_u64().filter(|k| (1..=2).contains(k));
            ranks.push(rank.ok_or("an event that is neither 1 nor 2")? as usize);
            *event = json!("event");
        }
        let without: Vec<String> =
            serde_json::from_value(without).map_err(|_| "a list of paths that is none")?;
        if without.iter().any(|w| {
            !LEFT_OUT
                .iter()
                .chain([&MORE_LABELS])
                .any(|(path, _)| path == w)
        }) {
            return Err("an unknown path in without");
        }
        Ok(
            super::recipe_from_json(&value.to_string()).map(|mut recipe| {
                for name in names_mut(&mut recipe.contrast) {
                    name.clear();
                }
                let events = (ranks.first()).map(|first| [*first, *ranks.get(1).unwrap_or(first)]);
                RecipeLink {
                    recipe,
                    events,
                    without,
                }
            }),
        )
    }

    /// The recipe for a recording with these events (label → occurrences), and what the reader should know, each a sentence.
    /// Fails where the recording has too few kinds of events.
    pub fn complete(&self, events: &BTreeMap<String, usize>) -> Result<(Recipe, Vec<String>)> {
        let mut recipe = self.recipe.clone();
        let mut notes: Vec<String> = LEFT_OUT
            .iter()
            .chain([&MORE_LABELS])
            .filter(|(path, _)| self.without.iter().any(|w| w == path))
            .map(|(_, note)| (*note).to_string())
            .collect();
        let Some(ranks) = self.events else {
            return Ok((recipe, notes));
        };
        let mut labels: Vec<(&String, &usize)> = events.iter().collect();
        labels.sort_by(|a, b| b.1.cmp(a.1).then(a.0.cmp(b.0)));
        let pick = |rank: usize| {
            labels.get(rank - 1).map(|(label, _)| (*label).clone()).ok_or_else(|| {
                Problem::new(
                    Kind::Contrast,
                    "the link leaves the events to the recording, and the recording has too few kinds of them",
                    "choose the events by hand",
                )
                .expected_found(format!("at least {rank}"), labels.len())
            })
        };
        for (name, rank) in names_mut(&mut recipe.contrast).into_iter().zip(ranks) {
            *name = pick(rank)?;
        }
        notes.push(format!(
            "The link names no events: {} was taken, the most frequent here.",
            super::strict::quote(&pick(ranks[0])?)
        ));
        Ok((recipe, notes))
    }
}

/// The names of events in a question, in the order of [`slots`].
fn names_mut(contrast: &mut Contrast) -> Vec<&mut String> {
    match contrast {
        Contrast::Windows { signal, reference } => vec![&mut signal.event, &mut reference.event],
        Contrast::Repeatable(window) => vec![&mut window.event],
        Contrast::Spans {
            signal, reference, ..
        } => [signal, reference]
            .into_iter()
            .filter_map(label_mut)
            .collect(),
        Contrast::Band {
            within: Some(within),
            ..
        }
        | Contrast::Slow {
            within: Some(within),
            ..
        } => match within {
            Within::Window(window) => vec![&mut window.event],
            Within::Spans(spans) => label_mut(spans).into_iter().collect(),
        },
        Contrast::Band { within: None, .. } | Contrast::Slow { within: None, .. } => Vec::new(),
    }
}

fn label_mut(spans: &mut Spans) -> Option<&mut String> {
    if spans.is_rest() {
        return None;
    }
    match spans {
        Spans::Label(label) => Some(label),
        Spans::Times(_) => None,
    }
}
