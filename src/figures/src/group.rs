//! Figures of what many recordings say together, drawn like those of one.
use crate::{Figure, from_sheet, names, sizes::stands_alone};
use teasel_core::takeaway::Group;

/// Name, caption and figure of everything that the group gives: patterns, spectra, courses and averages of the first component
/// of each end. Bands are 95 % bootstrap intervals over recordings.
pub fn group_figures(group: &Group) -> Vec<(String, String, Figure)> {
    let sheet = group.sheet();
    names(&sheet)
        .into_iter()
        .filter(|(name, _)| {
            (name.starts_with("stronger-1-") || name.starts_with("weaker-1-")) && stands_alone(name)
        })
        .filter_map(|(name, caption)| {
            let figure = from_sheet(&sheet, &name)?;
            Some((name, format!("Mean over recordings. {caption}"), figure))
        })
        .collect()
}
