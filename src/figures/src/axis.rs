//! Axes: from numbers to places between 0 and 1, and ticks at round numbers.
use crate::text;

/// Ticks where a ratio axis has room for them.
const FINE_RATIOS: [f64; 27] = [
    0.05, 0.1, 0.15, 0.2, 0.25, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0, 1.2, 1.5, 2.0, 2.5, 3.0,
    4.0, 5.0, 6.0, 8.0, 10.0, 15.0, 20.0, 30.0, 50.0,
];
const COARSE_RATIOS: [f64; 16] = [
    0.0625, 0.125, 0.25, 0.5, 0.75, 1.0, 1.5, 2.0, 3.0, 4.0, 6.0, 8.0, 12.0, 16.0, 24.0, 32.0,
];

/// A range of numbers, by equal steps or by equal factors.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Axis {
    pub low: f64,
    pub high: f64,
    pub log: bool,
}

impl Axis {
    pub fn linear(low: f64, high: f64) -> Self {
        let (low, high) = if low.is_finite() && high.is_finite() {
            (low.min(high), low.max(high))
        } else {
            (0.0, 1.0)
        };
        let thin = high - low <= 1e-12 * high.abs().max(low.abs());
        let pad = if thin { 0.5 * high.abs().max(1.0) } else { 0.0 };
        Axis {
            low: low - pad,
            high: high + pad,
            log: false,
        }
    }

    /// From a larger number at the low end to a smaller one at the high end.
    pub fn falling(from: f64, to: f64) -> Self {
        let axis = Axis::linear(to, from);
        Axis {
            low: axis.high,
            high: axis.low,
            log: false,
        }
    }

    pub fn log(low: f64, high: f64) -> Self {
        let good = low.is_finite() && high.is_finite() && low > 0.0 && high > low * (1.0 + 1e-9);
        let (low, high) = if good { (low, high) } else { (0.5, 2.0) };
        Axis {
            low,
            high,
            log: true,
        }
    }

    /// 0 at the low end, 1 at the high end.
    pub fn unit(&self, value: f64) -> f64 {
        if self.log {
            (value / self.low).ln() / (self.high / self.low).ln()
        } else {
            (value - self.low) / (self.high - self.low)
        }
    }

    fn holds(&self, value: f64) -> bool {
        (-1e-9..=1.0 + 1e-9).contains(&self.unit(value))
    }

    /// At most `most` round numbers, equally spaced.
    pub fn ticks(&self, most: usize) -> Vec<f64> {
        let step = nice_step((self.high - self.low) / most.max(1) as f64);
        let first = (self.low / step - 1e-9).ceil() as i64;
        let last = (self.high / step + 1e-9).floor() as i64;
        (first..=last).map(|i| i as f64 * step).collect()
    }

    /// Ticks of ratios: powers of 4, of 2, with round numbers between, as dense as `most` allows.
    pub fn ratio_ticks(&self, most: usize) -> Vec<f64> {
        let powers = |base: f64, between: &[f64]| -> Vec<f64> {
            let exponents = -12..=12;
            let all = exponents.flat_map(|e| between.iter().map(move |b| b * base.powi(e)));
            all.filter(|v| self.holds(*v)).collect()
        };
        let listed =
            |all: &[f64]| -> Vec<f64> { all.iter().copied().filter(|v| self.holds(*v)).collect() };
        let sets = [
            listed(&FINE_RATIOS),
            listed(&COARSE_RATIOS),
            powers(2.0, &[1.0]),
            powers(4.0, &[1.0]),
        ];
        let fitting = sets.into_iter().find(|set| set.len() <= most);
        match fitting {
            Some(set) if set.len() >= 2 => set,
            _ => self.ticks(most),
        }
    }

    /// Ticks of sizes: 1, 3, 10, 30 … or whole powers of ten.
    pub fn size_ticks(&self, most: usize) -> Vec<f64> {
        let decades = |between: &[f64], every: i32| -> Vec<f64> {
            let exponents = (-15..=15).filter(|e| e % every == 0);
            let all = exponents.flat_map(|e| between.iter().map(move |b| b * 10f64.powi(e)));
            all.filter(|v| self.holds(*v)).collect()
        };
        let sets = [
            decades(&[1.0, 2.0, 5.0], 1),
            decades(&[1.0, 3.0], 1),
            decades(&[1.0], 1),
        ];
        let fitting = sets.into_iter().find(|set| set.len() <= most);
        match fitting {
            Some(set) if set.len() >= 2 => set,
            Some(_) => self.ticks(most),
            None => decades(&[1.0], 3),
        }
    }
}

/// The smallest of 1, 2, 5 × 10ⁿ that is not below `raw`.
pub(crate) fn nice_step(raw: f64) -> f64 {
    if !raw.is_finite() || raw <= 0.0 {
        return 1.0;
    }
    let decade = 10f64.powf(raw.log10().floor());
    let lead = raw / decade;
    let nice = [1.0, 2.0, 5.0]
        .into_iter()
        .find(|n| lead <= n * (1.0 + 1e-9));
    nice.unwrap_or(10.0) * decade
}

/// Smallest and largest finite number.
pub(crate) fn range<'a>(values: impl IntoIterator<Item = &'a f64>) -> Option<(f64, f64)> {
    let finite = values.into_iter().copied().filter(|v| v.is_finite());
    finite.fold(None, |seen, v| match seen {
        None => Some((v, v)),
        Some((low, high)) => Some((low.min(v), high.max(v))),
    })
}

/// Labels of equally spaced ticks, all with the same places.
pub(crate) fn labels(ticks: &[f64]) -> Vec<String> {
    let step = ticks.windows(2).map(|t| t[1] - t[0]).next().unwrap_or(1.0);
    let decimals = (-(step.abs() * (1.0 + 1e-9)).log10().floor()).clamp(0.0, 9.0) as usize;
    let halves = (step * 10f64.powi(decimals as i32)).fract().abs() > 1e-6;
    ticks
        .iter()
        .map(|t| match t.abs() < 1e-9 * step.abs() {
            true => "0".to_owned(),
            false => text::number(*t, decimals + usize::from(halves)),
        })
        .collect()
}
