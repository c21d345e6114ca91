//! A pattern in order of size, and the key of both drawings.
use super::{KEY, Map};
use crate::inks::{Ramp, step};
use crate::pen::{At, Drawn, Pen, SMALL, TICK, Word};
use crate::text;
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;

/// The key below a pattern, from its largest value on one side of zero to that on the other.
pub(crate) fn key<DB: DrawingBackend>(
    pen: &Pen<DB>,
    ramp: &Ramp,
    limit: f64,
    unit: &str,
) -> Drawn<DB> {
    let wide = (pen.w - 60.0).clamp(80.0, 162.0);
    let (left, top) = ((pen.w - wide) / 2.0, pen.h - 27.0);
    for (i, color) in ramp.iter().enumerate() {
        let x = |k: f64| left + wide * k / 11.0;
        pen.rect((x(i as f64), top), (x(i as f64 + 1.0), top + 9.0), *color)?;
    }
    pen.frame((left, top), (left + wide, top + 9.0), pen.inks.line)?;
    let word = Word::new(TICK, pen.inks.slate).at(At::Middle);
    let said = text::short(limit);
    let unit = format!("{} per unit", text::fit(unit, TICK, 90.0));
    pen.word(&unit, (pen.w / 2.0, top - 9.0), word)?;
    pen.word(&format!("−{said}"), (left, top + 19.0), word.at(At::Left))?;
    pen.word("0", (pen.w / 2.0, top + 19.0), word)?;
    pen.word(&said, (left + wide, top + 19.0), word.at(At::Right))
}

impl Map {
    /// The colour of a bar; what is nearly nothing on a surface is still a bar.
    pub(super) fn bar_ink<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        ramp: &Ramp,
        i: usize,
    ) -> RGBAColor {
        match step(self.values[i], self.limit()) {
            5 => pen.inks.line,
            step => ramp[step],
        }
    }

    /// Where the map cannot be drawn: the largest entries as bars.
    pub(super) fn bars<DB: DrawingBackend>(&self, pen: &Pen<DB>, ramp: &Ramp) -> Drawn<DB> {
        let (top, bottom) = if self.small {
            (2.0, pen.h - 2.0)
        } else {
            (22.0, pen.h - KEY - 20.0)
        };
        let row = if self.small { 5.0 } else { 15.0 };
        let fit = ((bottom - top) / row).max(1.0) as usize;
        let order = self.order();
        let shown = &order[..order.len().min(fit)];
        let (left, right) = if self.small {
            (2.0, pen.w - 2.0)
        } else {
            (64.0, pen.w - 12.0)
        };
        let zero = (left + right) / 2.0;
        let limit = self.limit();
        if !self.small {
            let said = format!(
                "{} of {}, by size",
                shown.len(),
                text::count(order.len(), "channel")
            );
            pen.word(&said, (4.0, 8.0), Word::new(TICK, pen.inks.slate))?;
            let note = match self.missing() {
                0 => "no map: the positions span no surface".to_owned(),
                n => format!("no map: {} without a position", text::count(n, "channel")),
            };
            let word = Word::new(SMALL, pen.inks.slate).at(At::Middle);
            pen.word(
                &text::fit(&note, SMALL, pen.w),
                (pen.w / 2.0, pen.h - KEY - 8.0),
                word,
            )?;
        }
        let labels = text::Shared::in_list(&self.names);
        for (k, i) in shown.iter().enumerate() {
            let y = top + row * (k as f64 + 0.5);
            let x = zero + (right - zero) * self.values[*i] / limit;
            let half = if self.small { 1.5 } else { 4.5 };
            pen.rect((zero, y - half), (x, y + half), self.bar_ink(pen, ramp, *i))?;
            if !self.small {
                let word = Word::new(SMALL, pen.inks.slate).at(At::Right);
                pen.name(
                    &labels.without(&self.names[*i]),
                    (left - 6.0, y),
                    left - 8.0,
                    word,
                )?;
            }
        }
        pen.down(
            zero,
            top,
            top + row * shown.len() as f64,
            pen.inks.line,
            1.0,
        )
    }
}
