//! The channel matrix T = A − 1 rᵀ: leave out and interpolate (A, rows mostly one 1), then re-reference (r), or rows of differences.
//!
//! Interpolation weights sum to 1, so the order of the two makes no difference.
use super::neighbours::Places;
use crate::error::{Kind, Problem, Result};
use crate::recipe::{BipolarReference, Channels, Pairs, PairsWord, Reference, ReferenceWord};
use crate::sheet::{ChannelCard, ChannelState, Step};
use nalgebra::DMatrix;

/// A weighted sum of recorded channels: index and weight, weights of 0 left out.
pub(crate) type Sum = Vec<(usize, f64)>;

/// Above so many channels the rank after each step is not worked out.
const MOST_STEPPED: usize = 512;

/// More channels that are set aside than this are said in one sentence.
const MOST_SAID: usize = 12;

/// T in its two parts, so that a reference over all channels is summed once and not once a channel.
#[derive(Debug, Clone)]
pub(crate) struct ChannelMatrix {
    /// Indexes of the prepared channels among the recorded ones, ascending; of a difference, its first.
    pub(crate) channels: Vec<usize>,
    /// Names of the prepared channels.
    pub(super) names: Vec<String>,
    /// Unit-sphere positions of the prepared channels; of a difference, half way.
    pub(super) positions: Vec<Option<[f64; 3]>>,
    /// Rows of A.
    pub(super) rows: Vec<Sum>,
    /// r; empty for the reference as recorded.
    pub(super) reference: Sum,
    /// T after each step that does something, and what that step does to the rank.
    pub(super) steps: Vec<StepMatrix>,
    /// What a careful reader should know.
    pub(super) warnings: Vec<String>,
}

/// The channel matrix as it is after one step.
#[derive(Debug, Clone)]
pub struct StepMatrix {
    /// Which step.
    pub step: Step,
    /// What it does to the rank, in a sentence.
    pub why: String,
    /// `channels after the step × recorded`.
    pub matrix: DMatrix<f64>,
}

impl ChannelMatrix {
    pub(super) fn new(cards: &[ChannelCard], places: &Places, choices: &Channels) -> Result<Self> {
        check_names(cards, choices)?;
        let rebuilt = rebuild(cards, places)?;
        let row = |index: usize| -> Sum {
            let known = rebuilt.iter().find(|(channel, _)| *channel == index);
            known.map_or_else(|| vec![(index, 1.0)], |(_, sum)| sum.clone())
        };
        let analysed: Vec<usize> = (0..cards.len())
            .filter(|&i| is_analysed(&cards[i]))
            .collect();
        let mut warnings = set_aside(cards);
        let mut matrix = match &choices.reference {
            Reference::Bipolar(bipolar) => differences(cards, places, bipolar, &analysed, row)?,
            _ => referred(cards, choices, &analysed, row, &mut warnings)?,
        };
        if matrix.channels.len() < 2 {
            return Err(Problem::new(
                Kind::Contrast,
                "too few channels are left to contrast",
                "leave out fewer channels",
            )
            .expected_found("at least 2", matrix.channels.len()));
        }
        matrix.warnings = warnings;
        if cards.len() <= MOST_STEPPED {
            matrix.steps = steps(cards, choices, &analysed, &rebuilt, &matrix);
        }
        Ok(matrix)
    }
    /// Tᵀw.
    pub(super) fn back(&self, filter: &[f64], recorded: usize) -> Vec<f64> {
        let mut out = vec![0.0; recorded];
        for (row, w) in self.rows.iter().zip(filter) {
            for &(channel, weight) in row {
                out[channel] += w * weight;
            }
        }
        let sum: f64 = filter.iter().sum();
        for &(channel, weight) in &self.reference {
            out[channel] -= sum * weight;
        }
        out
    }
    /// T itself, `prepared × recorded`.
    pub(super) fn dense(&self, recorded: usize) -> DMatrix<f64> {
        let mut matrix = DMatrix::zeros(self.rows.len(), recorded);
        for (i, row) in self.rows.iter().enumerate() {
            for &(channel, weight) in row {
                matrix[(i, channel)] += weight;
            }
            for &(channel, weight) in &self.reference {
                matrix[(i, channel)] -= weight;
            }
        }
        matrix
    }
}

