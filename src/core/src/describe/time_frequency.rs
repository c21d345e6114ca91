//! Power of a component over time and frequency around an event, and how alike its phase is over trials.
//!
//! # Wavelets
//! Complex Morlet: ψ(t) = A exp(−t²/2σ²) exp(i2πft), σ = c/(2πf) with c = 6 cycles, cut at ±4σ, A such that a sine of amplitude 1 at f
//! gives modulus 1 (Tallon-Baudry et al. 1996, *J. Neurosci.* 16:4240–4249, eq. 1, with another A). At frequency f it sees about ±σ
//! around a time and ±f/c around a frequency: neighbouring cells are not independent. Evaluated by direct sums at the times shown; a
//! place where the wavelet would leave its stretch has no value.
//!
//! # Power
//! Mean power over trials at a time, in dB of the mean power at the same frequency in the reference windows.
//!
//! # Phase consistency
//! |mean over trials of the unit phasor| (Tallon-Baudry et al. 1996): 1 where every trial has the same phase, near √(π/4n) for n trials
//! without any. Under random phases it exceeds √(−ln 0.05 / n) in about 5 of 100 cells (Rayleigh's test, Fisher 1993, *Statistical
//! Analysis of Circular Data*, section 4.3).
use crate::recording::Stretch;
use crate::sheet::TimeFrequency;
use std::f64::consts::PI;

/// Cycles of a wavelet within ±σ·2π: σ = c/(2πf).
pub const CYCLES: f64 = 6.0;
/// Wavelets are cut at this many σ.
const CUT: f64 = 4.0;
/// Frequencies of a picture.
const FREQUENCIES: usize = 28;
/// Most times of a picture.
const TIMES: usize = 90;
/// Places in each reference window.
const REFERENCE_TIMES: usize = 12;

/// Frequencies by equal factors from `low` to `high`; empty where there is no room between them.
pub fn frequencies(low: f64, high: f64) -> Vec<f64> {
    if !(low > 0.0 && high > 1.2 * low) {
        return Vec::new();
    }
    let step = (high / low).ln() / (FREQUENCIES - 1) as f64;
    (0..FREQUENCIES)
        .map(|k| low * (step * k as f64).exp())
        .collect()
}

/// One frequency's wavelet.
#[derive(Debug, Clone)]
pub struct Wavelet {
    /// Real and imaginary part from −half to half.
    taps: Vec<[f64; 2]>,
}

impl Wavelet {
    /// Plans a frequency.
    pub fn new(hz: f64, rate_hz: f64) -> Self {
        let sigma = CYCLES / (2.0 * PI * hz);
        let half = (CUT * sigma * rate_hz).round().max(1.0) as i64;
        let envelope = |k: i64| (-0.5 * (k as f64 / rate_hz / sigma).powi(2)).exp();
        let sum: f64 = (-half..=half).map(envelope).sum();
        let taps = (-half..=half)
            .map(|k| {
                let phase = 2.0 * PI * hz * k as f64 / rate_hz;
                let size = 2.0 / sum * envelope(k);
                [size * phase.cos(), size * phase.sin()]
            })
            .collect();
        Wavelet { taps }
    }
    /// Samples of the wavelet.
    pub fn len(&self) -> usize {
        self.taps.len()
    }
    /// Whether it holds nothing; it never does.
    pub fn is_empty(&self) -> bool {
        self.taps.is_empty()
    }
    /// The convolution at sample `centre` of a stretch; `None` where the wavelet would leave it.
    pub fn at(&self, stretch: &[f64], centre: usize) -> Option<[f64; 2]> {
        let half = self.taps.len() / 2;
        let part = stretch.get(centre.checked_sub(half)?..=centre + half)?;
        // Convolution turns the wavelet round: the imaginary part changes sign, the real one is even.
        let [mut real, mut imaginary] = [0.0; 2];
        for (x, [c, s]) in part.iter().zip(&self.taps) {
            real += x * c;
            imaginary -= x * s;
        }
        Some([real, imaginary])
    }
}

