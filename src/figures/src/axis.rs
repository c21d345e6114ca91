//! Axes: from numbers to pixels, ticks at round numbers, grid lines and their labels.
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::text;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};

/// Left edge of the plot in every figure of the sheet's width.
pub(crate) const LEFT: f64 = 66.0;
/// Room right of the plot.
pub(crate) const RIGHT: f64 = 16.0;

/// Where a plot lies in its figure, and what its edges stand for.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct PlotBox {
    /// Left edge in CSS pixels.
    pub left: f64,
    /// Right edge in CSS pixels.
    pub right: f64,
    /// Upper edge in CSS pixels.
    pub top: f64,
    /// Lower edge in CSS pixels.
    pub bottom: f64,
    /// Data value at the left edge.
    pub x0: f64,
    /// Data value at the right edge.
    pub x1: f64,
    /// Data value at the lower edge.
    pub y0: f64,
    /// Data value at the upper edge.
    pub y1: f64,
    /// Whether y runs by equal factors.
    pub y_log: bool,
}

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

/// A plot's rectangle with its two axes.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Frame {
    pub left: f64,
    pub right: f64,
    pub top: f64,
    pub bottom: f64,
    pub x: Axis,
    pub y: Axis,
}

impl Frame {
    pub fn px(&self, x: f64) -> f64 {
        self.left + self.x.unit(x) * (self.right - self.left)
    }
    pub fn py(&self, y: f64) -> f64 {
        self.bottom - self.y.unit(y) * (self.bottom - self.top)
    }
    /// Height of a value, kept inside the plot.
    pub fn py_inside(&self, y: f64) -> f64 {
        if !y.is_finite() {
            return f64::NAN;
        }
        self.py(y).max(self.top).min(self.bottom)
    }
    /// Place of a value, kept inside the plot.
    pub fn px_inside(&self, x: f64) -> f64 {
        if !x.is_finite() {
            return f64::NAN;
        }
        self.px(x).min(self.right).max(self.left)
    }
    pub fn points(&self, x: &[f64], y: &[f64]) -> Vec<(f64, f64)> {
        let pairs = x.iter().zip(y);
        pairs
            .map(|(x, y)| (self.px(*x), self.py_inside(*y)))
            .collect()
    }
    pub fn plot_box(&self) -> PlotBox {
        PlotBox {
            left: self.left,
            right: self.right,
            top: self.top,
            bottom: self.bottom,
            x0: self.x.low,
            x1: self.x.high,
            y0: self.y.low,
            y1: self.y.high,
            y_log: self.y.log,
        }
    }

    /// Grid lines with their labels left of the plot.
    pub fn y_grid<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        ticks: &[f64],
        labels: &[String],
    ) -> Drawn<DB> {
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        for (tick, label) in ticks.iter().zip(labels) {
            let y = self.py(*tick);
            pen.across(self.left, self.right, y, pen.inks.rule, 1.0)?;
            pen.word(label, (self.left - 9.0, y), word)?;
        }
        Ok(())
    }

    /// The x axis below the plot: a line, ticks and labels, the last of them with its unit.
    pub fn x_axis<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        ticks: &[f64],
        labels: &[String],
        unit: &str,
    ) -> Drawn<DB> {
        self.x_axis_but(pen, ticks, labels, unit, &[])
    }

    /// The same without the labels that stand within 24 pixels of one of `taken`.
    pub fn x_axis_but<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        ticks: &[f64],
        labels: &[String],
        unit: &str,
        taken: &[f64],
    ) -> Drawn<DB> {
        pen.across(self.left, self.right, self.bottom, pen.inks.line, 1.0)?;
        for tick in ticks {
            let x = self.px(*tick);
            pen.down(x, self.bottom, self.bottom + 4.0, pen.inks.line, 1.0)?;
        }
        self.x_labels_but(pen, ticks, labels, unit, taken)
    }

    /// Only the labels of the x axis.
    pub fn x_labels<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        ticks: &[f64],
        labels: &[String],
        unit: &str,
    ) -> Drawn<DB> {
        self.x_labels_but(pen, ticks, labels, unit, &[])
    }

    fn x_labels_but<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        ticks: &[f64],
        labels: &[String],
        unit: &str,
        taken: &[f64],
    ) -> Drawn<DB> {
        let free = |x: f64| taken.iter().all(|t| (t - x).abs() > 26.0);
        let last = (0..ticks.len()).rev().find(|i| free(self.px(ticks[*i])));
        let mut used = f64::NEG_INFINITY;
        let word = Word::new(TICK, pen.inks.slate).at(At::Middle);
        for (i, (tick, label)) in ticks.iter().zip(labels).enumerate() {
            let x = self.px(*tick);
            let said = if Some(i) == last && !unit.is_empty() {
                format!("{label} {unit}")
            } else {
                label.clone()
            };
            let half = text::width(&said, TICK) / 2.0;
            let middle = x.min(pen.w - half);
            if free(x) && middle - half > used + 4.0 {
                pen.word(&said, (middle, self.bottom + 14.0), word)?;
                used = middle + half;
            }
        }
        Ok(())
    }
}
