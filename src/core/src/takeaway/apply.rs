//! Weights from one recording, applied to another.
//!
//! Everything in the preparation is linear: a filter for the raw channels followed by the same FIR filters gives what the
//! filter for the prepared channels gives after them. So the raw channels are combined first, in f64, and only the
//! components are filtered and resampled.
use super::strict::quote;
use super::weights::{Weights, same};
use crate::analysis::Series;
use crate::error::{Kind, Problem, Result};
use crate::prepare::Preparing;
use crate::prepare::movie::Viewing;
use crate::recipe::{Contrast, EventWindow, Movie, Recipe};
use crate::recording::{Channel, Recording};
use crate::sheet::{ChannelCard, ChannelState};

/// What applying gives.
#[derive(Debug, Clone)]
pub struct Applied {
    /// Time courses of the components.
    pub series: Series,
    /// What a careful reader should know, each a sentence.
    pub notes: Vec<String>,
}

impl Weights {
    /// The components' time courses in `recording`. Channels are matched by name, in any order (the second of a name with the second); more channels are fine, a
    /// missing one is an error, so is a unit of another kind. Another unit of the same kind is converted. A recording sampled
    /// faster is resampled after the filters, one sampled slower is refused, because it lacks what the weights were fitted to.
    ///
    /// A movie is given as recorded: where the weights were fitted to bins or to changes against a baseline, the same are made of it first.
    /// Weights for bins or baselines are refused on what is no movie.
    pub fn apply(&self, recording: &Recording) -> Result<Applied> {
        let made = self.viewed(recording)?;
        let recording = made.as_ref().unwrap_or(recording);
        let mut notes = Vec::new();
        if made.is_some() {
            notes.push(
                "The movie was binned and set against its baseline as the weights say.".into(),
            );
        }
        let filter = self.filter_for(recording, &mut notes)?;
        let gains = self.gains(recording, &mut notes)?;
        let count = recording.sample_count();
        let mut halves = Vec::with_capacity(self.filters.len() * 2);
        for weights in &self.filters {
            let mut sum = vec![0.0_f64; count];
            for (w, (at, gain)) in weights.iter().zip(&gains) {
                if *w != 0.0 {
                    let samples = recording.samples.get(*at).map_or(&[][..], Vec::as_slice);
                    for (s, x) in sum.iter_mut().zip(samples) {
                        *s += w * gain * f64::from(*x);
                    }
                }
            }
            // A recording holds f32: the sum goes in as its nearest f32 and the rest, which together keep 48 bits.
            let high: Vec<f32> = sum.iter().map(|s| *s as f32).collect();
            let low = sum
                .iter()
                .zip(&high)
                .map(|(s, h)| (s - f64::from(*h)) as f32)
                .collect();
            halves.push(high);
            halves.push(low);
        }
        let series = self.filtered(recording, halves, filter)?;
        Ok(Applied { series, notes })
    }

    /// The movie with the weights' bins and baseline; all its bins, since the filters say by name which they use.
    fn viewed(&self, recording: &Recording) -> Result<Option<Recording>> {
        let movie = Movie {
            mask: None,
            ..self.preparation.movie.clone()
        };
        let Some(mut viewing) =
            Viewing::new(recording, &movie).map_err(|p| p.in_file(&recording.name))?
        else {
            return Ok(None);
        };
        while !viewing.finished() {
            viewing.step(recording)?;
        }
        Ok(Some(viewing.finish(recording).0))
    }

    /// Index in the recording and factor of unit of every channel.
    fn gains(&self, recording: &Recording, notes: &mut Vec<String>) -> Result<Vec<(usize, f64)>> {
        let mut gains = Vec::with_capacity(self.channels.len());
        let mut missing = Vec::new();
        for (k, wanted) in self.channels.iter().enumerate() {
            let needed = self.filters.iter().any(|row| row[k] != 0.0);
            let Some(at) = same(
                recording.channels.iter().map(|c| c.name.as_str()),
                self.channels[..k].iter().map(|c| c.name.as_str()),
                &wanted.name,
            ) else {
                if needed {
                    missing.push(quote(&wanted.name));
                }
                gains.push((usize::MAX, 0.0));
                continue;
            };
            let unit = &recording.channels[at].unit;
            let gain = factor(unit, &wanted.unit).ok_or_else(|| {
                refuse(
                    recording,
                    "a channel has a unit of another kind than the weights expect",
                )
                .at(format!("channel {}", quote(&wanted.name)))
                .expected_found(quote(&wanted.unit), quote(unit))
            })?;
            if gain != 1.0 {
                notes.push(format!(
                    "Channel {} is in {} and was brought to {}, the unit of the weights.",
                    quote(&wanted.name),
                    quote(unit),
                    quote(&wanted.unit)
                ));
            }
            if needed && recording.samples[at].iter().any(|x| !x.is_finite()) {
                return Err(refuse(
                    recording,
                    "a channel that the weights need holds values that are not numbers",
                )
                .at(format!("channel {}", quote(&wanted.name)))
                .expected_found("numbers", "not-a-number or infinity"));
            }
            gains.push((at, gain));
        }
        if missing.is_empty() {
            return Ok(gains);
        }
        missing.truncate(8);
        Err(refuse(
            recording,
            "the recording lacks channels that the weights need",
        )
        .expected_found(
            format!("channels named {}", missing.join(", ")),
            "none of these names",
        ))
    }