/// All channels less one series: as recorded, the average, or some channels' mean.
fn referred(
    cards: &[ChannelCard],
    choices: &Channels,
    analysed: &[usize],
    row: impl Fn(usize) -> Sum,
    warnings: &mut Vec<String>,
) -> Result<ChannelMatrix> {
    let mut channels = analysed.to_vec();
    let referenced = reference_channels(cards, &choices.reference, &channels)?;
    if let [alone] = referenced[..] {
        let before = channels.len();
        channels.retain(|&c| c != alone);
        if channels.len() < before {
            warnings.push(format!(
                "{} is the reference and would be zero everywhere; it is not among the analysed channels.",
                cards[alone].name
            ));
        }
    }
    Ok(ChannelMatrix {
        names: channels.iter().map(|&c| cards[c].name.clone()).collect(),
        positions: channels.iter().map(|&c| cards[c].position).collect(),
        rows: channels.iter().map(|&c| row(c)).collect(),
        reference: mean_of(&referenced, cards.len(), row),
        channels,
        steps: Vec::new(),
        warnings: Vec::new(),
    })
}

/// Differences of two channels each.
fn differences(
    cards: &[ChannelCard],
    places: &Places,
    bipolar: &BipolarReference,
    analysed: &[usize],
    row: impl Fn(usize) -> Sum,
) -> Result<ChannelMatrix> {
    let pairs: Vec<[usize; 2]> = match &bipolar.bipolar {
        Pairs::Word(PairsWord::Neighbours) => {
            let unplaced = analysed.iter().find(|c| places.get(**c).is_none());
            let tree = places.tree(analysed).ok_or_else(|| {
                let name = unplaced.map_or("a channel", |c| cards[*c].name.as_str());
                Problem::new(
                    Kind::Contrast,
                    format!("neighbours cannot be told: where {name} lies is not known"),
                    "leave it out, add a file with positions, or list the pairs in the recipe",
                )
                .at("recipe, channels.reference")
            })?;
            tree.iter().map(|e| e.map(|k| analysed[k])).collect()
        }
        Pairs::List(list) => list
            .iter()
            .map(|pair| named_pair(cards, pair))
            .collect::<Result<_>>()?,
    };
    let half_way = |[a, b]: [usize; 2]| {
        let (p, q) = (cards[a].position?, cards[b].position?);
        let sum = [p[0] + q[0], p[1] + q[1], p[2] + q[2]];
        let length = sum.iter().map(|v| v * v).sum::<f64>().sqrt();
        (length > 1e-6).then(|| sum.map(|v| v / length))
    };
    let difference = |[a, b]: [usize; 2]| -> Sum {
        let mut weights = vec![0.0; cards.len()];
        row(a).iter().for_each(|(c, w)| weights[*c] += w);
        row(b).iter().for_each(|(c, w)| weights[*c] -= w);
        nonzero(weights)
    };
    Ok(ChannelMatrix {
        channels: pairs.iter().map(|p| p[0]).collect(),
        names: pairs
            .iter()
            .map(|p| format!("{}-{}", cards[p[0]].name, cards[p[1]].name))
            .collect(),
        positions: pairs.iter().copied().map(half_way).collect(),
        rows: pairs.iter().copied().map(difference).collect(),
        reference: Vec::new(),
        steps: Vec::new(),
        warnings: Vec::new(),
    })
}

fn named_pair(cards: &[ChannelCard], pair: &[String; 2]) -> Result<[usize; 2]> {
    let find = |name: &String| {
        let known = cards.iter().position(|c| c.name == *name);
        known.ok_or_else(|| unknown(cards, "reference", name))
    };
    let found = [find(&pair[0])?, find(&pair[1])?];
    if found[0] == found[1] {
        return Err(Problem::new(
            Kind::Recipe,
            format!("{} less itself is zero everywhere", pair[0]),
            "name two channels in each pair",
        )
        .at("recipe, channels.reference"));
    }
    match found.iter().find(|c| !is_analysed(&cards[**c])) {
        Some(out) => Err(Problem::new(
            Kind::Contrast,
            format!(
                "{} is left out and cannot be one of a pair",
                cards[*out].name
            ),
            "take it in again, or take its pair out",
        )
        .at("recipe, channels.reference")),
        None => Ok(found),
    }
}

