//! The two windows of a course, their names, their edges, and its caption.
use super::{Course, Of};
use crate::frame::Frame;
use crate::pen::{At, Drawn, LABEL, Pen, TICK, Word};
use crate::text;
use crate::weights::End;
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;

impl Course {
    pub(super) fn washes<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
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
        for (said, [from, to], wash, ink, top, bottom, event) in
            sides.into_iter().skip(usize::from(self.one_window()))
        {
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

    pub(super) fn event_name(&self) -> String {
        text::fit(&self.event, TICK, 90.0)
    }

    fn event_span(&self, frame: &Frame) -> (f64, f64) {
        let half = text::width(&self.event_name(), TICK) / 2.0 + 3.0;
        let x = frame.px(0.0);
        (x - half, x + half)
    }

    /// Edges of the windows with their times below; times that would run into each other are moved apart.
    pub(super) fn edges<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let inks = pen.inks;
        let mut edges: Vec<(f64, RGBAColor)> = Vec::new();
        if !self.one_window() {
            edges.extend(self.reference.map(|t| (t, inks.reference)));
        }
        edges.extend(self.signal.map(|t| (t, inks.signal)));
        edges.retain(|(t, _)| frame.x.unit(*t) > -0.002 && frame.x.unit(*t) < 1.002);
        edges.sort_by(|a, b| a.0.total_cmp(&b.0));
        let words: Vec<String> = edges
            .iter()
            .map(|(t, _)| format!("{} s", text::number(*t, 2)))
            .collect();
        let widths: Vec<f64> = words
            .iter()
            .map(|w| text::bold_width(w, TICK) + 5.0)
            .collect();
        let at: Vec<f64> = edges.iter().map(|(t, _)| frame.px(*t)).collect();
        let apart = apart(&at, &widths, pen.w);
        for (i, (_, ink)) in edges.iter().enumerate() {
            pen.down(at[i], frame.top, frame.bottom + 4.0, *ink, 1.5)?;
            let word = Word::new(TICK, *ink).bold().at(At::Middle);
            pen.word(&words[i], (apart[i], frame.bottom + 44.0), word)?;
        }
        Ok(())
    }

    pub(super) fn captions<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let slate = Word::new(TICK, pen.inks.slate);
        let whose = self.end.map_or("component 1", End::first);
        let whose = format!("Power of {whose} against its reference mean, dB");
        let said: &[&str] = match self.of {
            Of::Average => &[
                "Average of the component, in its own unit",
                "Average, own unit",
            ],
            _ if self.t_s.is_empty() => &["The two windows around the event"],
            Of::Windows => &[
                &whose,
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

/// Moves the middles of neighbours, in order, until none overlaps, each pair by equal parts.
fn apart(at: &[f64], widths: &[f64], end: f64) -> Vec<f64> {
    let mut placed = at.to_vec();
    for _ in 0..60 {
        for i in 1..placed.len() {
            let need = (widths[i - 1] + widths[i]) / 2.0 - (placed[i] - placed[i - 1]);
            if need > 0.0 {
                placed[i - 1] -= need / 2.0;
                placed[i] += need / 2.0;
            }
        }
        for (x, wide) in placed.iter_mut().zip(widths) {
            *x = x.min(end - wide / 2.0).max(wide / 2.0);
        }
    }
    placed
}