    /// The filters, with the resampling that brings the recording to the weights' rate.
    fn filter_for(
        &self,
        recording: &Recording,
        notes: &mut Vec<String>,
    ) -> Result<crate::recipe::Filter> {
        let mut filter = self.preparation.filter.clone();
        let slower = recording.rate_hz < self.rate_hz * (1.0 - 1e-9);
        let faster = recording.rate_hz > self.rate_hz * (1.0 + 1e-9);
        if slower {
            return Err(refuse(
                recording,
                "it is sampled more slowly than the recording the weights were fitted to, so it lacks their upper frequencies",
            )
            .expected_found(
                format!("at least {} Hz", self.rate_hz),
                format!("{} Hz", recording.rate_hz),
            ));
        }
        if faster {
            let to = *filter.resample_hz.get_or_insert(self.rate_hz);
            notes.push(format!(
                "Sampled at {} Hz, the weights were fitted at {} Hz: the components are resampled to {to} Hz.",
                recording.rate_hz, self.rate_hz
            ));
        }
        Ok(filter)
    }

    /// Filters and resamples the components, given as pairs of f32 channels, and adds each pair up.
    fn filtered(
        &self,
        recording: &Recording,
        halves: Vec<Vec<f32>>,
        filter: crate::recipe::Filter,
    ) -> Result<Series> {
        let channels: Vec<Channel> = (0..halves.len())
            .map(|k| Channel {
                name: format!("half {k}"),
                unit: String::new(),
                position: None,
            })
            .collect();
        let cards: Vec<ChannelCard> = channels
            .iter()
            .map(|c| ChannelCard {
                name: c.name.clone(),
                unit: String::new(),
                sd: Some(1.0),
                mains_db: None,
                mains_hz: None,
                state: ChannelState::Used,
                position: None,
            })
            .collect();
        let combined = Recording {
            name: recording.name.clone(),
            format: recording.format.clone(),
            rate_hz: recording.rate_hz,
            channels,
            samples: halves,
            stretches: recording.stretches.clone(),
            ..Recording::default()
        };
        let mut preparing = Preparing::new(&combined, &cards, &filter_only(filter))?;
        while preparing.step(&combined) {}
        let prepared = preparing.finish().ok_or_else(|| {
            refuse(
                recording,
                "the preparation of the weights cannot be repeated on it",
            )
        })?;
        let samples = prepared
            .samples
            .chunks(2)
            .map(|pair| {
                let low = pair.get(1).map_or(&[][..], Vec::as_slice);
                let high = pair.first().map_or(&[][..], Vec::as_slice);
                high.iter()
                    .zip(low)
                    .map(|(h, l)| f64::from(*h) + f64::from(*l))
                    .collect()
            })
            .collect();
        Ok(Series {
            names: self.component_names(),
            samples,
            rate_hz: prepared.rate_hz,
            stretches: prepared.stretches,
        })
    }
}

fn refuse(recording: &Recording, what: &str) -> Problem {
    Problem::new(
        Kind::Contrast,
        what,
        "choose a recording of the same montage, or fit new weights to this one",
    )
    .in_file(&recording.name)
}

/// A recipe that filters and does nothing else; its contrast is never looked at.
fn filter_only(filter: crate::recipe::Filter) -> Recipe {
    let window = EventWindow::new("", 0.0, 1.0);
    Recipe {
        filter,
        ..Recipe::asking(Contrast::Windows {
            signal: window.clone(),
            reference: window,
        })
    }
}

/// What a sample in `from` is multiplied by to be in `to`: decimal prefixes of one unit; `None` for other units.
fn factor(from: &str, to: &str) -> Option<f64> {
    if from == to {
        return Some(1.0);
    }
    let (from_power, from_base) = split(from)?;
    let (to_power, to_base) = split(to)?;
    (from_base == to_base).then(|| 10_f64.powi(from_power - to_power))
}

/// Power of ten and base unit of volts and teslas.
fn split(unit: &str) -> Option<(i32, &'static str)> {
    let unit = unit.trim();
    let base = ["V", "T"].into_iter().find(|base| unit.ends_with(base))?;
    let power = match unit.trim_end_matches(base) {
        "" => 0,
        "m" => -3,
        "u" | "µ" | "μ" => -6,
        "n" => -9,
        "p" => -12,
        "f" => -15,
        _ => return None,
    };
    Some((power, base))
}

#[cfg(test)]
mod tests {
    use super::factor;

    #[test]
    fn units_of_one_kind_convert_and_others_do_not() {
        let cases = [
            ("µV", "µV", Some(1.0)),
            ("mV", "µV", Some(1e3)),
            ("uV", "μV", Some(1.0)),
            ("V", "nV", Some(1e9)),
            ("fT", "pT", Some(1e-3)),
            ("µV", "fT", None),
            ("", "µV", None),
            ("degC", "µV", None),
            ("kV", "µV", None),
            ("degC", "degC", Some(1.0)),
        ];
        for (from, to, expected) in cases {
            let found = factor(from, to);
            let close = match (found, expected) {
                (Some(f), Some(e)) => (f / e - 1.0).abs() < 1e-15,
                (None, None) => true,
                _ => false,
            };
            assert!(close, "{from} to {to}: {found:?}, expected {expected:?}");
        }
    }
}