/// T as it is after each step that does something.
fn steps(
    cards: &[ChannelCard],
    choices: &Channels,
    analysed: &[usize],
    rebuilt: &[(usize, Sum)],
    last: &ChannelMatrix,
) -> Vec<StepMatrix> {
    let all = cards.len();
    let pick = |channels: &[usize]| {
        DMatrix::from_fn(channels.len(), all, |i, j| {
            f64::from(u8::from(channels[i] == j))
        })
    };
    let usable: Vec<usize> = (0..all).filter(|&i| is_usable(&cards[i])).collect();
    let count = |n: usize| match n {
        1 => "one channel".to_owned(),
        n => format!("{n} channels"),
    };
    let mut out = vec![StepMatrix {
        step: Step::Recorded,
        why: "What the channels span as they stand in the file; a channel that is a sum of others adds nothing.".into(),
        matrix: pick(&usable),
    }];
    let gone = all - analysed.len();
    let measured: Vec<usize> = analysed
        .iter()
        .copied()
        .filter(|c| rebuilt.iter().all(|(r, _)| r != c))
        .collect();
    if gone > 0 {
        let kept: Vec<usize> = analysed
            .iter()
            .copied()
            .filter(|c| usable.contains(c))
            .collect();
        out.push(StepMatrix {
            step: Step::LeaveOut,
            why: format!(
                "Without {}: one dimension fewer for each that was no sum of others.",
                count(gone)
            ),
            matrix: pick(&kept),
        });
    }
    if !rebuilt.is_empty() {
        let mut matrix = pick(analysed);
        for (channel, sum) in rebuilt {
            if let Some(i) = analysed.iter().position(|c| c == channel) {
                matrix.row_mut(i).fill(0.0);
                sum.iter().for_each(|(c, w)| matrix[(i, *c)] = *w);
            }
        }
        out.push(StepMatrix {
            step: Step::Interpolate,
            why: format!(
                "With {} estimated from the other {}: a weighted sum of them adds a channel and no dimension.",
                count(rebuilt.len()),
                measured.len()
            ),
            matrix,
        });
    }
    let why = match &choices.reference {
        Reference::Word(ReferenceWord::AsRecorded) => None,
        Reference::Word(ReferenceWord::Average) => Some("With their mean taken off the channels sum to zero: each is the others' sum with the sign turned, one dimension fewer.".to_owned()),
        Reference::Named(names) if names.len() == 1 => Some(format!("{} is zero against itself and goes; the others keep their dimensions.", names[0])),
        Reference::Named(names) => Some(format!("With the mean of {} taken off these sum to zero: one dimension fewer where all of them are analysed.", count(names.len()))),
        Reference::Bipolar(_) => Some("Differences hold nothing of what all channels share: at most one dimension fewer than the channels they are made of.".to_owned()),
    };
    out.extend(why.map(|why| StepMatrix {
        step: Step::Reference,
        why,
        matrix: last.dense(all),
    }));
    out
}

fn is_analysed(card: &ChannelCard) -> bool {
    !matches!(
        card.state,
        ChannelState::LeftOut | ChannelState::Unusable(_)
    )
}

fn is_usable(card: &ChannelCard) -> bool {
    !matches!(card.state, ChannelState::Unusable(_))
}

/// A sentence for every channel that is set aside without having been asked for.
fn set_aside(cards: &[ChannelCard]) -> Vec<String> {
    let sentence = |card: &ChannelCard| match &card.state {
        ChannelState::Unusable(reason) if reason == "constant" => {
            Some(format!("{} is constant and is left out.", card.name))
        }
        ChannelState::Unusable(reason) => Some(format!("{} {reason} and is left out.", card.name)),
        _ => None,
    };
    let all: Vec<String> = cards.iter().filter_map(sentence).collect();
    if all.len() <= MOST_SAID {
        return all;
    }
    let first = &all[0];
    vec![format!(
        "{} channels are constant or hold values that are not numbers, and are left out; the first: {first}",
        all.len()
    )]
}

