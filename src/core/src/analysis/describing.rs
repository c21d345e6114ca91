//! Spectra, courses and single trials of the components, from their time courses in the windows.
//!
//! Which spectra stand side by side depends on the kind: windows and spans compare those of both sides; a rhythm and what changes
//! slowly are measured on the same segments, so there the component stands beside the average channel at equal power outside the
//! band (or over all); what repeats compares the average over trials, times their number, with the single trials.
use super::cards;
use super::work::{Work, inner, lost};
use crate::contrast::windows::{Exchange, Selection, events_of, sample_at};
use crate::describe::welch::{Welch, segment_for};
use crate::describe::{course, spectra};
use crate::error::Result;
use crate::evidence::permute::STREAM_DESCRIBE;
use crate::prepare::Prepared;
use crate::recipe::{BandReference, Contrast, Recipe};
use crate::recording::{Event, Recording};
use crate::sheet::Spectra;

/// Segments that the average channel's spectrum is taken from, at most.
const AVERAGED: usize = 60;

/// Spectra, course and single trials of component number `at` (the first of each end, then the others), with intervals from
/// `count` bootstrap samples.
pub(super) fn describe(
    work: &mut Work,
    recording: &Recording,
    recipe: &Recipe,
    at: usize,
    count: usize,
) -> Result<()> {
    let (Some(prepared), Some(selection)) = (&work.prepared, &work.selection) else {
        return Err(lost());
    };
    let (up, down) = (work.sheet.stronger.len(), work.sheet.weaker.len());
    let (stronger, index) = describing(at, up, down);
    let component = if stronger {
        &mut work.sheet.stronger[index]
    } else {
        &mut work.sheet.weaker[index]
    };
    if let (Some(design), None) = (&work.design, &work.basis) {
        component.pattern_interval = cards::pattern_interval(
            &work.covariances,
            design,
            &component.filter,
            count,
            recipe.evidence.seed,
        );
    }
    let filter = inner(&work.basis, &component.filter);
    let rate = prepared.rate_hz;
    let side = |wanted: bool| -> Vec<(usize, usize)> {
        let windows = selection.windows.iter().filter(|w| w.signal == wanted);
        windows.map(|w| (w.first, w.count)).collect()
    };
    let (signals, references) = (side(true), side(false));
    let around = around(recording, recipe, prepared, selection);
    let (onsets, span) = around
        .as_ref()
        .map_or((&[][..], [0.0; 2]), |a| (&a.onsets[..], a.span));
    let series = partial_series(prepared, &filter, &signals, &references, onsets, span);
    let seed = recipe.evidence.seed ^ STREAM_DESCRIBE << 32;
    let of_windows = || {
        spectra::by(
            recipe.spectrum,
            &series,
            &signals,
            &references,
            rate,
            count,
            seed,
        )
    };
    let found = match &recipe.contrast {
        Contrast::Windows { .. } | Contrast::Spans { .. } => of_windows(),
        // The average over trials stands on Welch's segments.
        Contrast::Repeatable(_) => beside_average(
            spectra::of_component(&series, &signals, &references, rate, count, seed),
            &series,
            &signals,
            rate,
        ),
        Contrast::Band { .. } | Contrast::Slow { .. } => {
            let found = spectra::of_component(&series, &signals, &[], rate, count, seed);
            beside_channels(found, prepared, &signals, &recipe.contrast)
        }
    };
    component.peak_hz = spectra::peak_hz(
        &found,
        if stronger {
            spectra::End::Stronger
        } else {
            spectra::End::Weaker
        },
    );
    component.spectra = Some(found);
    let Some(around) = around else {
        return Ok(());
    };
    let baseline =
        if selection.exchange == Exchange::Swap && around.onsets.len() == references.len() {
            course::Baseline::Paired(&references)
        } else {
            course::Baseline::Pooled(&references)
        };
    let looked = course::Span {
        from_s: span[0],
        to_s: span[1],
    };
    if let Some((c, mut image)) = course::of_component(
        &series,
        &prepared.stretches,
        &around.event,
        &around.onsets,
        baseline,
        looked,
        rate,
        count,
        seed,
    ) {
        course::lags(&mut image, &recording.events, &around.event, span[1]);
        component.course = Some(c);
        component.image = Some(image);
    }
    Ok(())
}

