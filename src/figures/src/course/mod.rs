//! A component around its event: power or average, with the two windows.
mod windows;

use crate::axis::{self, Axis, range};
use crate::frame::{Frame, LEFT, PlotBox, RIGHT};
use crate::inks::{mix, see_through};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::Table;
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

const TOP: f64 = 44.0;
/// Room below the axis where the windows' edges carry handles and their times.
const EDGES: f64 = 56.0;
const FOOT: f64 = 24.0;

/// What a course shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Of {
    /// Mean power in dB of the reference windows' mean, with the windows' edges and their times.
    Windows,
    /// Mean power in dB of the reference windows' mean.
    Power,
    /// The average of the series itself.
    Average,
}

/// See [`crate::Figure::Course`]. To follow a window's edge while it is dragged, change `signal` or `reference` and draw again.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Course {
    /// What it shows.
    pub of: Of,
    /// The component's end; hue of the curve.
    pub end: Option<End>,
    /// Label of the event at 0.
    pub event: String,
    /// Times; empty before there is a component.
    #[serde(with = "nan")]
    pub t_s: Vec<f64>,
    /// Mean over trials.
    #[serde(with = "nan")]
    pub mean: Vec<f64>,
    /// Lower edge of the 95 % band.
    #[serde(with = "nan")]
    pub low: Vec<f64>,
    /// Upper edge of the 95 % band.
    #[serde(with = "nan")]
    pub high: Vec<f64>,
    /// Trials that went in.
    pub trials: usize,
    /// Width of the smoothing in seconds.
    pub smoothing_s: f64,
    /// The signal window around its event.
    pub signal: [f64; 2],
    /// The reference window around its event.
    pub reference: [f64; 2],
    /// Events of the signal and of the reference window.
    pub events: [String; 2],
}

impl Course {
    /// A component around its event, or, for the windows, only those where there is none yet.
    pub(crate) fn of(
        sheet: &Sheet,
        component: Option<(&teasel_core::sheet::Component, End)>,
        of: Of,
    ) -> Option<Self> {
        // What is made of one window has it on both sides; what has none has no course.
        let around = sheet.recipe.contrast.around();
        let (signal, reference) = (around.first()?, around.last()?);
        let course = component.and_then(|(c, _)| c.course.as_ref());
        let course = course.filter(|c| !c.t_s.is_empty());
        if course.is_none() && of != Of::Windows {
            return None;
        }
        let (mean, low, high) = match (course, of) {
            (Some(c), Of::Average) => (&c.average, &c.average_low, &c.average_high),
            (Some(c), _) => (&c.mean_db, &c.low_db, &c.high_db),
            (None, _) => (&Vec::new(), &Vec::new(), &Vec::new()),
        };
        if of == Of::Average && mean.is_empty() {
            return None;
        }
        Some(Course {
            of,
            end: component.map(|(_, end)| end).filter(|_| of != Of::Windows),
            event: course.map_or(signal.event.clone(), |c| c.event.clone()),
            t_s: course.map_or(Vec::new(), |c| c.t_s.clone()),
            mean: mean.clone(),
            low: low.clone(),
            high: high.clone(),
            trials: course.map_or(0, |c| c.trials),
            smoothing_s: course.map_or(0.0, |c| c.smoothing_s),
            signal: [signal.from_s, signal.to_s],
            reference: [reference.from_s, reference.to_s],
            events: [signal.event.clone(), reference.event.clone()],
        })
    }

    fn edged(&self) -> bool {
        self.of == Of::Windows
    }

    /// Both windows are tied to the same event, so that they lie on one time axis.
    fn one_event(&self) -> bool {
        self.events[0] == self.events[1]
    }

    /// Both sides look at one window: what repeats in it stands against the single trials.
    fn one_window(&self) -> bool {
        self.one_event() && self.signal == self.reference
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let edges = [self.signal, self.reference].concat();
        let (first, last) = range(&edges).unwrap_or((0.0, 1.0));
        let pad = 0.25 * (last - first).max(0.1);
        let (t0, t1) = range(&self.t_s).unwrap_or((first.min(0.0) - pad, last.max(0.0) + pad));
        let all = self.low.iter().chain(&self.high).chain(&self.mean);
        let (low, high) = range(all).unwrap_or((-1.0, 1.0));
        let (low, high) = (low.min(0.0), high.max(0.0));
        let room = 0.06 * (high - low).max(1e-9);
        let foot = if self.edged() { EDGES } else { FOOT };
        Frame {
            left: if self.edged() { LEFT } else { 46.0 },
            right: width - RIGHT,
            top: TOP,
            bottom: (height - foot).max(TOP + 20.0),
            x: Axis::linear(t0, t1),
            y: Axis::linear(low - room, high + room),
        }
    }

    fn ink(&self, inks: &crate::inks::Inks) -> plotters::style::RGBAColor {
        match self.end {
            Some(end) => end.ink(inks),
            None => inks.ink,
        }
    }
}

impl Plot for Course {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        self.captions(pen, &frame)?;
        self.washes(pen, &frame)?;
        if !self.mean.is_empty() {
            let ticks = frame
                .y
                .ticks(((frame.bottom - frame.top) / 24.0).max(2.0) as usize);
            frame.y_grid(pen, &ticks, &axis::labels(&ticks))?;
            let zero = frame.py(0.0);
            pen.across(
                frame.left,
                frame.right,
                zero,
                mix(inks.line, inks.plate, 0.7),
                1.0,
            )?;
        }
        let ink = self.ink(&inks);
        let band = see_through(ink, if self.end.is_some() { 0.18 } else { 0.14 });
        pen.band(
            &frame.points(&self.t_s, &self.low),
            &frame.points(&self.t_s, &self.high),
            band,
        )?;
        let x = frame.px(0.0);
        if x > frame.left && x < frame.right {
            pen.dashed_rule(
                (x, frame.top - 2.0),
                (x, frame.bottom),
                inks.ink,
                (3.0, 3.0),
            )?;
            let word = Word::new(TICK, inks.ink).at(At::Middle);
            pen.word(&self.event_name(), (x, frame.top - 9.0), word)?;
        }
        pen.path(&frame.points(&self.t_s, &self.mean), ink, 2.0)?;
        let ticks = frame
            .x
            .ticks(((frame.right - frame.left) / 76.0).max(2.0) as usize);
        let taken: Vec<f64> = if self.edged() {
            let edges = self.reference.iter().chain(&self.signal);
            edges.map(|t| frame.px(*t)).collect()
        } else {
            Vec::new()
        };
        frame.x_axis_but(pen, &ticks, &axis::labels(&ticks), "s", &taken)?;
        if self.edged() {
            self.edges(pen, &frame)?;
        }
        Ok(())
    }

    fn height(&self, _width: u32) -> u32 {
        if self.edged() { 304 } else { 236 }
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let unit = if self.of == Of::Average {
            "average"
        } else {
            "power_dB"
        };
        let low = format!("{unit}_low_95");
        let high = format!("{unit}_high_95");
        let columns = ["time_s", unit, &low, &high];
        Table::of(&columns, &[&self.t_s, &self.mean, &self.low, &self.high])
    }

    fn spoken(&self) -> String {
        let what = match self.of {
            Of::Average => "Average of the component",
            _ if self.t_s.is_empty() => "The two windows",
            _ => "Average power of the component",
        };
        let window =
            |w: [f64; 2]| format!("{} to {} s", text::number(w[0], 2), text::number(w[1], 2));
        format!(
            "{what} around {}: signal window {}, reference window {}.",
            self.event,
            window(self.signal),
            window(self.reference)
        )
    }
}
