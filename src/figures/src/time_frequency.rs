//! Power over time and frequency, and phase consistency, as an image.
use crate::axis::{self, Axis};
use crate::frame::{Frame, PlotBox, RIGHT};
use crate::inks::{Inks, step};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::Table;
use crate::{Plot, text};
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::{Component, Sheet};

const LEFT: f64 = 42.0;
const TOP: f64 = 8.0;
const FOOT: f64 = 62.0;
const KEY: f64 = 158.0;

/// What the image shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum What {
    /// Mean power in dB of the reference windows.
    Power,
    /// Phase consistency over trials, 0 to 1.
    Consistency,
}

/// See [`crate::Figure::TimeFrequency`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TimeFrequency {
    /// What it shows.
    pub what: What,
    /// Frequencies by equal factors.
    pub hz: Vec<f64>,
    /// Times.
    pub t_s: Vec<f64>,
    /// `frequencies × times`; `None` where too few trials reach.
    pub values: Vec<Vec<Option<f32>>>,
    /// The colours run to this (power: from minus this).
    pub limit: f64,
    /// Reference and signal window, where both are tied to this event.
    pub windows: Option<[[f64; 2]; 2]>,
    /// Cycles of the wavelets.
    pub cycles: f64,
    /// Trials.
    pub trials: usize,
}

impl TimeFrequency {
    pub(crate) fn of(sheet: &Sheet, component: &Component, what: What) -> Option<Self> {
        let picture = component.time_frequency.as_ref()?;
        if picture.hz.len() < 2 || picture.t_s.len() < 2 {
            return None;
        }
        let values = match what {
            What::Power => &picture.db,
            What::Consistency => &picture.consistency,
        };
        let mut sizes: Vec<f32> = values.iter().flatten().flatten().map(|v| v.abs()).collect();
        sizes.sort_by(f32::total_cmp);
        let high = f64::from(*sizes.get(sizes.len() * 98 / 100)?);
        let limit = match what {
            What::Power => (axis::nice_step(high / 2.0) * 2.0).max(0.5),
            What::Consistency => (axis::nice_step(high / 2.0) * 2.0).clamp(0.1, 1.0),
        };
        let windows = sheet.recipe.contrast.event_windows();
        Some(TimeFrequency {
            what,
            hz: picture.hz.clone(),
            t_s: picture.t_s.clone(),
            values: values.clone(),
            limit,
            windows: windows
                .filter(|(s, r)| s.event == r.event)
                .map(|(s, r)| [[r.from_s, r.to_s], [s.from_s, s.to_s]]),
            cycles: picture.cycles,
            trials: picture.trials,
        })
    }

    /// Consistency that random phases exceed in about 5 of 100 cells (Fisher 1993, section 4.3).
    fn chance(&self) -> f64 {
        (-(0.05_f64).ln() / self.trials.max(1) as f64).sqrt()
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let half = (self.t_s[1] - self.t_s[0]) / 2.0;
        let factor = (self.hz[1] / self.hz[0]).sqrt();
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - FOOT).max(TOP + 10.0),
            x: Axis::linear(self.t_s[0] - half, self.t_s[self.t_s.len() - 1] + half),
            y: Axis::log(self.hz[0] / factor, self.hz[self.hz.len() - 1] * factor),
        }
    }

    /// Colours from the least to the most.
    fn ramp(&self, inks: &Inks) -> Vec<RGBAColor> {
        match self.what {
            What::Power => inks.image.to_vec(),
            // No side, so no hue: from the middle to the darkest slate.
            What::Consistency => inks.stronger[..6].iter().rev().copied().collect(),
        }
    }

    fn color(&self, value: f32, ramp: &[RGBAColor]) -> RGBAColor {
        let value = f64::from(value);
        match self.what {
            What::Power => ramp[step(value, self.limit)],
            What::Consistency => {
                let share = (value / self.limit).clamp(0.0, 1.0);
                ramp[((share * ramp.len() as f64) as usize).min(ramp.len() - 1)]
            }
        }
    }

    fn image<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let ramp = self.ramp(&pen.inks);
        let half = (self.t_s[1] - self.t_s[0]) / 2.0;
        let factor = (self.hz[1] / self.hz[0]).sqrt();
        for (hz, row) in self.hz.iter().zip(&self.values) {
            let (top, bottom) = (frame.py(hz * factor), frame.py(hz / factor));
            let mut from = 0;
            while from < row.len() {
                let color = row[from].map(|v| self.color(v, &ramp));
                let mut to = from + 1;
                while to < row.len() && row[to].map(|v| self.color(v, &ramp)) == color {
                    to += 1;
                }
                let x = [self.t_s[from] - half, self.t_s[to - 1] + half].map(|t| frame.px(t));
                match color {
                    Some(color) => pen.rect((x[0], top), (x[1], bottom), color)?,
                    None => hatch(pen, x, [top, bottom])?,
                }
                from = to;
            }
        }
        pen.frame(
            (frame.left, frame.top),
            (frame.right, frame.bottom),
            pen.inks.line,
        )
    }

    fn key<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let wide = KEY.min(frame.right - frame.left);
        let (left, top) = (frame.right - wide, pen.h - 28.0);
        let ramp = self.ramp(&pen.inks);
        let x = |share: f64| left + wide * share;
        let n = ramp.len() as f64;
        for (i, color) in ramp.iter().enumerate() {
            pen.rect(
                (x(i as f64 / n), top),
                (x((i + 1) as f64 / n), top + 9.0),
                *color,
            )?;
        }
        pen.frame((left, top), (frame.right, top + 9.0), pen.inks.line)?;
        let word = Word::new(TICK, pen.inks.slate);
        let size = text::short(self.limit);
        let y = top + 19.0;
        let said = match self.what {
            What::Power => {
                pen.word(&format!("−{size}"), (left, y), word)?;
                pen.word("0", (x(0.5), y), word.at(At::Middle))?;
                pen.word(&format!("+{size} dB"), (frame.right, y), word.at(At::Right))?;
                format!("against the reference; {} cycles", self.cycles)
            }
            What::Consistency => {
                pen.word("0", (left, y), word)?;
                pen.word(&size, (frame.right, y), word.at(At::Right))?;
                let chance = self.chance();
                if chance < self.limit {
                    let at = x(chance / self.limit);
                    pen.down(at, top - 4.0, top + 11.0, pen.inks.ink, 1.5)?;
                    let room = at > left + 42.0 && at < frame.right - 52.0;
                    if room {
                        pen.word("by chance", (at, y), word.at(At::Middle))?;
                    }
                }
                format!("{} trials; {} cycles", self.trials, self.cycles)
            }
        };
        if text::width(&said, TICK) < left - frame.left - 8.0 {
            pen.word(&said, (left - 10.0, top + 5.0), word.at(At::Right))?;
        }
        Ok(())
    }
}

