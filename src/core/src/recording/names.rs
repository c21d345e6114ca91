//! Names of channels, numbers with their nouns, and what is said of a salvaged file.
use super::Channel;
use crate::error::Problem;
use std::collections::BTreeMap;

/// A recipe speaks of channels by name, so no two may share one: a later one is called `name (2)`, with a warning.
pub(crate) fn name_apart(channels: &mut [Channel], warnings: &mut Vec<String>) {
    let mut seen = BTreeMap::<String, usize>::new();
    for channel in channels {
        let wanted = channel.name.clone();
        while let Some(times) = seen.get_mut(&channel.name) {
            *times += 1;
            channel.name = format!("{wanted} ({times})");
        }
        seen.insert(channel.name.clone(), 1);
        if channel.name != wanted {
            warnings.push(format!(
                "Two channels are called \"{wanted}\"; the later one is called \"{}\" here.",
                channel.name
            ));
        }
    }
}

/// `1 signal`, `2 signals`.
pub(crate) fn counted(n: u64, noun: &str) -> String {
    format!("{n} {noun}{}", if n == 1 { "" } else { "s" })
}

/// The warning that stands for a problem once the records before it are opened.
pub(crate) fn opened_before(problem: &Problem, whole: u64, noun: &str) -> String {
    let part = |p: &Option<String>| p.clone().unwrap_or_default();
    format!(
        "Only the {} before the damage were opened: {} ({}: expected {}, found {}).",
        counted(whole, noun),
        problem.what,
        part(&problem.place),
        part(&problem.expected),
        part(&problem.found)
    )
}
