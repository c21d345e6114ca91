//! A few seconds of channels, one above the other.
use crate::axis::{Axis, Frame, LEFT, PlotBox, RIGHT, nice_step};
use crate::pen::{At, Drawn, Pen, SMALL, TICK, Word};
use crate::table::{Table, cell};
use crate::{Figure, Plot, axis, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::recording::Recording;

/// Samples a channel above which smallest and largest values of equal bins are drawn instead.
const DENSE: usize = 2400;
const BINS: usize = 1200;
const TOP: f64 = 24.0;
const FOOT: f64 = 26.0;
const BAR: f64 = 34.0;

/// See [`crate::Figure::Traces`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Traces {
    /// Left edge on the file's clock.
    pub from_s: f64,
    /// Length shown.
    pub seconds: f64,
    /// Times of the values of every channel; not a number where the line breaks at a gap.
    #[serde(with = "nan")]
    pub t_s: Vec<f64>,
    /// The channels, from above.
    pub lines: Vec<Line>,
    /// Events inside: onset and label.
    pub events: Vec<(f64, String)>,
    /// Gaps inside.
    pub gaps: Vec<[f64; 2]>,
}

/// One channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Line {
    /// Label.
    pub name: String,
    /// Unit of `values`.
    pub unit: String,
    /// About the median of what is shown.
    #[serde(with = "nan")]
    pub values: Vec<f64>,
    /// Drawn faintly, as one that is left out.
    #[serde(default)]
    pub faint: bool,
}

/// `seconds` of some channels from `from_s` on the file's clock; indexes that do not exist are passed over.
pub fn traces(recording: &Recording, from_s: f64, seconds: f64, channels: &[usize]) -> Figure {
    let rate = recording.rate_hz;
    let to_s = from_s + seconds;
    let mut pieces: Vec<(usize, usize, f64)> = Vec::new();
    let mut gaps = Vec::new();
    for (i, s) in recording.stretches.iter().enumerate() {
        let end_s = s.onset_s + s.count as f64 / rate;
        let first = ((from_s - s.onset_s) * rate).ceil().max(0.0) as usize;
        let last = ((to_s - s.onset_s) * rate)
            .floor()
            .clamp(-1.0, s.count as f64 - 1.0);
        if last >= 0.0 && first as f64 <= last {
            let onset = s.onset_s + first as f64 / rate;
            pieces.push((s.first + first, last as usize + 1 - first, onset));
        }
        let next = recording.stretches.get(i + 1).map(|n| n.onset_s);
        if let Some(next) = next.filter(|n| *n > end_s + 0.5 / rate && end_s < to_s && *n > from_s)
        {
            gaps.push([end_s.max(from_s), next.min(to_s)]);
        }
    }
    let shown: usize = pieces.iter().map(|p| p.1).sum();
    let bin = if shown > DENSE {
        shown.div_ceil(BINS)
    } else {
        1
    };
    let mut t_s = Vec::new();
    for (_, count, onset) in &pieces {
        for at in (0..*count).step_by(bin) {
            let copies = if bin > 1 { 2 } else { 1 };
            t_s.extend(std::iter::repeat_n(onset + at as f64 / rate, copies));
        }
        t_s.push(f64::NAN);
    }
    let line = |c: &usize| -> Option<Line> {
        let samples = recording.samples.get(*c)?;
        let card = recording.channels.get(*c)?;
        let mut values = Vec::with_capacity(t_s.len());
        for (first, count, _) in &pieces {
            let piece = samples.get(*first..first + count)?;
            for part in piece.chunks(bin) {
                thin(part, &mut values);
            }
            values.push(f64::NAN);
        }
        let middle = median(&values);
        values.iter_mut().for_each(|v| *v -= middle);
        Some(Line {
            name: card.name.clone(),
            unit: card.unit.clone(),
            values,
            faint: false,
        })
    };
    let inside = recording
        .events
        .iter()
        .filter(|e| (from_s..=to_s).contains(&e.onset_s));
    Figure::Traces(Traces {
        from_s,
        seconds,
        lines: channels.iter().filter_map(line).collect(),
        events: inside.map(|e| (e.onset_s, e.label.clone())).collect(),
        gaps,
        t_s,
    })
}