fn check_names(cards: &[ChannelCard], choices: &Channels) -> Result<()> {
    let no_names = Vec::new();
    let named = match &choices.reference {
        Reference::Named(names) => names,
        Reference::Word(_) | Reference::Bipolar(_) => &no_names,
    };
    let lists = [
        ("keep", &choices.keep),
        ("leave_out", &choices.leave_out),
        ("interpolate", &choices.interpolate),
        ("reference", named),
    ];
    for (place, names) in lists {
        for name in names {
            if !cards.iter().any(|card| card.name == *name) {
                return Err(unknown(cards, place, name));
            }
        }
    }
    if let Some(both) = choices
        .interpolate
        .iter()
        .find(|n| choices.leave_out.contains(n))
    {
        return Err(Problem::new(
            Kind::Recipe,
            format!("{both} is to be left out and to be interpolated"),
            "choose one of the two",
        )
        .at("recipe, channels"));
    }
    if matches!(&choices.reference, Reference::Named(names) if names.is_empty()) {
        return Err(Problem::new(
            Kind::Recipe,
            "the list of reference channels is empty",
            "name a channel, or write \"as recorded\" or \"average\"",
        )
        .at("recipe, channels.reference"));
    }
    Ok(())
}

fn unknown(cards: &[ChannelCard], place: &str, name: &str) -> Problem {
    let names: Vec<&str> = cards.iter().map(|c| c.name.as_str()).take(12).collect();
    let more = if cards.len() > names.len() {
        ", …"
    } else {
        ""
    };
    Problem::new(
        Kind::Contrast,
        format!("the recording has no channel \"{name}\""),
        "correct the name; capitals count",
    )
    .at(format!("recipe, channels.{place}"))
    .expected_found(
        format!("one of {}{more}", names.join(", ")),
        format!("\"{name}\""),
    )
}

/// Rows of the interpolated channels, estimated from all analysed channels with a known place.
fn rebuild(cards: &[ChannelCard], places: &Places) -> Result<Vec<(usize, Sum)>> {
    let wanted: Vec<usize> = (0..cards.len())
        .filter(|&i| cards[i].state == ChannelState::Interpolated)
        .collect();
    if wanted.is_empty() {
        return Ok(Vec::new());
    }
    if let Some(lost) = wanted.iter().find(|&&i| places.get(i).is_none()) {
        return Err(no_position(&cards[*lost].name));
    }
    let sources: Vec<usize> = (0..cards.len())
        .filter(|&i| is_analysed(&cards[i]) && cards[i].state != ChannelState::Interpolated)
        .filter(|&i| places.get(i).is_some())
        .collect();
    let weights = places.weights(&wanted, &sources)?;
    let row = |k: usize| {
        let all = sources.iter().enumerate();
        all.map(|(j, source)| (*source, weights[(k, j)]))
            .filter(|(_, weight)| *weight != 0.0)
            .collect()
    };
    Ok(wanted
        .iter()
        .enumerate()
        .map(|(k, &i)| (i, row(k)))
        .collect())
}

fn no_position(name: &str) -> Problem {
    Problem::new(
        Kind::Contrast,
        format!("{name} cannot be interpolated: its position is not known"),
        "leave it out, name it by the 10–20 system, or add a file with positions",
    )
    .at("recipe, channels.interpolate")
}

/// The channels whose mean is subtracted.
fn reference_channels(
    cards: &[ChannelCard],
    reference: &Reference,
    analysed: &[usize],
) -> Result<Vec<usize>> {
    let names = match reference {
        Reference::Word(ReferenceWord::AsRecorded) => return Ok(Vec::new()),
        Reference::Word(ReferenceWord::Average) => return Ok(analysed.to_vec()),
        Reference::Bipolar(_) => return Ok(Vec::new()),
        Reference::Named(names) => names,
    };
    let chosen: Vec<usize> = (0..cards.len())
        .filter(|&i| names.contains(&cards[i].name))
        .collect();
    match chosen.iter().find(|&&i| !is_usable(&cards[i])) {
        Some(&bad) => Err(Problem::new(
            Kind::Contrast,
            format!("{} cannot be a reference", cards[bad].name),
            "choose another reference",
        )
        .at("recipe, channels.reference")),
        None => Ok(chosen),
    }
}

/// The mean of some channels as one sum over recorded channels.
fn mean_of(channels: &[usize], recorded: usize, row: impl Fn(usize) -> Sum) -> Sum {
    let mut weights = vec![0.0; recorded];
    for &channel in channels {
        for (source, weight) in row(channel) {
            weights[source] += weight / channels.len() as f64;
        }
    }
    nonzero(weights)
}

fn nonzero(weights: Vec<f64>) -> Sum {
    let all = weights.into_iter().enumerate();
    all.filter(|(_, weight)| *weight != 0.0).collect()
}
