//! Side files: what lies beside a recording and tells about it.
//!
//! `names` which file belongs to which recording · `table` small tables as text · `events`, `channels`, `electrodes` what they say ·
//! `facts` JSON about the recording and about coordinates.
//!
//! A side file is known by the name that the BIDS standard gives it, else by the names of its columns or keys. Of several of one kind the one
//! counts that shares the most entities with the recording's name; files about the recording as a whole complete each other.
mod channels;
mod electrodes;
mod events;
mod facts;
mod names;
mod table;

pub use events::{EventsPreview, events_preview};
pub use names::lies_beside;

use super::{Recording, SideFile};
use crate::error::{Kind, Problem, Result};
use crate::recipe::Given;
use table::{Header, Table};

/// What a side file is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum About {
    Events,
    Channels,
    Electrodes,
    Coordinates,
    Facts,
    /// A table whose columns have to be told.
    Table,
    Nothing,
}

/// What may be read of a table to know it by its columns.
const LOOK_BYTES: usize = 4 << 20;

/// What a recording's own reader is to be told: a rate and a unit that its format does not carry and side files do.
pub(super) fn complete(given: &Given, recording: &str, sides: &[SideFile]) -> Result<Given> {
    let mut given = given.clone();
    if given.rate_hz.is_none() {
        given.rate_hz = facts::facts(&about_recording(recording, sides, About::Facts))?.rate_hz;
    }
    if given.unit.is_none() {
        let tables = about_recording(recording, sides, About::Channels);
        given.unit = tables.last().and_then(|table| channels::unit(table));
    }
    Ok(given)
}

/// Uses the side files, and says which were not used and why.
pub(super) fn apply(recording: &mut Recording, sides: &[SideFile], given: &Given) -> Result<()> {
    let labels: Vec<String> = recording.channels.iter().map(|c| c.name.clone()).collect();
    let labels: Vec<&str> = labels.iter().map(String::as_str).collect();
    let own = |side: &&SideFile| names::kinship(&recording.name, &side.name).is_some();
    let (mine, foreign): (Vec<&SideFile>, Vec<&SideFile>) = sides.iter().partition(own);
    let sorted: Vec<(About, &SideFile)> = mine
        .into_iter()
        .map(|side| (about(side, &labels), side))
        .collect();
    let of = |wanted: About| -> Vec<&SideFile> {
        let found = sorted.iter().filter(|(about, _)| *about == wanted);
        found.map(|(_, side)| *side).collect()
    };
    let name = recording.name.clone();
    for side in foreign {
        recording.warnings.push(format!(
            "{} was not used: by its name it belongs to another recording.",
            side.name
        ));
    }
    for side in of(About::Nothing) {
        recording.warnings.push(format!(
            "{} was not used: it is no side file that Teasel knows.",
            side.name
        ));
    }
    apply_facts(recording, &of(About::Facts), given)?;
    if let Some(side) = the_one(&of(About::Channels), &name, "tables of channels")? {
        channels::apply(recording, side)?;
    }
    apply_electrodes(
        recording,
        &of(About::Electrodes),
        &of(About::Coordinates),
        &name,
    )?;
    apply_events(recording, &of(About::Events), &of(About::Table), given)
}

fn apply_facts(recording: &mut Recording, sides: &[&SideFile], given: &Given) -> Result<()> {
    let sides = general_first(sides, &recording.name);
    let told = facts::facts(&sides)?;
    recording.about.mains_hz = told.mains_hz;
    recording.about.reference = told.reference;
    if let Some(hz) = told.rate_hz.filter(|_| given.rate_hz.is_none())
        && (hz / recording.rate_hz - 1.0).abs() > 0.01
    {
        let files: Vec<&str> = sides.iter().map(|s| s.name.as_str()).collect();
        recording.warnings.push(format!(
            "{} gives a sampling rate of {hz} Hz; the recording's own {} Hz counts.",
            files.join(" and "),
            recording.rate_hz
        ));
    }
    recording
        .side_files
        .extend(sides.iter().map(|s| s.name.clone()));
    Ok(())
}

fn apply_electrodes(
    recording: &mut Recording,
    tables: &[&SideFile],
    systems: &[&SideFile],
    name: &str,
) -> Result<()> {
    let system = the_one(systems, name, "files about coordinates")?;
    let read = system.map(facts::coordinates).transpose()?;
    if let Some(side) = the_one(tables, name, "tables of electrodes")? {
        electrodes::apply(recording, side, read.as_ref())?;
        recording.side_files.extend(system.map(|s| s.name.clone()));
    } else if let Some(system) = system {
        recording.warnings.push(format!(
            "{} was not used: there is no table of electrodes beside it.",
            system.name
        ));
    }
    Ok(())
}

fn apply_events(
    recording: &mut Recording,
    standard: &[&SideFile],
    others: &[&SideFile],
    given: &Given,
) -> Result<()> {
    let name = recording.name.clone();
    let told = given.events.as_ref();
    // Columns that were told are those of the table that needs it.
    if let (Some(table), true) = (others.first(), told.is_some() || standard.is_empty()) {
        if others.len() > 1 {
            return Err(several(others, "tables of events"));
        }
        if told.is_some() {
            return events::apply(recording, table, told);
        }
        recording.about.untold = Some(table.name.clone());
        recording.warnings.push(format!(
            "{} is not used yet: say which of its columns holds the onsets of the events (in a recipe: recording.events).",
            table.name
        ));
    }
    match the_one(standard, &name, "tables of events")? {
        Some(side) => events::apply(recording, side, told),
        None => Ok(()),
    }
}