/// Where too few trials reach: sparse strokes instead of a colour.
fn hatch<DB: DrawingBackend>(pen: &Pen<DB>, x: [f64; 2], y: [f64; 2]) -> Drawn<DB> {
    pen.rect((x[0], y[0]), (x[1], y[1]), pen.inks.plate)?;
    pen.across(x[0], x[1], (y[0] + y[1]) / 2.0, pen.inks.rule, 1.0)
}

impl Plot for TimeFrequency {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        self.image(pen, &frame)?;
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        let mut last = f64::INFINITY;
        for hz in [1.0, 2.0, 5.0, 10.0, 20.0, 40.0, 80.0, 160.0] {
            let y = frame.py(hz);
            if y > frame.top + 5.0 && y < frame.bottom - 3.0 && last - y > 14.0 {
                pen.across(frame.left - 4.0, frame.left, y, pen.inks.line, 1.0)?;
                pen.word(&text::hertz(hz), (frame.left - 7.0, y), word)?;
                last = y;
            }
        }
        pen.word("Hz", (frame.left - 7.0, frame.bottom - 4.0), word)?;
        let zero = frame.px(0.0);
        if zero > frame.left && zero < frame.right {
            let (top, bottom) = ((zero, frame.top), (zero, frame.bottom));
            pen.dashed_rule(top, bottom, pen.inks.ink, (3.0, 3.0))?;
        }
        let inks = pen.inks;
        let sides = self.windows.iter().flatten();
        for (window, ink) in sides.zip([inks.reference, inks.signal]) {
            let x = window.map(|t| frame.px_inside(t));
            pen.rect((x[0], frame.bottom + 1.0), (x[1], frame.bottom + 5.0), ink)?;
        }
        let below = Frame {
            bottom: frame.bottom + 5.0,
            ..frame
        };
        let most = ((frame.right - frame.left) / 76.0).max(2.0) as usize;
        let ticks = frame.x.ticks(most);
        below.x_labels(pen, &ticks, &axis::labels(&ticks), "s")?;
        self.key(pen, &frame)
    }

    fn height(&self, _width: u32) -> u32 {
        (TOP + 168.0 + FOOT) as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let name = match self.what {
            What::Power => "dB_at",
            What::Consistency => "consistency_at",
        };
        let heads: Vec<String> = self.t_s.iter().map(|t| format!("{name}_{t}_s")).collect();
        let mut columns = vec!["frequency_Hz"];
        columns.extend(heads.iter().map(String::as_str));
        let mut table = Table::new(&columns);
        for (hz, row) in self.hz.iter().zip(&self.values) {
            let cells = row
                .iter()
                .map(|v| v.map_or(String::new(), |v| format!("{v}")));
            table.row(std::iter::once(format!("{hz}")).chain(cells));
        }
        table
    }

    fn spoken(&self) -> String {
        let mut most: Option<(f32, f64, f64)> = None;
        for (hz, row) in self.hz.iter().zip(&self.values) {
            for (t, value) in self.t_s.iter().zip(row) {
                if let Some(v) = value
                    && most.is_none_or(|m| v.abs() > m.0.abs())
                {
                    most = Some((*v, *hz, *t));
                }
            }
        }
        let (value, hz, t) = most.unwrap_or((0.0, 0.0, 0.0));
        let place = format!("{} Hz, {} s", text::hertz(hz), text::number(t, 2));
        match self.what {
            What::Power => format!(
                "Power of the component over time and frequency against its reference windows: farthest from them at {place}, {}; wavelets of {} cycles.",
                text::decibels(f64::from(value)),
                self.cycles
            ),
            What::Consistency => format!(
                "Phase consistency of the component over {}: largest at {place}, {}; random phases stay under {} in 95 of 100 cells.",
                text::count(self.trials, "trial"),
                text::number(f64::from(value), 2),
                text::number(self.chance(), 2)
            ),
        }
    }
}
