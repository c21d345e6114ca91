//! The channel matrix T = A − 1 rᵀ: leave out and interpolate (A, rows mostly one 1), then re-reference (r).
//!
//! Interpolation weights sum to 1, so the order of the two makes no difference.
use crate::describe::spline::Spline;
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Channels, Reference, ReferenceWord};
use crate::sheet::{ChannelCard, ChannelState};
use nalgebra::DMatrix;

/// A weighted sum of recorded channels: index and weight, weights of 0 left out.
pub(crate) type Sum = Vec<(usize, f64)>;

/// T in its two parts, so that a reference over all channels is summed once and not once a channel.
#[derive(Debug, Clone)]
pub(crate) struct ChannelMatrix {
    /// Indexes of the prepared channels among the recorded ones, ascending.
    pub(crate) channels: Vec<usize>,
    /// Rows of A.
    pub(super) rows: Vec<Sum>,
    /// r; empty for the reference as recorded.
    pub(super) reference: Sum,
    /// What a careful reader should know.
    pub(super) warnings: Vec<String>,
}

impl ChannelMatrix {
    pub(super) fn new(cards: &[ChannelCard], choices: &Channels) -> Result<Self> {
        check_names(cards, choices)?;
        let rebuilt = rebuild(cards)?;
        let row = |index: usize| -> Sum {
            let known = rebuilt.iter().find(|(channel, _)| *channel == index);
            known.map_or_else(|| vec![(index, 1.0)], |(_, sum)| sum.clone())
        };
        let mut channels: Vec<usize> = (0..cards.len())
            .filter(|&i| is_analysed(&cards[i]))
            .collect();
        let mut warnings = set_aside(cards);
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
        if channels.len() < 2 {
            return Err(Problem::new(
                Kind::Contrast,
                "too few channels are left to contrast",
                "leave out fewer channels",
            )
            .expected_found("at least 2", channels.len()));
        }
        Ok(ChannelMatrix {
            rows: channels.iter().map(|&c| row(c)).collect(),
            reference: mean_of(&referenced, cards.len(), row),
            channels,
            warnings,
        })
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
    cards.iter().filter_map(sentence).collect()
}

fn check_names(cards: &[ChannelCard], choices: &Channels) -> Result<()> {
    let no_names = Vec::new();
    let named = match &choices.reference {
        Reference::Named(names) => names,
        Reference::Word(_) => &no_names,
    };
    let lists = [
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

/// Rows of the interpolated channels: spherical splines (m = 4, λ = 1e-5) over all analysed channels with a position.
fn rebuild(cards: &[ChannelCard]) -> Result<Vec<(usize, Sum)>> {
    let wanted: Vec<usize> = (0..cards.len())
        .filter(|&i| cards[i].state == ChannelState::Interpolated)
        .collect();
    if wanted.is_empty() {
        return Ok(Vec::new());
    }
    let targets = wanted
        .iter()
        .map(|&i| cards[i].position.ok_or_else(|| no_position(&cards[i].name)))
        .collect::<Result<Vec<_>>>()?;
    let sources: Vec<(usize, [f64; 3])> = cards
        .iter()
        .enumerate()
        .filter(|(_, card)| is_analysed(card) && card.state != ChannelState::Interpolated)
        .filter_map(|(i, card)| card.position.map(|p| (i, p)))
        .collect();
    let places: Vec<[f64; 3]> = sources.iter().map(|s| s.1).collect();
    let weights = Spline::new(&places, 4, 1e-5)?.matrix(&targets);
    let row = |k: usize| {
        sources
            .iter()
            .zip(weights.row(k).iter())
            .map(|(s, w)| (s.0, *w))
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
    weights
        .into_iter()
        .enumerate()
        .filter(|(_, weight)| *weight != 0.0)
        .collect()
}
