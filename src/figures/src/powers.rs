//! Power of a component in every window of both sides, one dot a window.
use crate::axis::{self, Axis, range};
use crate::frame::{Frame, LEFT, PlotBox, RIGHT};
use crate::inks::see_through;
use crate::pen::{At, Drawn, LABEL, Pen, Word};
use crate::table::{Table, cell};
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Component;

const TOP: f64 = 8.0;
const FOOT: f64 = 26.0;
const ROW: f64 = 62.0;

/// See [`crate::Figure::Powers`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Powers {
    /// Of each signal window, in dB of the reference windows' mean, in order of time.
    #[serde(with = "nan")]
    pub signal: Vec<f64>,
    /// Of each reference window.
    #[serde(with = "nan")]
    pub reference: Vec<f64>,
    /// Onsets of the signal windows' events.
    #[serde(with = "nan")]
    pub signal_onsets_s: Vec<f64>,
    /// Onsets of the reference windows' events.
    #[serde(with = "nan")]
    pub reference_onsets_s: Vec<f64>,
}

impl Powers {
    pub(crate) fn of(component: &Component) -> Option<Self> {
        let side = |signal: bool| -> (Vec<f64>, Vec<f64>) {
            let windows = component.powers.iter();
            let own = windows.filter(|w| w.signal == signal && w.power > 0.0);
            own.map(|w| (10.0 * w.power.log10(), w.onset_s)).unzip()
        };
        let ((signal, signal_onsets_s), (reference, reference_onsets_s)) =
            (side(true), side(false));
        (!signal.is_empty() && !reference.is_empty()).then_some(Powers {
            signal,
            reference,
            signal_onsets_s,
            reference_onsets_s,
        })
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let (low, high) = range(self.signal.iter().chain(&self.reference)).unwrap_or((-1.0, 1.0));
        let room = 0.04 * (high - low).max(1.0);
        Frame {
            left: LEFT + 12.0,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - FOOT).max(TOP + 20.0),
            x: Axis::linear(low.min(0.0) - room, high.max(0.0) + room),
            y: Axis::linear(0.0, 2.0),
        }
    }
}

/// Lower quartile, median, upper quartile (definition 7 of Hyndman & Fan 1996).
fn quartiles(values: &[f64]) -> [f64; 3] {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    [0.25, 0.5, 0.75].map(|share| {
        let place = share * (sorted.len() - 1) as f64;
        let below = place.floor() as usize;
        let above = (below + 1).min(sorted.len() - 1);
        sorted[below] + (place - below as f64) * (sorted[above] - sorted[below])
    })
}

impl Plot for Powers {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        let most = ((frame.right - frame.left) / 76.0).max(2.0) as usize;
        let ticks = frame.x.ticks(most);
        for tick in &ticks {
            let ink = if *tick == 0.0 { inks.line } else { inks.rule };
            pen.down(frame.px(*tick), frame.top, frame.bottom, ink, 1.0)?;
        }
        frame.x_axis(pen, &ticks, &axis::labels(&ticks), "dB")?;
        let high = (frame.bottom - frame.top) / 2.0;
        let sides = [
            ("signal", &self.signal, inks.signal),
            ("reference", &self.reference, inks.reference),
        ];
        for (row, (name, values, ink)) in sides.into_iter().enumerate() {
            let middle = frame.top + high * (row as f64 + 0.5);
            let word = Word::new(LABEL, ink).at(At::Right);
            pen.word(name, (frame.left - 9.0, middle), word)?;
            let size = if values.len() > 150 { 1.8 } else { 2.6 };
            for (k, value) in values.iter().enumerate() {
                // Dots side by side by an even sequence (multiples of the golden section), so that the same data look the same.
                let spread = ((k as f64 * 0.618_033_988_749_895).fract() - 0.5) * high * 0.5;
                let at = (frame.px(*value), middle + spread);
                pen.dot(at, size, see_through(ink, 0.55))?;
            }
            let [low, median, up] = quartiles(values).map(|v| frame.px(v));
            pen.across(low, up, middle, inks.ink, 1.5)?;
            pen.down(
                median,
                middle - high * 0.36,
                middle + high * 0.36,
                inks.ink,
                2.0,
            )?;
        }
        Ok(())
    }

    fn height(&self, _width: u32) -> u32 {
        (TOP + 2.0 * ROW + FOOT) as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&["side", "onset_s", "power_dB"]);
        let sides = [
            ("signal", &self.signal, &self.signal_onsets_s),
            ("reference", &self.reference, &self.reference_onsets_s),
        ];
        for (name, values, onsets) in sides {
            for (value, onset) in values.iter().zip(onsets) {
                table.row([name.to_owned(), cell(*onset), cell(*value)]);
            }
        }
        table
    }

    fn spoken(&self) -> String {
        let [low, median, high] = quartiles(&self.signal);
        let [_, other, _] = quartiles(&self.reference);
        let above = self.signal.iter().filter(|v| **v > other).count();
        format!(
            "Power in every window: in signal the median is {} (middle half {} to {}), in reference {}; {} of {} signal windows lie above the reference median.",
            text::decibels(median),
            text::decibels(low),
            text::decibels(high),
            text::decibels(other),
            above,
            self.signal.len()
        )
    }
}
