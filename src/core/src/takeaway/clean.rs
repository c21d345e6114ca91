//! A recording without some of its components, or with nothing but them.
//!
//! # Formula
//! In the prepared channels X, with the chosen filters as columns of W and A = P W (WᵀPW)⁻¹ (Haufe et al. 2014, eq. 7): removed,
//! X − A WᵀX; kept alone, A WᵀX. Since WᵀA = I, every chosen component is zero in what is left. Another component w is unchanged where
//! wᵀPW = 0, which the typical measure gives by construction (its filters are orthogonal in the space whitened by P); by the total
//! measure components overlap in P and change a little: [`Cleaned::others`] says how much.
//!
//! From the patterns that are at hand, aⱼ = P wⱼ/(wⱼᵀPwⱼ): A = [a₁ …] (Wᵀ[a₁ …])⁻¹.
//!
//! # What is written
//! The prepared channels at the prepared rate: filters and reference stay in force, because the components were found there.
use super::cells::{Cell, table};
use super::samples::recording_npy;
use super::weights::ordered;
use crate::analysis::{Analysis, Series};
use crate::error::{Kind, Problem, Result};
use crate::prepare::Prepared;
use crate::recording::edf::{Identity, write};
use crate::recording::{Channel, Recording};
use crate::sheet::Sheet;
use nalgebra::DMatrix;
use serde::{Deserialize, Serialize};

/// What is done with the chosen components.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Cleaning {
    /// They are taken out.
    Remove,
    /// All else is taken out.
    KeepOnly,
}

/// How a cleaned recording is written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Form {
    /// EDF+ with 16 bits and the events.
    Edf,
    /// A NumPy array of f32, channels × samples.
    Npy,
}

/// A cleaned recording and what the cleaning did.
#[derive(Debug, Clone)]
pub struct Cleaned {
    /// The prepared channels after it, with the recording's events.
    pub recording: Recording,
    /// What was done, in a sentence.
    pub note: String,
    /// The same in at most 44 ASCII characters, without spaces, for the free text of a header.
    pub mark: String,
    /// What it did to every channel.
    pub shares: Shares,
    /// Largest change of any component that was not chosen, relative to its standard deviation over the recording.
    pub others: f64,
}

/// Share of the variance that was removed, channel by channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Shares {
    /// Names.
    pub channels: Vec<String>,
    /// Standard deviation before.
    pub before: Vec<f64>,
    /// Standard deviation after.
    pub after: Vec<f64>,
    /// 1 − variance after / variance before; below 0 where a channel's variance grew.
    pub removed: Vec<f64>,
    /// Unit of the channels.
    pub unit: String,
}

/// Removes the chosen components (`stronger 1`, `weaker 2`, …), or keeps nothing else.
///
/// # Errors
/// Without components, without a choice, for a name that no component has, and for filters that cannot be told apart.
pub fn clean(analysis: &Analysis, chosen: &[String], how: Cleaning) -> Result<Cleaned> {
    let sheet = analysis.sheet();
    let (Some(prepared), Some(series)) = (analysis.prepared(), analysis.series()) else {
        return Err(refuse(
            "there are no components yet",
            "wait until they are there",
        ));
    };
    let at = places(&series, chosen)?;
    let patterns = joint_patterns(sheet, &at)?;
    let mut samples = Vec::with_capacity(prepared.channels.len());
    let mut shares = Shares {
        channels: prepared.channels.clone(),
        before: Vec::new(),
        after: Vec::new(),
        removed: Vec::new(),
        unit: prepared.unit.clone(),
    };
    let mut part = Vec::new();
    for c in 0..prepared.channels.len() {
        let channel = analysis.channel(c).unwrap_or(&[]);
        part.clear();
        part.resize(channel.len(), 0.0_f64);
        for (k, i) in at.iter().enumerate() {
            let weight = patterns[(c, k)];
            let component = &series.samples[*i];
            part.iter_mut()
                .zip(component)
                .for_each(|(p, s)| *p += weight * s);
        }
        let left: Vec<f32> = match how {
            Cleaning::Remove => {
                let pairs = channel.iter().zip(&part);
                pairs.map(|(x, p)| (f64::from(*x) - p) as f32).collect()
            }
            Cleaning::KeepOnly => part.iter().map(|p| *p as f32).collect(),
        };
        let [before, after] = [variance(channel, prepared), variance(&left, prepared)];
        shares.before.push(before.sqrt());
        shares.after.push(after.sqrt());
        shares.removed.push(if before > 0.0 {
            1.0 - after / before
        } else {
            0.0
        });
        samples.push(left);
    }
    let names: Vec<String> = at.iter().map(|i| series.names[*i].clone()).collect();
    let listed = super::words::list(&names);
    let note = match how {
        Cleaning::Remove => format!("Removed from the prepared channels: {listed}."),
        Cleaning::KeepOnly => format!("Nothing but {listed} kept in the prepared channels."),
    };
    let recording = recording(analysis.recording(), prepared, samples);
    let others = changed(sheet, prepared, &recording, &series, &at, how);
    Ok(Cleaned {
        mark: mark(&names, how),
        note,
        recording,
        shares,
        others,
    })
}