/// The events that courses are drawn around.
pub(super) struct Around {
    event: String,
    /// Sample and time of each.
    pub(super) onsets: Vec<(usize, f64)>,
    /// Seconds drawn.
    pub(super) span: [f64; 2],
}

/// The events of the contrast that are used; `None` where it is not made of event windows.
pub(super) fn around(
    recording: &Recording,
    recipe: &Recipe,
    prepared: &Prepared,
    selection: &Selection,
) -> Option<Around> {
    let windows = recipe.contrast.around();
    let (signal, reference) = (*windows.first()?, *windows.last()?);
    let span = course_span(
        signal.same_events(reference),
        [signal.from_s, signal.to_s.max(signal.from_s)],
        [reference.from_s, reference.to_s.max(reference.from_s)],
    );
    let used: Vec<f64> = selection
        .windows
        .iter()
        .filter(|w| w.signal)
        .map(|w| w.onset_s)
        .collect();
    let events: Vec<&Event> = events_of(signal, &recording.events);
    // Both lists are in order of time.
    let mut at = used.iter().peekable();
    let onsets = events
        .iter()
        .filter(|e| {
            while at.next_if(|t| **t < e.onset_s).is_some() {}
            at.next_if(|t| **t == e.onset_s).is_some()
        })
        .filter_map(|e| {
            Some((
                sample_at(&prepared.stretches, prepared.rate_hz, e.onset_s)?,
                e.onset_s,
            ))
        })
        .collect();
    Some(Around {
        event: signal.event.clone(),
        onsets,
        span,
    })
}

/// The average over trials, times their number, on the signal side.
fn beside_average(
    mut found: Spectra,
    series: &[f64],
    trials: &[(usize, usize)],
    rate_hz: f64,
) -> Spectra {
    let Some(length) = trials.first().map(|t| t.1) else {
        return found;
    };
    let mut mean = vec![0.0; length];
    for (first, _) in trials {
        for (m, x) in mean.iter_mut().zip(&series[*first..]) {
            *m += x / trials.len() as f64;
        }
    }
    let density = Welch::new(found.segment, rate_hz).density(&mean);
    let scaled: Vec<f64> = density.iter().map(|d| d * trials.len() as f64).collect();
    // One average has no spread over windows.
    found.signal_low = scaled.clone();
    found.signal_high = scaled.clone();
    found.signal = scaled;
    found
}

/// The average channel on the reference side, at equal power in the flanks (band against flanks) or over all.
fn beside_channels(
    mut found: Spectra,
    prepared: &Prepared,
    segments: &[(usize, usize)],
    contrast: &Contrast,
) -> Spectra {
    let step = segments.len().div_ceil(AVERAGED).max(1);
    let chosen: Vec<(usize, usize)> = segments.iter().copied().step_by(step).collect();
    let shortest = segments.iter().map(|s| s.1).min().unwrap_or(0);
    let mut welch = Welch::new(segment_for(shortest, prepared.rate_hz), prepared.rate_hz);
    let mut mean = vec![0.0; found.hz.len()];
    for channel in &prepared.samples {
        let mut density = vec![0.0; found.hz.len()];
        for (first, count) in &chosen {
            let samples: Vec<f64> = channel[*first..first + count]
                .iter()
                .map(|x| f64::from(*x))
                .collect();
            for (d, x) in density.iter_mut().zip(welch.density(&samples)) {
                *d += x;
            }
        }
        let power: f64 = density.iter().skip(1).sum();
        if power > 0.0 {
            for (m, d) in mean.iter_mut().zip(&density) {
                *m += d / power;
            }
        }
    }
    let compared = |hz: f64| match contrast {
        Contrast::Band {
            centre_hz,
            half_width_hz,
            reference: BandReference::Flanks,
            ..
        } => {
            let away = (hz - centre_hz).abs() / half_width_hz;
            (2.0..=3.0).contains(&away)
        }
        _ => hz > 0.0,
    };
    let power = |density: &[f64]| -> f64 {
        let bins = found
            .hz
            .iter()
            .zip(density)
            .filter(|(hz, _)| compared(**hz));
        bins.map(|(_, d)| d).sum()
    };
    let level = power(&found.signal) / power(&mean);
    if level.is_finite() {
        mean.iter_mut().for_each(|m| *m *= level);
    }
    found.reference_low = mean.clone();
    found.reference_high = mean.clone();
    found.reference = mean;
    found
}

