//! A plot's rectangle with its axes: grid lines, ticks and their labels.
use crate::axis::Axis;
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
