//! Whether saved filters still separate the two sides in another recording: nothing is fitted again.
//!
//! The filters of [`Weights`] are applied as they are; the recipe's event windows are cut from the new recording; ratios, spectra and
//! courses are those of the fixed components. As the filters never saw these windows, the ratios are held-out ones.
use super::apply::Applied;
use super::weights::Weights;
use crate::analysis::blank;
use crate::contrast::windows::{events_of, sample_at, select};
use crate::describe::{course, spectra};
use crate::error::{Kind, Problem, Result};
use crate::evidence::bootstrap::{generator, quantile};
use crate::recipe::Recipe;
use crate::recording::Recording;
use crate::sheet::{Component, Sheet, TotalRatio, TypicalRatio, WindowPower};
use serde::Serialize;

/// Stream of the intervals.
const STREAM_CARRIED: u64 = 5;

/// Saved filters on another recording.
#[derive(Debug, Clone)]
pub struct Carried {
    /// Time courses, and what is to know of channels, units and rates.
    pub applied: Applied,
    /// One row a component, in the order of the weights.
    pub rows: Vec<CarriedRow>,
    /// The components with spectra and courses here, so that figures are drawn as for a fit.
    pub sheet: Sheet,
}

/// How one component does here.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CarriedRow {
    /// `stronger 1`, ….
    pub name: String,
    /// Held-out ratio where the weights come from, where they say so, else the fitted one.
    pub before: f64,
    /// Whether `before` is a held-out ratio.
    pub before_held_out: bool,
    /// Ratio in a typical trial, here.
    pub typical: f64,
    /// Its 95 % bootstrap interval over trials; `None` under ten pairs.
    pub interval: Option<[f64; 2]>,
    /// Ratio over all power, here.
    pub total: f64,
    /// Windows a side, here.
    pub windows: [usize; 2],
    /// What it comes to, in a sentence.
    pub reading: String,
}

impl Weights {
    /// Applies the weights and looks whether they still separate the recipe's windows.
    ///
    /// # Errors
    /// Those of [`Weights::apply`]; a contrast without event windows; events that the recording does not hold.
    pub fn carry(&self, recording: &Recording, recipe: &Recipe) -> Result<Carried> {
        let applied = self.apply(recording)?;
        let series = &applied.series;
        let Some((signal, _)) = recipe.contrast.event_windows() else {
            return Err(Problem::new(
                Kind::Contrast,
                "saved filters are looked at around events, and this question names none",
                "ask for windows around an event",
            ));
        };
        let selection = select(recipe, &recording.events, &series.stretches, series.rate_hz)?;
        let side = |wanted: bool| -> Vec<(usize, usize)> {
            let windows = selection.windows.iter().filter(|w| w.signal == wanted);
            windows.map(|w| (w.first, w.count)).collect()
        };
        let (signals, references) = (side(true), side(false));
        let onsets: Vec<(usize, f64)> = events_of(signal, &recording.events)
            .into_iter()
            .filter(|e| {
                let used =
                    |w: &crate::contrast::windows::Window| w.signal && w.onset_s == e.onset_s;
                !selection.paired || selection.windows.iter().any(used)
            })
            .filter_map(|e| {
                Some((
                    sample_at(&series.stretches, series.rate_hz, e.onset_s)?,
                    e.onset_s,
                ))
            })
            .collect();
        let mut sheet = blank(recording, recipe);
        sheet.windows = Some(selection.card.clone());
        let mut rows = Vec::new();
        for (k, name) in series.names.iter().enumerate() {
            let samples = &series.samples[k];
            let powers: Vec<f64> = selection
                .windows
                .iter()
                .map(|w| variance(&samples[w.first..w.first + w.count]))
                .collect();
            let mut component = component(
                &powers,
                &selection,
                recipe.evidence.bootstrap,
                recipe.evidence.seed,
            );
            let counts = [signals.len(), references.len()];
            rows.push(self.row(k, name, &component, counts));
            let stronger = !name.starts_with("weaker");
            let end = if stronger {
                spectra::End::Stronger
            } else {
                spectra::End::Weaker
            };
            let found = spectra::by(
                recipe.spectrum,
                samples,
                &signals,
                &references,
                series.rate_hz,
                recipe.evidence.bootstrap,
                recipe.evidence.seed,
            );
            component.peak_hz = spectra::peak_hz(&found, end);
            component.spectra = Some(found);
            let baseline = if selection.paired && onsets.len() == references.len() {
                course::Baseline::Paired(&references)
            } else {
                course::Baseline::Pooled(&references)
            };
            let span = course::Span {
                from_s: (signal.from_s).min(-0.2) - 0.2,
                to_s: signal.to_s + 0.2,
            };
            if let Some((around, image)) = course::of_component(
                samples,
                &series.stretches,
                &signal.event,
                &onsets,
                baseline,
                span,
                series.rate_hz,
                recipe.evidence.bootstrap,
                recipe.evidence.seed,
            ) {
                component.course = Some(around);
                component.image = Some(image);
            }
            if stronger {
                sheet.stronger.push(component);
            } else {
                sheet.weaker.push(component);
            }
        }
        Ok(Carried {
            applied,
            rows,
            sheet,
        })
    }

