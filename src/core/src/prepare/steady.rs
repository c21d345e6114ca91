//! What is taken off an unbroken stretch before the filters: its trend, and mains by fitted sinusoids.
//!
//! * Trend: the mean, the least-squares line, or a line in each piece on its own (pieces do not meet at their ends).
//! * Mains: in windows of L samples that overlap by half, a constant and cos 2πkht, sin 2πkht for k = 1 … harmonics are fitted by
//!   least squares; the sinusoids of all windows are blended with weights sin²(π(i + ½)/L), divided by their sum, and
//!   subtracted. Longer windows follow a slower change of mains and take less of what lies beside it: about 1/L Hz.
//!
//! Both are linear in the samples and the same for every channel, so they leave spatial filters as they are.
use crate::recipe::{Detrend, DetrendWord, Mains};
use nalgebra::DMatrix;
use std::f64::consts::PI;

/// Takes the trend off one stretch.
pub fn detrend(samples: &mut [f64], how: Detrend, rate_hz: f64) {
    match how {
        Detrend::Word(DetrendWord::Mean) => {
            let mean = samples.iter().sum::<f64>() / samples.len().max(1) as f64;
            samples.iter_mut().for_each(|x| *x -= mean);
        }
        Detrend::Word(DetrendWord::Linear) => take_line(samples),
        Detrend::Pieces(pieces) => {
            let piece = ((pieces.linear_every_s * rate_hz).round() as usize).max(2);
            let whole = (samples.len() / piece).max(1);
            let (even, last) = samples.split_at_mut((whole - 1) * piece);
            even.chunks_mut(piece).for_each(take_line);
            take_line(last);
        }
    }
}

/// Least squares on 1 and the centred index.
fn take_line(samples: &mut [f64]) {
    let n = samples.len() as f64;
    if samples.is_empty() {
        return;
    }
    let middle = (n - 1.0) / 2.0;
    let mean = samples.iter().sum::<f64>() / n;
    let (mut along, mut square) = (0.0, 0.0);
    for (i, x) in samples.iter().enumerate() {
        let t = i as f64 - middle;
        along += t * x;
        square += t * t;
    }
    let slope = if square > 0.0 { along / square } else { 0.0 };
    for (i, x) in samples.iter_mut().enumerate() {
        *x -= mean + slope * (i as f64 - middle);
    }
}

/// Frequencies that a removal of mains takes: multiples below half the rate, at least a window's width from it.
pub fn harmonics(mains: &Mains, rate_hz: f64) -> Vec<f64> {
    let highest = rate_hz / 2.0 - 1.0 / mains.window_s;
    (1..=mains.harmonics)
        .map(|k| k as f64 * mains.hz)
        .filter(|hz| *hz < highest)
        .collect()
}

/// A planned fit of mains.
#[derive(Debug)]
pub struct MainsFit {
    hz: Vec<f64>,
    rate_hz: f64,
    plan: Plan,
    fitted: Vec<f64>,
    weight: Vec<f64>,
}

/// The fit of one window length: from samples to coefficients, and back to sinusoids.
#[derive(Debug)]
struct Plan {
    length: usize,
    /// `2·harmonics × length`.
    coefficients: DMatrix<f64>,
    /// `length × 2·harmonics`.
    sinusoids: DMatrix<f64>,
}

impl Plan {
    /// `None` where the window holds fewer than two periods of the lowest frequency, or fewer samples than are fitted.
    fn new(hz: &[f64], rate_hz: f64, length: usize) -> Option<Self> {
        let count = 1 + 2 * hz.len();
        let periods = hz.first()? * length as f64 / rate_hz;
        if periods < 2.0 || length <= count {
            return None;
        }
        let design = DMatrix::from_fn(length, count, |i, j| match j {
            0 => 1.0,
            j => {
                let phase = 2.0 * PI * hz[(j - 1) / 2] * i as f64 / rate_hz;
                if j % 2 == 1 { phase.cos() } else { phase.sin() }
            }
        });
        let solved = (design.transpose() * &design)
            .cholesky()?
            .solve(&design.transpose());
        Some(Plan {
            length,
            coefficients: solved.rows(1, count - 1).into_owned(),
            sinusoids: design.columns(1, count - 1).into_owned(),
        })
    }
    fn add(&self, samples: &[f64], fitted: &mut [f64], weight: &mut [f64]) {
        let terms = self.coefficients.nrows();
        let mut found = vec![0.0; terms];
        for (i, x) in samples.iter().enumerate() {
            for (sum, c) in found.iter_mut().zip(self.coefficients.column(i).iter()) {
                *sum += c * x;
            }
        }
        for i in 0..self.length {
            let w = (PI * (i as f64 + 0.5) / self.length as f64).sin().powi(2);
            let value: f64 = (0..terms).map(|j| found[j] * self.sinusoids[(i, j)]).sum();
            fitted[i] += w * value;
            weight[i] += w;
        }
    }
}

impl MainsFit {
    /// Plans for one sampling rate; `None` where no multiple lies below half of it.
    pub fn new(mains: &Mains, rate_hz: f64) -> Option<Self> {
        let hz = harmonics(mains, rate_hz);
        let length = (mains.window_s * rate_hz).round() as usize;
        let plan = Plan::new(&hz, rate_hz, length)?;
        Some(MainsFit {
            hz,
            rate_hz,
            plan,
            fitted: Vec::new(),
            weight: Vec::new(),
        })
    }
    /// Subtracts the fitted sinusoids from one stretch. A stretch shorter than a window is one window; one shorter than two periods is
    /// left as it is.
    pub fn remove(&mut self, samples: &mut [f64]) {
        let n = samples.len();
        let own;
        let plan = if n < self.plan.length {
            own = Plan::new(&self.hz, self.rate_hz, n);
            match &own {
                Some(plan) => plan,
                None => return,
            }
        } else {
            &self.plan
        };
        let (length, hop) = (plan.length, (plan.length / 2).max(1));
        self.fitted.clear();
        self.fitted.resize(n, 0.0);
        self.weight.clear();
        self.weight.resize(n, 0.0);
        let last = n - length;
        let mut starts: Vec<usize> = (0..=last).step_by(hop).collect();
        if starts.last() != Some(&last) {
            starts.push(last);
        }
        for start in starts {
            let range = start..start + length;
            plan.add(
                &samples[range.clone()],
                &mut self.fitted[range.clone()],
                &mut self.weight[range],
            );
        }
        for ((x, fitted), weight) in samples.iter_mut().zip(&self.fitted).zip(&self.weight) {
            *x -= fitted / weight;
        }
    }
}
