//! A rhythm and its neighbours: the two filters of a band contrast.
//!
//! With centre c and half width h, −6 dB points: the band is [c − h, c + h]; its flanks are [c − 3h, c − 2h] and [c + 2h, c + 3h]
//! (Nikulin, Nolte & Curio 2011, *NeuroImage* 55:1528–1535, compare with neighbouring bands in this way). Band and flanks are equally
//! wide in all and scaled to pass as much white noise, so a spectrum that is flat, or falls in a straight line, gives a ratio of 1. All transitions are h wide, which
//! leaves the skirts of band and flanks apart; filters are linear-phase (windowed sinc, Hamming window), applied with zero phase.
//!
//! Against `broadband` the reference is the prepared recording itself (de Cheveigné & Arzounian 2015, *J. Neural Eng.* 12:066020), and
//! the signal covariances are scaled so that the average channel has a ratio of 1.
use crate::error::{Kind, Problem, Result};
use crate::prepare::Prepared;
use crate::prepare::fir::{Pass, ZeroPhase, hamming, windowed_sinc};
use crate::recipe::BandReference;

/// Half widths from the centre to where the last skirt ends.
pub fn reach(reference: BandReference) -> f64 {
    match reference {
        BandReference::Flanks => 3.5,
        BandReference::Broadband => 1.5,
    }
}

/// Taps of a band-pass with these −6 dB points: the difference of two low-passes.
fn band_pass(low_hz: f64, high_hz: f64, window: &[f64], rate_hz: f64) -> Vec<f64> {
    let nyquist = rate_hz / 2.0;
    let up_to = |hz: f64| windowed_sinc(Pass::Below(hz / nyquist), window);
    up_to(high_hz)
        .iter()
        .zip(up_to(low_hz))
        .map(|(high, low)| high - low)
        .collect()
}

/// Taps of the band and, against flanks, of the flanks.
pub fn taps(
    centre_hz: f64,
    half_width_hz: f64,
    reference: BandReference,
    rate_hz: f64,
) -> (Vec<f64>, Option<Vec<f64>>) {
    let (c, h) = (centre_hz, half_width_hz);
    let window = hamming((3.3 * rate_hz / h).ceil() as usize | 1);
    let of = |from: f64, to: f64| band_pass(c + from * h, c + to * h, &window, rate_hz);
    let flanks = (reference == BandReference::Flanks).then(|| {
        of(-3.0, -2.0)
            .iter()
            .zip(of(2.0, 3.0))
            .map(|(low, high)| low + high)
            .collect()
    });
    let band = of(-1.0, 1.0);
    // White noise leaves both with the same power.
    let power = |taps: &[f64]| taps.iter().map(|t| t * t).sum::<f64>();
    let flanks = flanks.map(|taps: Vec<f64>| {
        let level = (power(&band) / power(&taps)).sqrt();
        taps.iter().map(|t| t * level).collect()
    });
    (band, flanks)
}

/// The filtered recording of both sides in the making, one channel a step.
#[derive(Debug)]
pub struct Banding {
    band: ZeroPhase,
    flanks: Option<ZeroPhase>,
    /// `channels × samples` in the band.
    pub signal: Vec<Vec<f32>>,
    /// `channels × samples` in the flanks; stays empty against broadband.
    pub reference: Vec<Vec<f32>>,
}

impl Banding {
    /// Plans both filters.
    ///
    /// # Errors
    /// Where they are longer than the longest unbroken part of the recording.
    pub fn new(
        prepared: &Prepared,
        centre_hz: f64,
        half_width_hz: f64,
        reference: BandReference,
    ) -> Result<Self> {
        let (band, flanks) = taps(centre_hz, half_width_hz, reference, prepared.rate_hz);
        let longest = prepared
            .stretches
            .iter()
            .map(|s| s.count)
            .max()
            .unwrap_or(0);
        if band.len() > longest {
            return Err(Problem::new(
                Kind::Contrast,
                "the filter of the band is longer than the longest unbroken part of the recording",
                "widen the band",
            )
            .at("contrast.half_width_hz")
            .expected_found(
                format!("at most {:.2} s", longest as f64 / prepared.rate_hz),
                format!("{:.2} s", band.len() as f64 / prepared.rate_hz),
            ));
        }
        Ok(Banding {
            band: ZeroPhase::new(&band, longest),
            flanks: flanks.map(|taps| ZeroPhase::new(&taps, longest)),
            signal: Vec::new(),
            reference: Vec::new(),
        })
    }

    /// Filters the next channel; false when all are done.
    pub fn step(&mut self, prepared: &Prepared) -> bool {
        let Some(channel) = prepared.samples.get(self.signal.len()) else {
            return false;
        };
        let mut filtered = Vec::new();
        let mut run = |filter: &mut ZeroPhase| {
            let mut out = Vec::with_capacity(channel.len());
            for s in &prepared.stretches {
                let samples: Vec<f64> = channel[s.first..s.first + s.count]
                    .iter()
                    .map(|x| f64::from(*x))
                    .collect();
                filter.filter(&samples, &mut filtered);
                out.extend(filtered.iter().map(|x| *x as f32));
            }
            out
        };
        let signal = run(&mut self.band);
        if let Some(flanks) = &mut self.flanks {
            let reference = run(flanks);
            self.reference.push(reference);
        }
        self.signal.push(signal);
        true
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    /// |H| of symmetric taps at a frequency.
    fn gain(taps: &[f64], hz: f64, rate_hz: f64) -> f64 {
        let centre = (taps.len() - 1) as f64 / 2.0;
        taps.iter()
            .enumerate()
            .map(|(n, t)| t * (2.0 * PI * hz / rate_hz * (n as f64 - centre)).cos())
            .sum::<f64>()
            .abs()
    }

    #[test]
    fn band_and_flanks_pass_what_they_should_and_nothing_of_each_other() {
        let (band, flanks) = taps(10.0, 2.0, BandReference::Flanks, 250.0);
        let flanks = flanks.unwrap_or_default();
        let power = |taps: &[f64]| taps.iter().map(|t| t * t).sum::<f64>();
        assert!((power(&band) / power(&flanks) - 1.0).abs() < 1e-12);
        for (hz, in_band, in_flanks) in [
            (10.0, 1.0, 0.0),
            (8.0, 0.5, 0.0),
            (12.0, 0.5, 0.0),
            (6.0, 0.0, 0.5),
            (4.0, 0.0, 0.5),
            (14.0, 0.0, 0.5),
            (16.0, 0.0, 0.5),
            (2.0, 0.0, 0.0),
            (20.0, 0.0, 0.0),
        ] {
            // The Hamming window leaves ripples of 0.0033 (−49 dB); the skirts of a band as narrow as its own transition add up.
            assert!(
                (gain(&band, hz, 250.0) - in_band).abs() < 0.02,
                "band at {hz} Hz"
            );
            assert!(
                (gain(&flanks, hz, 250.0) - in_flanks).abs() < 0.1,
                "flanks at {hz} Hz"
            );
        }
    }
}