    fn row(&self, k: usize, name: &str, component: &Component, windows: [usize; 2]) -> CarriedRow {
        let held = self.held_out.get(k).copied().flatten();
        let before = held.or(self.ratios.get(k).copied()).unwrap_or(f64::NAN);
        let typical = component.typical.fitted;
        let interval = component.typical.interval;
        let up = before >= 1.0;
        let same_side = (typical >= 1.0) == up;
        let clear = interval.is_some_and(|[low, high]| if up { low > 1.0 } else { high < 1.0 });
        let factor = super::words::factor(typical);
        let was = super::words::factor(before);
        let reading = match (same_side, clear, interval) {
            (true, true, _) => format!(
                "Component {name} still separates here: {factor} in a typical trial, {was} where it was fitted."
            ),
            (true, false, Some(_)) => {
                format!(
                    "Component {name} leans the same way here ({factor}), but its interval includes 1."
                )
            }
            (true, false, None) => format!(
                "Component {name} leans the same way here ({factor}); there are too few trials for an interval."
            ),
            (false, ..) => format!(
                "Component {name} does not separate here: {factor} in a typical trial, {was} where it was fitted."
            ),
        };
        CarriedRow {
            name: name.to_owned(),
            before,
            before_held_out: held.is_some(),
            typical,
            interval,
            total: component.total.fitted,
            windows,
            reading,
        }
    }
}

fn variance(samples: &[f64]) -> f64 {
    let n = samples.len() as f64;
    let mean = samples.iter().sum::<f64>() / n;
    samples.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / (n - 1.0)
}

/// Ratios of a fixed component from its variance in every window.
fn component(
    powers: &[f64],
    selection: &crate::contrast::windows::Selection,
    bootstrap: usize,
    seed: u64,
) -> Component {
    let windows = selection.windows.iter().zip(powers);
    let logs = |signal: bool| -> Vec<f64> {
        let own = windows.clone().filter(|(w, _)| w.signal == signal);
        own.map(|(_, p)| p.ln()).collect()
    };
    let pooled = |signal: bool| -> f64 {
        let own = windows.clone().filter(|(w, _)| w.signal == signal);
        let (sum, weight) = own.fold((0.0, 0.0), |(s, n), (w, p)| {
            let weight = w.count as f64 - 1.0;
            (s + weight * p, n + weight)
        });
        sum / weight
    };
    let (signal, reference) = (logs(true), logs(false));
    let mean = |v: &[f64]| v.iter().sum::<f64>() / v.len() as f64;
    let reference_power = pooled(false);
    let enough = signal.len().min(reference.len()) >= crate::evidence::FEWEST;
    Component {
        typical: TypicalRatio {
            fitted: (mean(&signal) - mean(&reference)).exp(),
            held_out: Some((mean(&signal) - mean(&reference)).exp()),
            interval: (enough && bootstrap > 0)
                .then(|| interval(&signal, &reference, selection.paired, bootstrap, seed)),
        },
        total: TotalRatio {
            fitted: pooled(true) / reference_power,
            held_out: Some(pooled(true) / reference_power),
            folds: Vec::new(),
        },
        powers: windows
            .map(|(w, p)| WindowPower {
                signal: w.signal,
                trial: w.trial,
                onset_s: w.onset_s,
                power: p / reference_power,
            })
            .collect(),
        ..Component::default()
    }
}

/// 95 % percentile interval of the typical ratio over trials (pairs together) or over windows of each side.
fn interval(
    signal: &[f64],
    reference: &[f64],
    paired: bool,
    samples: usize,
    seed: u64,
) -> [f64; 2] {
    let mut rng = generator(seed, STREAM_CARRIED);
    let mut drawn: Vec<f64> = (0..samples)
        .map(|_| {
            let mut at = |n: usize| crate::evidence::bootstrap::below(&mut rng, n);
            if paired {
                let picks = (0..signal.len()).map(|_| at(signal.len()));
                let sum: f64 = picks.map(|k| signal[k] - reference[k]).sum();
                sum / signal.len() as f64
            } else {
                let mut mean =
                    |v: &[f64]| (0..v.len()).map(|_| v[at(v.len())]).sum::<f64>() / v.len() as f64;
                mean(signal) - mean(reference)
            }
        })
        .collect();
    drawn.sort_by(f64::total_cmp);
    [quantile(&drawn, 0.025).exp(), quantile(&drawn, 0.975).exp()]
}
