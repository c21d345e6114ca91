//! Which figures a sheet gives, under which names.
use crate::alike::Alike;
use crate::beside::Beside;
use crate::channels::Channels;
use crate::channels_map::ChannelsMap;
use crate::course::{Course, Of};
use crate::eigenvalues::Eigenvalues;
use crate::filters::Filters;
use crate::keep::Keep;
use crate::map::Map;
use crate::overview::Overview;
use crate::powers::Powers;
use crate::principal::Principal;
use crate::ratio::Row;
use crate::scores::Scores;
use crate::spectrum::Spectrum;
use crate::time_frequency::{TimeFrequency, What};
use crate::trials::{Order, Trials};
use crate::weights::{End, Weights};
use crate::{Figure, text};
use teasel_core::sheet::{Component, Sheet};

/// Figures of the whole sheet: name and caption.
const WHOLE: [(&str, &str); 12] = [
    ("overview", "The whole recording"),
    ("channels-map", "Where the channels lie"),
    ("channels", "Each channel as recorded"),
    ("filters", "What the filters let pass"),
    ("windows", "Average time course and the two windows"),
    ("eigenvalues", "Variance of each dimension"),
    ("principal", "The largest dimensions, not the most relevant"),
    ("keep", "How many dimensions to keep"),
    ("ratio-axis", "Axis of the ratios"),
    ("beside", "Beside it: what one would have used otherwise"),
    ("alike", "If the sides were alike"),
    ("alike-weaker", "If the sides were alike, weaker end"),
];

/// Figures of each component: name and caption.
const EACH: [(&str, &str); 14] = [
    ("map", "pattern"),
    ("filter", "filter, the largest weights"),
    ("spectrum", "spectrum in signal and reference windows"),
    ("course", "power around the event"),
    ("average", "average around the event"),
    ("trials", "single trials in order of time"),
    (
        "trials-by-power",
        "single trials in order of their power in the signal window",
    ),
    (
        "trials-by-lag",
        "single trials in order of the time to the next event",
    ),
    ("time-frequency", "power over time and frequency"),
    ("consistency", "phase consistency over trials"),
    ("powers", "power in every window"),
    ("ratio", "held-out ratio"),
    ("map-small", "pattern, small"),
    ("spectrum-small", "spectrum, small"),
];

const LAST: (&str, &str) = (
    "trial-by-trial",
    "Trial by trial: held-out ratio in order of time",
);

/// Every figure that this sheet gives now, as name and caption, in the order of the page. `traces` is not among them: it is
/// made from a recording ([`crate::traces`]).
pub fn names(sheet: &Sheet) -> Vec<(String, String)> {
    let mut all: Vec<(String, String)> = Vec::new();
    let owned = |(name, caption): (&str, &str)| (name.to_owned(), caption.to_owned());
    all.extend(WHOLE[..9].iter().copied().map(owned));
    for (end, components) in ends(sheet) {
        for (i, _) in components.iter().enumerate() {
            let mut said = end.word().to_owned();
            said[..1].make_ascii_uppercase();
            all.extend(EACH.map(|(part, caption)| {
                (
                    format!("{}-{}-{part}", end.word(), i + 1),
                    format!("{said} component {}: {caption}", i + 1),
                )
            }));
        }
    }
    all.extend(WHOLE[9..].iter().copied().map(owned));
    all.push(owned(LAST));
    all.retain(|(name, _)| from_sheet(sheet, name).is_some());
    all.into_iter()
        .map(|(name, caption)| (name, text::clean(&caption)))
        .collect()
}

fn ends(sheet: &Sheet) -> [(End, &[Component]); 2] {
    [
        (End::Stronger, &sheet.stronger),
        (End::Weaker, &sheet.weaker),
    ]
}

/// The figure of this name; `None` where the sheet does not hold what it needs, or there is no such name.
pub fn from_sheet(sheet: &Sheet, name: &str) -> Option<Figure> {
    match name {
        "overview" => Overview::of(sheet).map(Figure::Overview),
        "channels-map" => ChannelsMap::of(sheet).map(Figure::ChannelsMap),
        "channels" => Channels::of(sheet).map(Figure::Channels),
        "windows" => {
            let first = sheet.first().map(|c| (c, End::from(sheet.leading)));
            Course::of(sheet, first, Of::Windows).map(Figure::Course)
        }
        "eigenvalues" => Eigenvalues::of(sheet).map(Figure::Eigenvalues),
        "filters" => Filters::of(sheet).map(Figure::Filters),
        "principal" => Principal::of(sheet).map(Figure::Principal),
        "keep" => Keep::of(sheet).map(Figure::Keep),
        "ratio-axis" => Row::head(sheet).map(Figure::Ratio),
        "beside" => Beside::of(sheet).map(Figure::Beside),
        "alike" => Alike::of(sheet, End::Stronger).map(Figure::Alike),
        "alike-weaker" => Alike::of(sheet, End::Weaker).map(Figure::Alike),
        "trial-by-trial" => Scores::of(sheet).map(Figure::Scores),
        _ => of_component(sheet, name),
    }
}

/// `stronger-1-map` and its like.
fn of_component(sheet: &Sheet, name: &str) -> Option<Figure> {
    let (end, rest) = name.split_once('-')?;
    let (number, part) = rest.split_once('-')?;
    let index = number.parse::<usize>().ok()?.checked_sub(1)?;
    let (end, components) = ends(sheet).into_iter().find(|(e, _)| e.word() == end)?;
    let component = components.get(index)?;
    match part {
        "map" => Map::of(sheet, component, end, false).map(Figure::Map),
        "map-small" => Map::of(sheet, component, end, true).map(Figure::Map),
        "filter" => Weights::of(sheet, component, end).map(Figure::Weights),
        "spectrum" => Spectrum::of(sheet, component, false).map(Figure::Spectrum),
        "spectrum-small" => Spectrum::of(sheet, component, true).map(Figure::Spectrum),
        "course" => Course::of(sheet, Some((component, end)), Of::Power).map(Figure::Course),
        "average" => Course::of(sheet, Some((component, end)), Of::Average).map(Figure::Course),
        "trials" => Trials::of(sheet, component, Order::Time).map(Figure::Trials),
        "trials-by-power" => Trials::of(sheet, component, Order::Power).map(Figure::Trials),
        "trials-by-lag" => Trials::of(sheet, component, Order::Lag).map(Figure::Trials),
        "time-frequency" => {
            TimeFrequency::of(sheet, component, What::Power).map(Figure::TimeFrequency)
        }
        "consistency" => {
            TimeFrequency::of(sheet, component, What::Consistency).map(Figure::TimeFrequency)
        }
        "powers" => Powers::of(component).map(Figure::Powers),
        "ratio" => Some(Figure::Ratio(Row::of(sheet, component, end))),
        _ => None,
    }
}