/// One sample as it is; of several the smallest and the largest.
fn thin(part: &[f32], out: &mut Vec<f64>) {
    if let [one] = part {
        out.push(f64::from(*one));
        return;
    }
    let finite = part.iter().copied().filter(|v| v.is_finite());
    let (low, high) = finite.fold((f32::INFINITY, f32::NEG_INFINITY), |(l, h), v| {
        (l.min(v), h.max(v))
    });
    let ends = if low <= high {
        [low, high]
    } else {
        [f32::NAN; 2]
    };
    out.extend(ends.map(f64::from));
}

fn median(values: &[f64]) -> f64 {
    let mut finite: Vec<f64> = values.iter().copied().filter(|v| v.is_finite()).collect();
    finite.sort_by(f64::total_cmp);
    finite.get(finite.len() / 2).copied().unwrap_or(0.0)
}

/// Half the range that holds the middle nine tenths.
fn spread(values: &[f64]) -> f64 {
    let mut sizes: Vec<f64> = values
        .iter()
        .filter(|v| v.is_finite())
        .map(|v| v.abs())
        .collect();
    sizes.sort_by(f64::total_cmp);
    sizes.get(sizes.len() * 9 / 10).copied().unwrap_or(0.0)
}

/// The parts of a line between two heights; what lies beyond is left out rather than flattened.
fn cut(points: &[(f64, f64)], high: f64, low: f64) -> Vec<(f64, f64)> {
    let inside = |p: &(f64, f64)| p.1 >= high && p.1 <= low;
    let mut out = Vec::with_capacity(points.len());
    let mut last: Option<(f64, f64)> = None;
    for p in points {
        let crossing = |from: (f64, f64), to: (f64, f64)| {
            let edge = if to.1 < high { high } else { low };
            let share = (edge - from.1) / (to.1 - from.1);
            (from.0 + share * (to.0 - from.0), edge)
        };
        let whole = p.0.is_finite() && p.1.is_finite();
        match (last, whole) {
            (Some(l), true) if inside(&l) != inside(p) => {
                if inside(p) {
                    out.push((f64::NAN, f64::NAN));
                    out.push(crossing(*p, l));
                } else {
                    out.push(crossing(l, *p));
                }
            }
            _ => {}
        }
        out.push(if whole && inside(p) {
            *p
        } else {
            (f64::NAN, f64::NAN)
        });
        last = whole.then_some(*p);
    }
    out
}

impl Traces {
    fn frame(&self, width: f64, height: f64) -> Frame {
        Frame {
            left: LEFT,
            right: width - RIGHT - if self.lines.is_empty() { 0.0 } else { BAR },
            top: TOP,
            bottom: (height - FOOT).max(TOP + 1.0),
            x: Axis::linear(self.from_s, self.from_s + self.seconds),
            y: Axis::falling(self.lines.len().max(1) as f64 - 0.5, -0.5),
        }
    }

    /// Units with how many of them lie between two neighbouring lines: 3.4 times the spread of the middle channel.
    fn gains(&self) -> Vec<(String, f64)> {
        let mut gains: Vec<(String, f64)> = Vec::new();
        for line in &self.lines {
            if gains.iter().any(|(unit, _)| *unit == line.unit) {
                continue;
            }
            let same = self.lines.iter().filter(|l| l.unit == line.unit);
            let spreads: Vec<f64> = same
                .map(|l| spread(&l.values))
                .filter(|s| *s > 0.0)
                .collect();
            let typical = median(&spreads);
            let room = if typical > 0.0 { typical * 3.4 } else { 1.0 };
            gains.push((line.unit.clone(), room));
        }
        gains
    }

