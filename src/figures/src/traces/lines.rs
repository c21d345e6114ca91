//! The lines themselves, their scale bars and the events across them.
use super::Traces;
use super::make::{median, spread};
use crate::axis::nice_step;
use crate::frame::{Frame, LEFT};
use crate::pen::{At, Drawn, Pen, SMALL, TICK, Word};
use crate::text;
use plotters_backend::DrawingBackend;

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

    pub(super) fn lines<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        row: f64,
    ) -> Drawn<DB> {
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

    pub(super) fn bars<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        row: f64,
    ) -> Drawn<DB> {
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

    pub(super) fn events<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
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
