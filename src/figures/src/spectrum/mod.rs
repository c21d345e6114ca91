//! How a component's power spreads over frequency in signal and in reference windows.
mod label;

use crate::axis::{self, Axis, range};
use crate::frame::{Frame, PlotBox, RIGHT};
use crate::inks::see_through;
use crate::pen::{At, Drawn, LABEL, Pen, Word};
use crate::table::Table;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::recipe::Contrast;
use teasel_core::sheet::{Component, Sheet};

const LEFT: f64 = 42.0;
const TOP: f64 = 26.0;
const FOOT: f64 = 24.0;

/// See [`crate::Figure::Spectrum`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Spectrum {
    /// Curves only, for a row of a table.
    pub small: bool,
    /// Frequencies.
    #[serde(with = "nan")]
    pub hz: Vec<f64>,
    /// Density in signal windows, dB of 1/Hz.
    #[serde(with = "nan")]
    pub signal: Vec<f64>,
    /// Lower edge of its 95 % band.
    #[serde(with = "nan")]
    pub signal_low: Vec<f64>,
    /// Upper edge of its 95 % band.
    #[serde(with = "nan")]
    pub signal_high: Vec<f64>,
    /// Density in reference windows, dB of 1/Hz.
    #[serde(with = "nan")]
    pub reference: Vec<f64>,
    /// Lower edge of its 95 % band.
    #[serde(with = "nan")]
    pub reference_low: Vec<f64>,
    /// Upper edge of its 95 % band.
    #[serde(with = "nan")]
    pub reference_high: Vec<f64>,
    /// Where the two differ most in the direction of the component's end.
    pub peak_hz: Option<f64>,
    /// What the two lines are called.
    pub names: [String; 2],
}

/// What the two spectra are of, by the kind of contrast.
fn names(contrast: &Contrast) -> [String; 2] {
    match contrast {
        Contrast::Windows { .. } | Contrast::Spans { .. } => ["signal", "reference"],
        Contrast::Band { .. } | Contrast::Slow { .. } => ["component", "average channel"],
        Contrast::Repeatable(_) => ["average of trials", "single trials"],
    }
    .map(str::to_owned)
}

