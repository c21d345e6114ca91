//! Names of files as the BIDS standard makes them: `sub-01_task-watch_eeg.edf` is two entities, a suffix and an extension.
//!
//! A side file belongs to a recording when none of its entities contradicts the recording's (the standard's inheritance principle, within one
//! folder); of several that belong, the one with the most entities counts. `space` says in which system coordinates are given, and no
//! recording carries it.

/// A name taken apart.
#[derive(Debug, PartialEq)]
struct Parts<'a> {
    entities: Vec<(&'a str, &'a str)>,
    suffix: &'a str,
}

/// The parts of a name of the standard; no entities where it is none.
fn parts(name: &str) -> Parts<'_> {
    let stem = name.split('.').next().unwrap_or(name);
    let mut pieces: Vec<&str> = stem.split('_').collect();
    let suffix = pieces.pop().unwrap_or(stem);
    let pair = |piece: &&'_ str| -> bool {
        piece
            .split_once('-')
            .is_some_and(|(key, value)| !key.is_empty() && !value.is_empty())
    };
    if !pieces.iter().all(pair) {
        return Parts {
            entities: Vec::new(),
            suffix,
        };
    }
    Parts {
        entities: pieces
            .into_iter()
            .filter_map(|p| p.split_once('-'))
            .collect(),
        suffix,
    }
}

/// How many entities of a side file say that it belongs to the recording; `None` where one contradicts it.
pub(super) fn kinship(recording: &str, side: &str) -> Option<usize> {
    let (own, other) = (parts(recording), parts(side));
    if own.entities.is_empty() {
        return Some(usize::from(shares_stem(recording, side)));
    }
    let mut shared = 0;
    for (key, value) in other.entities {
        if own.entities.contains(&(key, value)) {
            shared += 1;
        } else if key != "space" {
            return None;
        }
    }
    Some(shared)
}

/// Whether a file that lies beside a recording is taken without being asked for: a side file by its name, with at least one of the recording's
/// own entities (or its whole stem, where its name is none of the standard's) and none that contradicts them.
///
/// ```
/// use teasel_core::recording::lies_beside;
/// assert!(lies_beside("sub-01_task-watch_eeg.edf", "sub-01_task-watch_events.tsv"));
/// assert!(lies_beside("sub-01_task-watch_eeg.edf", "task-watch_eeg.json"));
/// assert!(lies_beside("sub-01_task-watch_eeg.edf", "sub-01_space-head_electrodes.tsv"));
/// assert!(!lies_beside("sub-01_task-watch_eeg.edf", "sub-02_task-watch_events.tsv"));
/// assert!(lies_beside("watch.edf", "watch_events.tsv"));
/// ```
pub fn lies_beside(recording: &str, side: &str) -> bool {
    let (own, suffix) = (parts(recording), parts(side).suffix);
    let known = [
        ("events", ".tsv"),
        ("channels", ".tsv"),
        ("electrodes", ".tsv"),
        ("coordsystem", ".json"),
    ];
    let table = known.contains(&(suffix, extension(side)));
    let about = extension(side) == ".json"
        && FACTS.contains(&suffix)
        && (own.entities.is_empty() || !FACTS.contains(&own.suffix) || own.suffix == suffix);
    (table || about) && kinship(recording, side).is_some_and(|shared| shared > 0)
}

/// Suffixes of the files that tell about a recording as a whole.
pub(super) const FACTS: [&str; 4] = ["eeg", "ieeg", "meg", "nirs"];

fn extension(name: &str) -> &str {
    name.find('.').map_or("", |at| &name[at..])
}

/// `watch.edf` and `watch_events.tsv`, or `watch_eeg.edf` and `watch_events.tsv`.
fn shares_stem(recording: &str, side: &str) -> bool {
    let whole = recording.rsplit_once('.').map_or(recording, |(s, _)| s);
    let short = whole.rsplit_once('_').map_or(whole, |(s, _)| s);
    let side = side.rsplit_once('_').map_or("", |(s, _)| s);
    !side.is_empty() && (side == whole || side == short)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_side_file_belongs_where_nothing_contradicts() {
        let recording = "sub-01_ses-b_task-watch_eeg.edf";
        for (side, shared) in [
            ("sub-01_ses-b_task-watch_events.tsv", Some(3)),
            ("sub-01_task-watch_channels.tsv", Some(2)),
            ("task-watch_eeg.json", Some(1)),
            ("sub-01_space-head_electrodes.tsv", Some(1)),
            ("electrodes.tsv", Some(0)),
            ("sub-02_task-watch_events.tsv", None),
            ("sub-01_ses-b_task-watch_run-2_events.tsv", None),
        ] {
            assert_eq!(kinship(recording, side), shared, "{side}");
        }
    }

    #[test]
    fn what_lies_beside_is_known_by_its_name() {
        let recording = "sub-01_task-watch_eeg.edf";
        for side in [
            "sub-01_task-watch_events.tsv",
            "sub-01_electrodes.tsv",
            "sub-01_coordsystem.json",
            "sub-01_task-watch_eeg.json",
        ] {
            assert!(lies_beside(recording, side), "{side}");
        }
        for side in [
            "sub-01_task-watch_eeg.edf",
            "events.tsv",
            "sub-01_task-watch_ieeg.json",
            "sub-01_scans.tsv",
            "sub-02_electrodes.tsv",
            "sub-01_events.json",
        ] {
            assert!(!lies_beside(recording, side), "{side}");
        }
        assert!(lies_beside("watch_eeg.edf", "watch_events.tsv"));
        assert!(!lies_beside("watch.edf", "other_events.tsv"));
    }
}