impl Cleaned {
    /// `cleaned.csv`: what the cleaning did to every channel.
    ///
    /// # Errors
    /// Those of a writer into memory.
    pub fn csv(&self) -> Result<String> {
        let header = [
            "channel",
            "unit",
            "sd_before",
            "sd_after",
            "variance_removed",
        ];
        let shares = &self.shares;
        let rows = (0..shares.channels.len()).map(|c| {
            vec![
                Cell::Text(&shares.channels[c]),
                Cell::Text(&shares.unit),
                Cell::Number(Some(shares.before[c])),
                Cell::Number(Some(shares.after[c])),
                Cell::Number(Some(shares.removed[c])),
            ]
        });
        table(std::iter::once(Vec::from(header.map(Cell::Text))).chain(rows))
    }

    /// The bytes of the file.
    ///
    /// # Errors
    /// Those of the writer: a recording that the form cannot hold.
    pub fn bytes(&self, form: Form) -> Result<Vec<u8>> {
        match form {
            Form::Edf => {
                let done = format!("{}_{}_{}", crate::PROGRAM, crate::VERSION, self.mark);
                let identity = Identity {
                    // The standard's four subfields, none of them told, then free text.
                    recording: format!("Startdate X X X {done}"),
                    ..Identity::default()
                };
                write(&self.recording, &identity)
            }
            Form::Npy => recording_npy(&self.recording),
        }
    }
}

/// The components' series as a recording: one channel each, without a unit, with the events of the recording they come from.
pub fn series_recording(series: &Series, from: &Recording) -> Recording {
    let channels = series.names.iter().map(|name| Channel {
        name: super::series::column(name),
        unit: String::new(),
        position: None,
    });
    Recording {
        name: from.name.clone(),
        format: from.format.clone(),
        rate_hz: series.rate_hz,
        channels: channels.collect(),
        samples: series
            .samples
            .iter()
            .map(|s| s.iter().map(|x| *x as f32).collect())
            .collect(),
        stretches: series.stretches.clone(),
        events: from.events.clone(),
        ..Recording::default()
    }
}

/// The components' series as EDF+ with the events.
///
/// # Errors
/// Those of the writer.
pub fn series_edf(series: &Series, from: &Recording) -> Result<Vec<u8>> {
    let identity = Identity {
        recording: format!(
            "Startdate X X X {}_{}_component_series",
            crate::PROGRAM,
            crate::VERSION
        ),
        ..Identity::default()
    };
    write(&series_recording(series, from), &identity)
}

fn refuse(what: &str, advice: &str) -> Problem {
    Problem::new(Kind::Contrast, what, advice)
}

/// Indexes of the chosen components, each once.
fn places(series: &Series, chosen: &[String]) -> Result<Vec<usize>> {
    if chosen.is_empty() {
        return Err(refuse("no component is chosen", "choose at least one"));
    }
    let mut at = Vec::new();
    for name in chosen {
        let plain = name.trim().replace(['-', '_'], " ");
        let Some(i) = series.names.iter().position(|n| *n == plain) else {
            return Err(refuse(
                "there is no such component",
                "choose among those that are there",
            )
            .at(super::strict::quote(name))
            .expected_found(series.names.join(", "), super::strict::quote(name)));
        };
        if !at.contains(&i) {
            at.push(i);
        }
    }
    Ok(at)
}

