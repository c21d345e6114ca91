//! Names of channels, and numbers with their nouns.
use super::Channel;
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