impl Spectrum {
    pub(crate) fn of(sheet: &Sheet, component: &Component, small: bool) -> Option<Self> {
        let spectra = component.spectra.as_ref()?;
        let filter = &sheet.recipe.filter;
        let from = filter.high_pass_hz.unwrap_or(0.0);
        let rate = sheet
            .preparation
            .as_ref()
            .map_or(sheet.recording.rate_hz, |p| p.rate_hz);
        let to = filter.low_pass_hz.unwrap_or(f64::INFINITY).min(rate / 2.0);
        let inside = |hz: &f64| *hz > 0.0 && *hz >= from - 1e-9 && *hz <= to + 1e-9;
        let kept: Vec<usize> = (0..spectra.hz.len())
            .filter(|i| inside(&spectra.hz[*i]))
            .collect();
        let kept = if kept.len() > 2 {
            kept
        } else {
            (0..spectra.hz.len()).collect()
        };
        let pick = |v: &[f64]| -> Vec<f64> {
            let one = |i: &usize| v.get(*i).copied().unwrap_or(f64::NAN);
            kept.iter().map(one).collect()
        };
        let db = |v: &[f64]| -> Vec<f64> {
            let of = |x: f64| if x > 0.0 { 10.0 * x.log10() } else { f64::NAN };
            pick(v).into_iter().map(of).collect()
        };
        (!spectra.hz.is_empty()).then(|| Spectrum {
            small,
            hz: pick(&spectra.hz),
            signal: db(&spectra.signal),
            signal_low: db(&spectra.signal_low),
            signal_high: db(&spectra.signal_high),
            reference: db(&spectra.reference),
            reference_low: db(&spectra.reference_low),
            reference_high: db(&spectra.reference_high),
            peak_hz: component.peak_hz.filter(|hz| hz.is_finite()),
            names: names(&sheet.recipe.contrast),
        })
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let (low, high) = range(&self.hz).unwrap_or((0.0, 1.0));
        let bands = self.signal_low.iter().chain(&self.signal_high);
        let bands = bands.chain(&self.reference_low).chain(&self.reference_high);
        let lines = self.signal.iter().chain(&self.reference);
        let all: Vec<f64> = if self.small {
            lines.copied().collect()
        } else {
            lines.chain(bands).copied().collect()
        };
        let (bottom, top) = range(&all).unwrap_or((-1.0, 1.0));
        let room = 0.05 * (top - bottom).max(1.0);
        let y = Axis::linear(bottom - room, top + room);
        if self.small {
            let (left, right, bottom) = (1.0, width - 1.0, height - 4.0);
            return Frame {
                left,
                right,
                top: 1.0,
                bottom,
                x: Axis::linear(low, high),
                y,
            };
        }
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - FOOT).max(TOP + 10.0),
            x: Axis::linear(low, high),
            y,
        }
    }

    /// The bin nearest to the peak and the difference there.
    fn peak(&self) -> Option<(f64, usize, f64)> {
        let hz = self.peak_hz?;
        let gap = |i: &usize| (self.hz[*i] - hz).abs();
        let i = (0..self.hz.len()).min_by(|a, b| gap(a).total_cmp(&gap(b)))?;
        let difference = self.signal.get(i)? - self.reference.get(i)?;
        difference.is_finite().then_some((hz, i, difference))
    }

    fn curves<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame, wide: f64) -> Drawn<DB> {
        let inks = pen.inks;
        let signal = frame.points(&self.hz, &self.signal);
        let reference = frame.points(&self.hz, &self.reference);
        pen.dashes(
            &reference,
            inks.reference,
            wide,
            if self.small { (4.0, 2.0) } else { (6.0, 3.0) },
        )?;
        pen.path(&signal, inks.signal, wide)
    }

    fn full<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let inks = pen.inks;
        let ticks = frame
            .y
            .ticks(((frame.bottom - frame.top) / 28.0).max(2.0) as usize);
        frame.y_grid(pen, &ticks, &axis::labels(&ticks))?;
        let edge = |v: &[f64]| frame.points(&self.hz, v);
        pen.band(
            &edge(&self.reference_low),
            &edge(&self.reference_high),
            see_through(inks.reference, 0.16),
        )?;
        pen.band(
            &edge(&self.signal_low),
            &edge(&self.signal_high),
            see_through(inks.signal, 0.16),
        )?;
        self.curves(pen, frame, 2.0)?;
        let mut taken = Vec::new();
        if let Some((hz, i, difference)) = self.peak() {
            let x = frame.px(self.hz[i]);
            let top = self.signal[i].max(self.reference[i]);
            let high = [self.signal_high.get(i), self.reference_high.get(i)];
            let top = high
                .into_iter()
                .flatten()
                .copied()
                .filter(|v| v.is_finite())
                .fold(top, f64::max);
            let y = (frame.py_inside(top) - 2.0).max(12.0);
            pen.down(x, 2.0, y, inks.line, 1.0)?;
            let said = format!("{} Hz: {}", text::hertz(hz), text::decibels(difference));
            let wide = text::bold_width(&said, LABEL);
            let right = x + 6.0 + wide < pen.w;
            let (at, side) = if right {
                (x + 6.0, At::Left)
            } else {
                (x - 6.0, At::Right)
            };
            pen.word(&said, (at, 8.0), Word::new(LABEL, inks.ink).bold().at(side))?;
        }
        let word = |ink| Word::new(LABEL, ink).bold();
        self.name(
            pen,
            frame,
            &self.names[0],
            &self.signal,
            &mut taken,
            word(inks.signal),
        )?;
        self.name(
            pen,
            frame,
            &self.names[1],
            &self.reference,
            &mut taken,
            word(inks.reference),
        )?;
        let ticks = frame
            .x
            .ticks(((frame.right - frame.left) / 56.0).max(2.0) as usize);
        frame.x_axis(pen, &ticks, &axis::labels(&ticks), "Hz")
    }
}

impl Plot for Spectrum {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        if !self.small {
            return self.full(pen, &frame);
        }
        pen.across(
            frame.left,
            frame.right,
            frame.bottom + 1.0,
            pen.inks.line,
            1.0,
        )?;
        for tick in frame.x.ticks(4) {
            pen.down(
                frame.px(tick),
                frame.bottom - 1.0,
                frame.bottom + 1.0,
                pen.inks.line,
                1.0,
            )?;
        }
        self.curves(pen, &frame, 1.5)
    }

    fn height(&self, _width: u32) -> u32 {
        if self.small { 40 } else { 278 }
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let columns = [
            "frequency_Hz",
            "signal_dB",
            "signal_low_95_dB",
            "signal_high_95_dB",
            "reference_dB",
            "reference_low_95_dB",
            "reference_high_95_dB",
        ];
        let values: [&[f64]; 7] = [
            &self.hz,
            &self.signal,
            &self.signal_low,
            &self.signal_high,
            &self.reference,
            &self.reference_low,
            &self.reference_high,
        ];
        Table::of(&columns, &values)
    }

    fn spoken(&self) -> String {
        let peak = self.peak().map_or(String::new(), |(hz, _, difference)| {
            format!(
                " They differ most at {} Hz, by {}.",
                text::hertz(hz),
                text::decibels(difference)
            )
        });
        let of = if self.names[0] == "signal" {
            "Spectra of the component in signal and in reference windows.".to_owned()
        } else {
            format!("Two spectra: {} and {}.", self.names[0], self.names[1])
        };
        format!("{of}{peak}")
    }
}