/// Side files of one kind that belong to the recording, the most general first.
fn about_recording<'a>(recording: &str, sides: &'a [SideFile], wanted: About) -> Vec<&'a SideFile> {
    let mine: Vec<&SideFile> = sides
        .iter()
        .filter(|side| names::kinship(recording, &side.name).is_some())
        .filter(|side| about(side, &[]) == wanted)
        .collect();
    general_first(&mine, recording)
}

fn general_first<'a>(sides: &[&'a SideFile], recording: &str) -> Vec<&'a SideFile> {
    let mut sides = sides.to_vec();
    sides.sort_by_key(|side| names::kinship(recording, &side.name));
    sides
}

/// Whether a table with this name and content is about a recording with these channels, rather than a recording itself: it places channels,
/// names onsets, or holds words where a recording would hold numbers.
pub fn is_side_table(side: &SideFile, channels: &[&str]) -> bool {
    match about(side, channels) {
        About::Events | About::Channels | About::Electrodes => true,
        About::Table => events::holds_words(side),
        _ => false,
    }
}

/// By its name, else by what stands in it.
fn about(side: &SideFile, channels: &[&str]) -> About {
    let name = side.name.to_lowercase();
    let named = [
        ("events.tsv", About::Events),
        ("channels.tsv", About::Channels),
        ("electrodes.tsv", About::Electrodes),
        ("coordsystem.json", About::Coordinates),
    ];
    if let Some((_, about)) = named.iter().find(|(end, _)| name.ends_with(end)) {
        return *about;
    }
    if let Some(stem) = name.strip_suffix(".json") {
        if names::FACTS
            .iter()
            .any(|f| stem.ends_with(&format!("_{f}")))
        {
            return About::Facts;
        }
        return keys(side);
    }
    if [".tsv", ".csv", ".txt"]
        .iter()
        .any(|end| name.ends_with(end))
    {
        return columns(side, channels);
    }
    About::Nothing
}

fn keys(side: &SideFile) -> About {
    let Ok(map) = facts::object(side) else {
        return About::Nothing;
    };
    if map.keys().any(|key| key.ends_with("CoordinateSystem")) {
        About::Coordinates
    } else if map.contains_key("SamplingFrequency") || map.contains_key("PowerLineFrequency") {
        About::Facts
    } else {
        About::Nothing
    }
}

fn columns(side: &SideFile, channels: &[&str]) -> About {
    let Ok(table) = Table::open(side, Header::Maybe, "the side file") else {
        return About::Nothing;
    };
    let tabs = side.name.to_lowercase().ends_with(".tsv");
    let has = |name: &str| table.columns.iter().any(|c| c == name);
    if tabs && has("onset") {
        About::Events
    } else if tabs && has("name") && has("type") {
        About::Channels
    } else if side.bytes.len() <= LOOK_BYTES && electrodes::looks_like(side, channels) {
        About::Electrodes
    } else if table.columns.len() > 1 {
        About::Table
    } else {
        About::Nothing
    }
}

/// The side file that shares the most of its name with the recording.
fn the_one<'a>(
    sides: &[&'a SideFile],
    recording: &str,
    what: &str,
) -> Result<Option<&'a SideFile>> {
    let kinship = |side: &SideFile| names::kinship(recording, &side.name);
    let closest = sides.iter().map(|s| kinship(s)).max();
    let nearest: Vec<&'a SideFile> = sides
        .iter()
        .filter(|s| Some(kinship(s)) == closest)
        .copied()
        .collect();
    match nearest[..] {
        [] => Ok(None),
        [one] => Ok(Some(one)),
        _ => Err(several(&nearest, what)),
    }
}

fn several(sides: &[&SideFile], what: &str) -> Problem {
    Problem::new(
        Kind::Unsupported,
        format!("several {what} were given for one recording"),
        "give only the one that belongs to it",
    )
    .in_file(sides.get(1).map_or("", |s| s.name.as_str()))
    .expected_found("one", sides.len())
}

/// The channel of this name: exactly, else whatever its capitals and blanks.
fn channel_named(recording: &Recording, label: &str) -> Option<usize> {
    let channels = &recording.channels;
    let exact = channels.iter().position(|c| c.name == label);
    exact.or_else(|| channels.iter().position(|c| alike(&c.name, label)))
}

fn alike(a: &str, b: &str) -> bool {
    let plain = |text: &str| {
        text.chars()
            .filter(|c| !c.is_whitespace())
            .flat_map(char::to_lowercase)
            .collect::<String>()
    };
    plain(a) == plain(b)
}

/// At most 60 characters of a text from a file, on one line.
fn short(text: &str) -> String {
    let line: String = text
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    if line.chars().count() <= 60 {
        return line;
    }
    line.chars().take(59).chain(['…']).collect()
}