/// Component number `at` of the describing order: first stronger, first weaker, other stronger, other weaker.
fn describing(at: usize, up: usize, down: usize) -> (bool, usize) {
    let firsts: Vec<(bool, usize)> = [(true, up), (false, down)]
        .into_iter()
        .filter(|x| x.1 > 0)
        .map(|x| (x.0, 0))
        .collect();
    let others = (1..up)
        .map(|i| (true, i))
        .chain((1..down).map(|i| (false, i)));
    firsts
        .into_iter()
        .chain(others)
        .nth(at)
        .unwrap_or((up > 0, 0))
}

/// Seconds around the event that are drawn: both windows and a quarter of their reach beyond, at least 0.3 s (paired); the
/// signal window and as much before it (unpaired).
fn course_span(paired: bool, signal: [f64; 2], reference: [f64; 2]) -> [f64; 2] {
    let (from, to) = if paired {
        (signal[0].min(reference[0]), signal[1].max(reference[1]))
    } else {
        (signal[0].min(-(signal[1] - signal[0])), signal[1])
    };
    let more = (0.25 * (to - from)).clamp(0.1, 0.5);
    [from - more, to + more]
}

/// The component where windows and courses need it, 0 elsewhere.
fn partial_series(
    prepared: &Prepared,
    filter: &[f64],
    signals: &[(usize, usize)],
    references: &[(usize, usize)],
    onsets: &[(usize, f64)],
    span: [f64; 2],
) -> Vec<f64> {
    let all = prepared.samples.first().map_or(0, Vec::len);
    let rate = prepared.rate_hz;
    // Power courses are smoothed over 0.2 s: half of that is needed beyond its ends.
    let beyond = 0.5 * course::SMOOTHING_S;
    let around = onsets.iter().map(|(at, _)| {
        let from = (*at as f64 + (span[0] - beyond) * rate).floor().max(0.0) as usize;
        let to = (*at as f64 + (span[1] + beyond) * rate).ceil().max(0.0) as usize + 2;
        (from.min(all), to.min(all))
    });
    let mut ranges: Vec<(usize, usize)> = signals
        .iter()
        .chain(references)
        .map(|(first, count)| (*first, first + count))
        .chain(around)
        .collect();
    ranges.sort_unstable();
    let mut out = vec![0.0; all];
    let mut done = 0;
    for (from, to) in ranges {
        let from = from.max(done);
        if from < to {
            add_projection(&mut out, prepared, filter, from, to);
            done = to;
        }
    }
    out
}

/// out[from..to] += wᵀX[from..to], in blocks that stay in the cache, four channels at a time.
pub(super) fn add_projection(
    out: &mut [f64],
    prepared: &Prepared,
    filter: &[f64],
    from: usize,
    to: usize,
) {
    const BLOCK: usize = 4096;
    let mut start = from;
    while start < to {
        let end = (start + BLOCK).min(to);
        let into = &mut out[start..end];
        let (weights, samples) = (filter.chunks_exact(4), prepared.samples.chunks_exact(4));
        let rest = weights.remainder().iter().zip(samples.remainder());
        for (w, x) in weights.zip(samples) {
            let [a, b, c, d] = [0, 1, 2, 3].map(|i| &x[i][start..end]);
            for (i, y) in into.iter_mut().enumerate() {
                *y += (w[0] * f64::from(a[i]) + w[1] * f64::from(b[i]))
                    + (w[2] * f64::from(c[i]) + w[3] * f64::from(d[i]));
            }
        }
        for (w, channel) in rest {
            for (y, x) in into.iter_mut().zip(&channel[start..end]) {
                *y += w * f64::from(*x);
            }
        }
        start = end;
    }
}
