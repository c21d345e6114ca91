//! A component around its event: power or average, with the two windows.
use crate::axis::{self, Axis, Frame, LEFT, PlotBox, RIGHT, range};
use crate::look::{mix, see_through};
use crate::pen::{At, Drawn, LABEL, Pen, TICK, Word};
use crate::table::Table;
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::recipe::Contrast;
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
    /// The course of a component, or, for the windows, only those where there is none yet.
    pub(crate) fn of(
        sheet: &Sheet,
        component: Option<(&teasel_core::sheet::Component, End)>,
        of: Of,
    ) -> Option<Self> {
        let Contrast::Windows { signal, reference } = &sheet.recipe.contrast;
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

    fn washes<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let inks = pen.inks;
        let middle = (frame.top + frame.bottom) / 2.0;
        let (above, below) = if self.one_event() {
            (frame.bottom, frame.top)
        } else {
            (middle, middle)
        };
        let sides = [
            (
                "reference",
                self.reference,
                inks.reference_wash,
                inks.reference,
                below,
                frame.bottom,
                &self.events[1],
            ),
            (
                "signal",
                self.signal,
                inks.signal_wash,
                inks.signal,
                frame.top,
                above,
                &self.events[0],
            ),
        ];
        let mut used: Vec<(f64, f64)> = vec![self.event_span(frame)];
        for (said, [from, to], wash, ink, top, bottom, event) in sides {
            let x0 = frame.px_inside(from);
            let x1 = frame.px_inside(to);
            pen.rect((x0, top), (x1, bottom), wash)?;
            let said = if self.one_event() {
                said.to_owned()
            } else {
                format!("{said}, from {}", text::fit(event, LABEL, 80.0))
            };
            let half = text::bold_width(&said, LABEL) / 2.0 + 2.0;
            let free = |x: f64, used: &[(f64, f64)]| {
                used.iter().all(|(a, b)| x + half <= *a || x - half >= *b)
            };
            let centre = (x0 + x1) / 2.0;
            let shifts = [0.0, 1.0, -1.0, 2.0, -2.0, 3.0, -3.0, 4.0, -4.0];
            let tries = shifts.map(|s| {
                (centre + s * half * 0.6)
                    .min(frame.right - half)
                    .max(frame.left + half)
            });
            let x = tries
                .into_iter()
                .find(|x| free(*x, &used))
                .unwrap_or(tries[0]);
            used.push((x - half, x + half));
            let word = Word::new(LABEL, ink).bold().at(At::Middle);
            pen.word(&said, (x, frame.top - 9.0), word)?;
        }
        Ok(())
    }

    fn event_name(&self) -> String {
        text::fit(&self.event, TICK, 90.0)
    }

    fn event_span(&self, frame: &Frame) -> (f64, f64) {
        let half = text::width(&self.event_name(), TICK) / 2.0 + 3.0;
        let x = frame.px(0.0);
        (x - half, x + half)
    }

    /// Edges of the windows with their times below; a time that would run into its neighbour is moved aside.
    fn edges<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let inks = pen.inks;
        let mut edges: Vec<(f64, plotters::style::RGBAColor)> = Vec::new();
        edges.extend(self.reference.map(|t| (t, inks.reference)));
        edges.extend(self.signal.map(|t| (t, inks.signal)));
        edges.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut used = f64::NEG_INFINITY;
        for (t, ink) in edges {
            let at = frame.px(t);
            if at < frame.left - 1.0 || at > frame.right + 1.0 {
                continue;
            }
            pen.down(at, frame.top, frame.bottom + 4.0, ink, 1.5)?;
            let said = format!("{} s", text::number(t, 2));
            let half = text::bold_width(&said, TICK) / 2.0 + 1.0;
            let x = at.max(used + half + 4.0);
            pen.word(
                &said,
                (x, frame.bottom + 44.0),
                Word::new(TICK, ink).bold().at(At::Middle),
            )?;
            used = x + half;
        }
        Ok(())
    }

    fn ink(&self, inks: &crate::look::Inks) -> plotters::style::RGBAColor {
        match self.end {
            Some(end) => end.ink(inks),
            None => inks.ink,
        }
    }

    fn captions<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let slate = Word::new(TICK, pen.inks.slate);
        let said: &[&str] = match self.of {
            Of::Average => &[
                "Average of the component, in its own unit",
                "Average, own unit",
            ],
            _ if self.t_s.is_empty() => &["The two windows around the event"],
            Of::Windows => &[
                "Power of component 1 against its reference mean, dB",
                "Power against its reference mean, dB",
                "Power, dB of reference",
            ],
            Of::Power => &[
                "Power against its reference mean, dB",
                "Power, dB of reference",
            ],
        };
        let said = text::first(said, TICK, pen.w - 8.0);
        pen.word(said, (4.0, 9.0), slate)?;
        if self.trials == 0 {
            return Ok(());
        }
        let trials = format!(
            "mean of {}; band: 95 % interval",
            text::count(self.trials, "trial")
        );
        if text::width(said, TICK) + text::width(&trials, TICK) < pen.w - 40.0 {
            pen.word(&trials, (frame.right, 9.0), slate.at(At::Right))?;
        }
        Ok(())
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