    fn lines<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame, row: f64) -> Drawn<DB> {
        let gains = self.gains();
        let every = (14.0 / row).ceil().max(1.0) as usize;
        let word = Word::new(if row < 15.0 { SMALL } else { TICK }, pen.inks.slate).at(At::Right);
        let (high, low) = (frame.top + 1.0, frame.bottom - 1.0);
        for (i, line) in self.lines.iter().enumerate() {
            let y = frame.top + row * (i as f64 + 0.5);
            if i % every == 0 {
                pen.name(&line.name, (LEFT - 9.0, y), LEFT - 12.0, word)?;
            }
            let unit = gains.iter().find(|(unit, _)| *unit == line.unit);
            let scale = row / unit.map_or(1.0, |(_, room)| *room);
            let place = |(t, v): (&f64, &f64)| (frame.px(*t), y - v * scale);
            let points: Vec<_> = self.t_s.iter().zip(&line.values).map(place).collect();
            let points = cut(&points, high, low);
            let color = if line.faint {
                pen.inks.area()
            } else {
                pen.inks.ink
            };
            pen.path(&points, color, 0.9)?;
        }
        Ok(())
    }

    fn bars<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame, row: f64) -> Drawn<DB> {
        let mut top = frame.top + 12.0;
        let x = frame.right + 10.0;
        for (unit, room) in self.gains().iter().take(3) {
            let want = if row < 22.0 { room * 24.0 / row } else { *room };
            let size = nice_step(want * 0.4);
            let tall = size / room * row;
            let said = format!("{} {unit}", text::short(size));
            let said = text::fit(&said, SMALL, pen.w - x + 6.0);
            pen.word(
                &said,
                (pen.w - 2.0, top - 12.0),
                Word::new(SMALL, pen.inks.slate).at(At::Right),
            )?;
            pen.down(x, top, top + tall, pen.inks.ink, 2.0)?;
            top += tall + 34.0;
        }
        Ok(())
    }

    fn events<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let mut used = f64::NEG_INFINITY;
        for (onset, label) in &self.events {
            let x = frame.px(*onset);
            pen.dashed_rule(
                (x, frame.top - 18.0),
                (x, frame.bottom),
                pen.inks.line,
                (3.0, 3.0),
            )?;
            let room = (frame.right - x - 8.0).min(120.0);
            let said = text::fit(label, TICK, room);
            let wide = text::width(&said, TICK);
            if x > used && room > 24.0 {
                pen.word(
                    &said,
                    (x + 5.0, frame.top - 11.0),
                    Word::new(TICK, pen.inks.slate),
                )?;
                used = x + wide + 8.0;
            }
        }
        Ok(())
    }
}

impl Plot for Traces {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let row = (frame.bottom - frame.top) / self.lines.len().max(1) as f64;
        for gap in &self.gaps {
            let (x0, x1) = (frame.px(gap[0]), frame.px(gap[1]));
            pen.hatch((x0, frame.top), (x1, frame.bottom), pen.inks.line)?;
        }
        self.events(pen, &frame)?;
        self.lines(pen, &frame, row)?;
        self.bars(pen, &frame, row)?;
        let most = ((frame.right - frame.left) / 90.0).max(2.0) as usize;
        let ticks = frame.x.ticks(most);
        let whole = self.seconds > 4.0;
        let labels = if whole {
            ticks.iter().map(|t| text::clock(*t, false)).collect()
        } else {
            axis::labels(&ticks)
        };
        frame.x_axis(pen, &ticks, &labels, if whole { "" } else { "s" })
    }

    fn height(&self, _width: u32) -> u32 {
        let n = self.lines.len().max(1) as f64;
        let row = (400.0 / n).clamp(12.0, 29.0);
        (TOP + FOOT + (row * n).min(720.0)) as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let heads: Vec<String> = self
            .lines
            .iter()
            .map(|l| format!("{} {}", l.name, l.unit))
            .collect();
        let mut columns = vec!["time_s"];
        columns.extend(heads.iter().map(String::as_str));
        let mut table = Table::new(&columns);
        for (i, t) in self.t_s.iter().enumerate().filter(|(_, t)| t.is_finite()) {
            let values = self
                .lines
                .iter()
                .map(|l| l.values.get(i).map_or(String::new(), |v| cell(*v)));
            table.row(std::iter::once(cell(*t)).chain(values));
        }
        table
    }

    fn spoken(&self) -> String {
        format!(
            "{} over {} seconds from {}.",
            text::count(self.lines.len(), "channel"),
            text::short(self.seconds),
            text::clock(self.from_s, false),
        )
    }
}
