//! `*_channels.tsv` as BIDS describes it: what kind each channel is, its unit, and whether it is bad.
//!
//! # What is set aside
//! Channels of kinds that are no measurement of the brain (eyes, heart, muscle, triggers, …) and channels marked bad stay in the recording, but
//! are not analysed unless the recipe keeps them. Where that would leave fewer than two, kinds set nothing aside: then they are what the
//! recording is about.
use super::table::{Header, Table};
use crate::error::Result;
use crate::recording::units::Unit;
use crate::recording::{Layout, Recording, SideFile};

/// Kinds that are analysed (BIDS: EEG, iEEG and MEG channel types). Any kind that is not of this list is set aside.
const ANALYSED: [&str; 8] = [
    "EEG",
    "ECOG",
    "SEEG",
    "DBS",
    "MEGMAG",
    "MEGGRADAXIAL",
    "MEGGRADPLANAR",
    "MEGOTHER",
];
const WHAT: &str = "the table of channels";

/// What the table says of one channel.
struct Said {
    kind: Option<String>,
    bad: Option<String>,
}

/// Uses the table of channels.
pub(super) fn apply(recording: &mut Recording, side: &SideFile) -> Result<()> {
    read(recording, side).map_err(|p| p.in_file(side.name.as_str()))
}

fn read(recording: &mut Recording, side: &SideFile) -> Result<()> {
    let mut table = Table::open(side, Header::Named, WHAT)?;
    let Some(name) = table.column(&["name"]) else {
        return Err(
            super::table::broken("the table of channels has no column of names")
                .at("line 1")
                .expected_found(
                    "a column named name, tabs between columns",
                    table.columns.join(", "),
                ),
        );
    };
    let [kind, unit, status, why, rate] = [
        "type",
        "units",
        "status",
        "status_description",
        "sampling_frequency",
    ]
    .map(|n| table.column(&[n]));
    let mut said: Vec<Option<Said>> = recording.channels.iter().map(|_| None).collect();
    let (mut unknown, mut twice, mut rates) = (Vec::new(), 0, 0);
    while let Some(row) = table.next()? {
        let cell = |column: Option<usize>| column.and_then(|c| row.text(c));
        let Some(label) = row.text(name) else {
            continue;
        };
        let Some(at) = super::channel_named(recording, &label) else {
            let listed = recording
                .others
                .iter()
                .any(|o| super::alike(&o.name, &label));
            if !listed {
                unknown.push(label);
            }
            continue;
        };
        if said[at].is_some() {
            twice += 1;
            continue;
        }
        let bad = cell(status).is_some_and(|s| s.eq_ignore_ascii_case("bad"));
        said[at] = Some(Said {
            kind: cell(kind).map(|k| k.to_uppercase()),
            bad: bad.then(|| cell(why).unwrap_or_default()),
        });
        if let Some(unit) = cell(unit) {
            take_unit(recording, at, &unit);
        }
        if let Some(column) = rate {
            let hz = row.number(column, "a number of Hz, or n/a")?;
            rates += usize::from(hz.is_some_and(|hz| (hz / recording.rate_hz - 1.0).abs() > 0.01));
        }
    }
    if said.iter().all(Option::is_none) {
        recording.warnings.push(format!(
            "{} was not used: it names none of the recording's channels.",
            side.name
        ));
        return Ok(());
    }
    warn(recording, side, &unknown, twice, rates);
    set_aside(recording, side, &said);
    // Contacts on or in the brain may be called F1 or T3: such names are no places on the head.
    let inside = |k: &String| matches!(k.as_str(), "ECOG" | "SEEG" | "DBS");
    if recording.layout == Layout::Head && recording.about.kinds.values().any(inside) {
        recording.layout = Layout::Plane;
    }
    recording.side_files.push(side.name.clone());
    Ok(())
}

/// The unit that all analysed channels of the table share, for a format that carries none.
pub(super) fn unit(side: &SideFile) -> Option<String> {
    let mut table = Table::open(side, Header::Named, WHAT).ok()?;
    let [kind, unit] = ["type", "units"].map(|n| table.column(&[n]));
    let mut shared: Option<String> = None;
    while let Ok(Some(row)) = table.next() {
        let kind = kind.and_then(|c| row.text(c)).map(|k| k.to_uppercase());
        if kind.is_some_and(|k| !ANALYSED.contains(&k.as_str())) {
            continue;
        }
        let here = row.text(unit?)?;
        match &shared {
            Some(unit) if *unit != here => return None,
            _ => shared = Some(here),
        }
    }
    shared
}

/// A file that carries no unit takes the table's; voltages are brought to µV.
fn take_unit(recording: &mut Recording, at: usize, unit: &str) {
    let channel = &mut recording.channels[at];
    if !(channel.unit.is_empty() || channel.unit == "counts") {
        return;
    }
    let Unit { name, factor } = Unit::of(unit);
    channel.unit = name;
    if factor == 1.0 {
        return;
    }
    if let Some(samples) = recording.samples.get_mut(at) {
        for x in samples {
            *x = (f64::from(*x) * factor) as f32;
        }
    }
}

fn warn(
    recording: &mut Recording,
    side: &SideFile,
    unknown: &[String],
    twice: usize,
    rates: usize,
) {
    if let [first, rest @ ..] = unknown {
        let more = match rest.len() {
            0 => String::new(),
            n => format!(" and {n} more"),
        };
        recording.warnings.push(format!(
            "{} names channels that the recording does not have: {}{more}.",
            side.name,
            super::short(first)
        ));
    }
    if twice > 0 {
        recording.warnings.push(format!(
            "{} names {twice} channels twice; the first row of each counts.",
            side.name
        ));
    }
    if rates > 0 {
        recording.warnings.push(format!(
            "{} gives {rates} channels another sampling rate than the recording's {} Hz; the recording's counts.",
            side.name, recording.rate_hz
        ));
    }
}

fn set_aside(recording: &mut Recording, side: &SideFile, said: &[Option<Said>]) {
    let other_kind = |s: &Said| s.kind.as_deref().is_some_and(|k| !ANALYSED.contains(&k));
    let rest = said
        .iter()
        .filter(|s| !s.as_ref().is_some_and(other_kind))
        .count();
    let by_kind = rest >= 2;
    if !by_kind {
        recording.warnings.push(format!(
            "By {} fewer than two channels measure the brain; all kinds are analysed.",
            side.name
        ));
    }
    for (channel, said) in recording.channels.iter().zip(said) {
        let Some(said) = said else {
            continue;
        };
        if let Some(kind) = &said.kind {
            recording
                .about
                .kinds
                .insert(channel.name.clone(), super::short(kind));
        }
        let reason = match (&said.bad, &said.kind) {
            (Some(why), _) if !why.is_empty() => Some(format!("marked bad: {}", super::short(why))),
            (Some(_), _) => Some("marked bad".to_owned()),
            (None, Some(kind)) if by_kind && other_kind(said) => {
                Some(format!("its kind is {}", super::short(kind)))
            }
            _ => None,
        };
        if let Some(reason) = reason {
            recording.about.aside.insert(channel.name.clone(), reason);
        }
    }
}
