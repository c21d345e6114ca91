//! The lines themselves, their scale bars and the events across them.
use super::make::{median, spread};
use super::{HEADROOM, Line, Traces};
use crate::axis::nice_step;
use crate::frame::{Frame, LEFT};
use crate::pen::{At, Drawn, Pen, SMALL, TICK, Word};
use crate::text;
use plotters_backend::DrawingBackend;

/// A line is far larger than the others when its middle nine tenths reach this many rows.
const LOUD: f64 = 1.3;

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
    /// The lines from above; those that are left out or far larger than the others are drawn first and faintly, so that the
    /// others stay readable.
    pub(super) fn lines<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        row: f64,
    ) -> Drawn<DB> {
        let gains = self.gains();
        let room = |line: &Line| {
            let unit = gains.iter().find(|(unit, _)| *unit == line.unit);
            unit.map_or(1.0, |(_, room)| *room)
        };
        let faint = |line: &Line| line.faint || spread(&line.values) > LOUD * room(line);
        let every = (14.0 / row).ceil().max(1.0) as usize;
        let word = Word::new(if row < 15.0 { SMALL } else { TICK }, pen.inks.slate).at(At::Right);
        let mut order: Vec<usize> = (0..self.lines.len()).collect();
        order.sort_by_key(|i| !faint(&self.lines[*i]));
        for i in order {
            let line = &self.lines[i];
            let y = frame.top + row * (i as f64 + HEADROOM + 0.5);
            if i % every == 0 {
                pen.name(&line.name, (LEFT - 9.0, y), LEFT - 12.0, word)?;
            }
            let scale = row / room(line);
            let place = |(t, v): (&f64, &f64)| (frame.px(*t), y - v * scale);
            let points: Vec<_> = self.t_s.iter().zip(&line.values).map(place).collect();
            let points = cut(&points, frame.top + 1.0, frame.bottom - 1.0);
            let color = if faint(line) {
                pen.inks.area()
            } else {
                pen.inks.ink
            };
            pen.path(&points, color, 0.9)?;
        }
        Ok(())
    }
    /// A scale bar for each unit, right of the plot; their sizes stand above, in the same order.
    pub(super) fn bars<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        row: f64,
    ) -> Drawn<DB> {
        for (i, (_, size, room)) in self.bar_sizes(row).iter().enumerate() {
            let x = frame.right + 7.0 + 5.0 * i as f64;
            pen.down(
                x,
                frame.top + 2.0,
                frame.top + 2.0 + size / room * row,
                pen.inks.ink,
                2.0,
            )?;
        }
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        pen.word(&self.bar_words(row), (pen.w, frame.top - 11.0), word)
    }

    /// Unit, length of its bar, and units between two lines.
    fn bar_sizes(&self, row: f64) -> Vec<(String, f64, f64)> {
        let size = |room: f64| nice_step(0.4 * if row < 22.0 { room * 24.0 / row } else { room });
        let gains = self.gains().into_iter().take(2);
        gains.map(|(unit, room)| (unit, size(room), room)).collect()
    }

    fn bar_words(&self, row: f64) -> String {
        let said = self.bar_sizes(row).into_iter();
        let said: Vec<String> = said
            .map(|(unit, size, _)| text::fit(&format!("{} {unit}", text::short(size)), TICK, 90.0))
            .collect();
        said.join(", ")
    }
    pub(super) fn events<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        row: f64,
    ) -> Drawn<DB> {
        let mut used = f64::NEG_INFINITY;
        let end = pen.w - text::width(&self.bar_words(row), TICK) - 8.0;
        let ink = pen.inks.line;
        for (onset, label) in &self.events {
            let x = frame.px(*onset);
            pen.dashed_rule((x, frame.top - 18.0), (x, frame.bottom), ink, (3.0, 3.0))?;
            let said = text::fit(label, TICK, (end - x - 8.0).min(120.0));
            let wide = text::width(&said, TICK);
            if x > used && x + 8.0 + wide < end {
                let word = Word::new(TICK, pen.inks.slate);
                pen.word(&said, (x + 5.0, frame.top - 11.0), word)?;
                used = x + wide + 8.0;
            }
        }
        Ok(())
    }
}