/// A picture that grows trial by trial.
#[derive(Debug, Clone)]
pub struct Picture {
    hz: Vec<f64>,
    wavelets: Vec<Wavelet>,
    /// Offsets of the times from the onset, in samples.
    offsets: Vec<isize>,
    rate_hz: f64,
    /// `frequencies × times`: power, real and imaginary part of the phasors, trials.
    cells: Vec<[f64; 4]>,
    /// Power in reference windows and places counted, a frequency.
    reference: Vec<[f64; 2]>,
    trials: usize,
}

impl Picture {
    /// Plans the span [`from_s`, `to_s`) around the event at these frequencies.
    pub fn new(hz: Vec<f64>, from_s: f64, to_s: f64, rate_hz: f64) -> Self {
        let first = (from_s * rate_hz).round() as isize;
        let samples = ((to_s - from_s) * rate_hz).round().max(1.0) as usize;
        let step = samples.div_ceil(TIMES).max(1);
        let offsets: Vec<isize> = (0..samples / step)
            .map(|k| first + (k * step + step / 2) as isize)
            .collect();
        Picture {
            wavelets: hz.iter().map(|f| Wavelet::new(*f, rate_hz)).collect(),
            cells: vec![[0.0; 4]; hz.len() * offsets.len()],
            reference: vec![[0.0; 2]; hz.len()],
            hz,
            offsets,
            rate_hz,
            trials: 0,
        }
    }

    /// Operations of one trial, roughly.
    pub fn cost(&self) -> f64 {
        let taps: usize = self.wavelets.iter().map(Wavelet::len).sum();
        4.0 * (taps * (self.offsets.len() + REFERENCE_TIMES)) as f64
    }

    /// Adds a trial: the sample of its onset in the series.
    pub fn add_trial(&mut self, series: &[f64], stretches: &[Stretch], onset: usize) {
        let Some((stretch, at)) = stretch_of(series, stretches, onset) else {
            return;
        };
        let times = self.offsets.len();
        for (f, wavelet) in self.wavelets.iter().enumerate() {
            for (k, offset) in self.offsets.iter().enumerate() {
                let found = at
                    .checked_add_signed(*offset)
                    .and_then(|centre| wavelet.at(stretch, centre));
                let Some([re, im]) = found else { continue };
                let power = re * re + im * im;
                let size = power.sqrt();
                let cell = &mut self.cells[f * times + k];
                cell[0] += power;
                if size > 0.0 {
                    cell[1] += re / size;
                    cell[2] += im / size;
                }
                cell[3] += 1.0;
            }
        }
        self.trials += 1;
    }

    /// Adds a reference window: its first sample and its length.
    pub fn add_reference(
        &mut self,
        series: &[f64],
        stretches: &[Stretch],
        (first, count): (usize, usize),
    ) {
        let Some((stretch, at)) = stretch_of(series, stretches, first) else {
            return;
        };
        let places = REFERENCE_TIMES.min(count.max(1));
        for (wavelet, sum) in self.wavelets.iter().zip(&mut self.reference) {
            for k in 0..places {
                let centre = at + (2 * k + 1) * count / (2 * places);
                if let Some([re, im]) = wavelet.at(stretch, centre) {
                    sum[0] += re * re + im * im;
                    sum[1] += 1.0;
                }
            }
        }
    }