/// A = [a₁ …] (Wᵀ[a₁ …])⁻¹, `channels × chosen`.
fn joint_patterns(sheet: &Sheet, at: &[usize]) -> Result<DMatrix<f64>> {
    let all = ordered(sheet);
    let of = |k: usize| all[at[k]].1;
    let channels = of(0).filter.len();
    let filters = DMatrix::from_fn(channels, at.len(), |c, k| of(k).filter[c]);
    let patterns = DMatrix::from_fn(channels, at.len(), |c, k| of(k).pattern[c]);
    let inverse = (filters.transpose() * &patterns).try_inverse();
    inverse.map(|inverse| patterns * inverse).ok_or_else(|| {
        refuse(
            "the chosen components cannot be told apart",
            "choose fewer of them",
        )
    })
}

/// Variance about the mean of each stretch.
fn variance(samples: &[f32], prepared: &Prepared) -> f64 {
    let mut sum = 0.0;
    for s in &prepared.stretches {
        let part = samples.get(s.first..s.first + s.count).unwrap_or(&[]);
        let mean = part.iter().map(|x| f64::from(*x)).sum::<f64>() / part.len().max(1) as f64;
        sum += part
            .iter()
            .map(|x| (f64::from(*x) - mean).powi(2))
            .sum::<f64>();
    }
    sum / samples.len().max(1) as f64
}

fn recording(from: &Recording, prepared: &Prepared, samples: Vec<Vec<f32>>) -> Recording {
    let position = |name: &String| from.channels.iter().find(|c| c.name == *name);
    let channels = prepared.channels.iter().map(|name| Channel {
        name: name.clone(),
        unit: position(name).map_or_else(|| prepared.unit.clone(), |c| c.unit.clone()),
        position: position(name).and_then(|c| c.position),
    });
    Recording {
        name: from.name.clone(),
        format: from.format.clone(),
        rate_hz: prepared.rate_hz,
        channels: channels.collect(),
        samples,
        layout: from.layout.clone(),
        stretches: prepared.stretches.clone(),
        events: from.events.clone(),
        ..Recording::default()
    }
}

/// Largest root mean square change of a component that was to stay as it is, relative to its own size.
fn changed(
    sheet: &Sheet,
    prepared: &Prepared,
    after: &Recording,
    series: &Series,
    at: &[usize],
    how: Cleaning,
) -> f64 {
    let stays = |i: &usize| at.contains(i) == (how == Cleaning::KeepOnly);
    let all = ordered(sheet);
    let mut most = 0.0_f64;
    for i in (0..series.names.len()).filter(stays) {
        let filter = &all[i].1.filter;
        let mut now = vec![0.0; after.sample_count()];
        for (w, channel) in filter.iter().zip(&after.samples) {
            now.iter_mut()
                .zip(channel)
                .for_each(|(n, x)| *n += w * f64::from(*x));
        }
        let [mut away, mut own] = [0.0; 2];
        for s in &prepared.stretches {
            let part = s.first..s.first + s.count;
            for (n, x) in now[part.clone()].iter().zip(&series.samples[i][part]) {
                away += (n - x).powi(2);
                own += x.powi(2);
            }
        }
        if own > 0.0 {
            most = most.max((away / own).sqrt());
        }
    }
    most
}

/// `removed_stronger-1_weaker-1`, as far as it fits.
fn mark(names: &[String], how: Cleaning) -> String {
    let word = match how {
        Cleaning::Remove => "removed",
        Cleaning::KeepOnly => "kept_only",
    };
    let names: Vec<String> = names.iter().map(|n| n.replace(' ', "-")).collect();
    let mut mark = format!("{word}_{}", names.join("_"));
    if mark.len() > 44 {
        mark = format!("{word}_{}_components", names.len());
    }
    mark
}
