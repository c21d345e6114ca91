//! Power over time and frequency of every reported component, trial by trial, after everything else is known.
use super::describing::{add_projection, around};
use super::work::Work;
use crate::contrast::windows::Selection;
use crate::describe::time_frequency::{Picture, frequencies};
use crate::prepare::Prepared;
use crate::recipe::Recipe;
use crate::recording::Recording;

/// How far the pictures are.
#[derive(Debug, Default)]
pub(super) struct Portraits {
    /// Components that have theirs.
    pub(super) done: usize,
    now: Option<Now>,
}

/// The picture at work.
#[derive(Debug)]
struct Now {
    series: Vec<f64>,
    picture: Picture,
    onsets: Vec<usize>,
    references: Vec<(usize, usize)>,
    /// Trials and windows already in it.
    next: usize,
}

impl Work {
    /// The next trials of the picture at work, about `bite` operations; says how many trials are done and how many there are.
    pub(super) fn portrait(
        &mut self,
        recording: &Recording,
        recipe: &Recipe,
        bite: f64,
    ) -> (u64, u64) {
        let at = self.portraits.done;
        let up = self.sheet.stronger.len();
        let all = up + self.sheet.weaker.len();
        let component = if at < up {
            self.sheet.stronger.get_mut(at)
        } else {
            self.sheet.weaker.get_mut(at - up)
        };
        let (Some(component), Some(prepared), Some(selection)) =
            (component, &self.prepared, &self.selection)
        else {
            self.portraits.done = all;
            return (1, 1);
        };
        let now = match self.portraits.now.take() {
            Some(now) => Some(now),
            None => Now::begin(recording, recipe, prepared, selection, &component.filter),
        };
        let Some(mut now) = now else {
            self.portraits.done += 1;
            return (self.portraits.done as u64, all as u64);
        };
        let of = now.onsets.len().max(now.references.len()).max(1);
        let many = (bite / now.picture.cost().max(1.0)).clamp(1.0, 64.0) as usize;
        for k in now.next..(now.next + many).min(of) {
            if let Some(onset) = now.onsets.get(k) {
                now.picture
                    .add_trial(&now.series, &prepared.stretches, *onset);
            }
            if let Some(window) = now.references.get(k) {
                now.picture
                    .add_reference(&now.series, &prepared.stretches, *window);
            }
        }
        now.next += many;
        let done = (at * of + now.next.min(of)) as u64;
        if now.next >= of {
            component.time_frequency = now.picture.finish();
            self.portraits.done += 1;
        } else {
            self.portraits.now = Some(now);
        }
        (done, (all * of) as u64)
    }
}

impl Now {
    /// `None` for a question without event windows, and where no frequency fits.
    fn begin(
        recording: &Recording,
        recipe: &Recipe,
        prepared: &Prepared,
        selection: &Selection,
        filter: &[f64],
    ) -> Option<Now> {
        let (signal, reference) = recipe.contrast.event_windows()?;
        let rate = prepared.rate_hz;
        let around = around(recording, recipe, prepared, selection)?;
        let span = around.span;
        let shortest = (signal.to_s - signal.from_s).min(reference.to_s - reference.from_s);
        // A wavelet should see little beyond a window: two periods fit into the shorter one.
        let low = (2.0 / shortest)
            .max(recipe.filter.high_pass_hz.unwrap_or(0.0))
            .max(1.0);
        let high = (0.45 * rate)
            .min(recipe.filter.low_pass_hz.unwrap_or(f64::INFINITY))
            .min(120.0);
        let hz = frequencies(low, high);
        if hz.is_empty() {
            return None;
        }
        let onsets = around.onsets.iter().map(|o| o.0).collect();
        let references = selection
            .windows
            .iter()
            .filter(|w| !w.signal)
            .map(|w| (w.first, w.count))
            .collect();
        let samples = prepared.samples.first().map_or(0, Vec::len);
        let mut series = vec![0.0; samples];
        add_projection(&mut series, prepared, filter, 0, samples);
        Some(Now {
            series,
            picture: Picture::new(hz, span[0], span[1], rate),
            onsets,
            references,
            next: 0,
        })
    }
}