    /// The picture so far; `None` without a trial.
    pub fn finish(&self) -> Option<TimeFrequency> {
        if self.trials == 0 || self.hz.is_empty() {
            return None;
        }
        let times = self.offsets.len();
        let cells = |value: &dyn Fn(usize, &[f64; 4]) -> Option<f32>| -> Vec<Vec<Option<f32>>> {
            (0..self.hz.len())
                .map(|f| {
                    let row = &self.cells[f * times..(f + 1) * times];
                    row.iter().map(|cell| value(f, cell)).collect()
                })
                .collect()
        };
        // Cells that few trials reach would be louder than the rest by chance.
        let enough = 0.5 * self.trials as f64;
        let db = cells(&|f, cell| {
            let [sum, count] = self.reference[f];
            let reference = sum / count;
            let seen = cell[3] >= enough && count > 0.0 && reference > 0.0 && cell[0] > 0.0;
            seen.then(|| (10.0 * (cell[0] / cell[3] / reference).log10()) as f32)
        });
        let consistency = cells(&|_, cell| {
            (cell[3] >= enough).then(|| (cell[1].hypot(cell[2]) / cell[3]) as f32)
        });
        Some(TimeFrequency {
            hz: self.hz.clone(),
            t_s: self
                .offsets
                .iter()
                .map(|k| *k as f64 / self.rate_hz)
                .collect(),
            db,
            consistency,
            cycles: CYCLES,
            trials: self.trials,
        })
    }
}

fn stretch_of<'a>(
    series: &'a [f64],
    stretches: &[Stretch],
    sample: usize,
) -> Option<(&'a [f64], usize)> {
    let stretch = stretches
        .iter()
        .find(|s| (s.first..s.first + s.count).contains(&sample))?;
    let part = series.get(stretch.first..stretch.first + stretch.count)?;
    Some((part, sample - stretch.first))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "tests")]
    use super::*;

    #[test]
    fn a_sine_of_amplitude_one_has_modulus_one_and_its_own_phase() {
        let rate = 250.0;
        let sine: Vec<f64> = (0..1000)
            .map(|t| (2.0 * PI * 10.0 * t as f64 / rate + 0.4).cos())
            .collect();
        let [re, im] = Wavelet::new(10.0, rate).at(&sine, 500).unwrap();
        // The counter-rotating half of a real sine leaks e^(−2c²): nothing at six cycles; cutting at 4σ costs 6e-5.
        assert!((re.hypot(im) - 1.0).abs() < 1e-3);
        let phase = 2.0 * PI * 10.0 * 500.0 / rate + 0.4;
        let turned = (im.atan2(re) - phase).rem_euclid(2.0 * PI);
        assert!(turned.min(2.0 * PI - turned) < 1e-3, "{turned}");
        assert_eq!(Wavelet::new(10.0, rate).at(&sine, 3), None);
    }

    #[test]
    fn trials_in_step_are_consistent_and_trials_out_of_step_are_not() {
        let rate = 200.0;
        let whole = [Stretch {
            first: 0,
            count: 8000,
            onset_s: 0.0,
        }];
        let onsets: Vec<usize> = (0..16).map(|k| 400 + 450 * k).collect();
        let series = |turn: f64| -> Vec<f64> {
            (0..8000)
                .map(|t| {
                    let trial = onsets.iter().rposition(|o| t + 200 >= *o).unwrap_or(0);
                    let since = t as f64 - onsets[trial] as f64;
                    (2.0 * PI * 12.0 * since / rate + turn * trial as f64).cos()
                })
                .collect()
        };
        let look = |turn: f64| {
            let values = series(turn);
            let mut picture = Picture::new(frequencies(8.0, 20.0), -0.2, 0.5, rate);
            for onset in &onsets {
                picture.add_trial(&values, &whole, *onset);
                picture.add_reference(&values, &whole, (onset - 60, 40));
            }
            picture.finish().unwrap()
        };
        // Sixteen phases spread evenly over the circle cancel out.
        let [together, apart] = [look(0.0), look(2.0 * PI / 16.0)];
        let f = together.hz.iter().position(|f| *f > 12.0).unwrap();
        let at = together.t_s.len() / 2;
        assert!(together.consistency[f][at].unwrap() > 0.999);
        assert!(apart.consistency[f][at].unwrap() < 0.02);
        assert!(together.db[f][at].unwrap().abs() < 0.5);
        assert_eq!(together.trials, 16);
    }
}
