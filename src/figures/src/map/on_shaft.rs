//! A pattern along a shaft: a bar at the depth of each contact.
use super::{KEY, Map};
use crate::axis::Axis;
use crate::inks::Ramp;
use crate::pen::{At, Drawn, Pen, SMALL, TICK, Word};
use crate::text;
use plotters_backend::DrawingBackend;

const LEFT: f64 = 54.0;
const TOP: f64 = 24.0;

/// Height of the map alone.
pub(super) fn height(contacts: usize) -> f64 {
    (contacts as f64 * 15.0).clamp(140.0, 420.0) + TOP + 8.0
}

/// Depths in a unit that reads well: unit, and how many of it make a metre.
fn unit(depth_m: [f64; 2]) -> (&'static str, f64) {
    if depth_m[1] - depth_m[0] < 5e-3 {
        ("µm", 1e6)
    } else {
        ("mm", 1e3)
    }
}

impl Map {
    pub(super) fn shaft<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        depth_m: [f64; 2],
        ramp: &Ramp,
    ) -> Drawn<DB> {
        let (left, right, top, bottom) = match self.small {
            true => (2.0, pen.w - 2.0, 4.0, pen.h - 4.0),
            false => {
                let foot = KEY + if self.note().is_some() { 18.0 } else { 4.0 };
                (LEFT, pen.w - 14.0, TOP, pen.h - foot - 8.0)
            }
        };
        let limit = self.limit();
        let y = |up: f64| f64::midpoint(top, bottom) - up * (bottom - top) / 2.0;
        let zero = f64::midpoint(left, right);
        let known: Vec<(usize, f64)> = (0..self.places.len())
            .filter_map(|i| self.places[i].map(|p| (i, p[1])))
            .filter(|(i, _)| self.values[*i].is_finite())
            .collect();
        let half = half_bar(&known, bottom - top);
        for (i, up) in &known {
            let x = zero + (right - zero) * self.values[*i] / limit;
            let at = y(*up);
            pen.rect(
                (zero, at - half),
                (x, at + half),
                self.bar_ink(pen, ramp, *i),
            )?;
        }
        pen.down(zero, top - half, bottom + half, pen.inks.line, 1.0)?;
        if self.small {
            return Ok(());
        }
        self.depth_axis(pen, depth_m, (left, top, bottom))?;
        let largest = self
            .order()
            .into_iter()
            .find_map(|i| known.iter().find(|k| k.0 == i));
        if let Some((i, up)) = largest {
            // The name stands on the empty side of its bar.
            let (x, at) = if self.values[*i] >= 0.0 {
                (zero - 6.0, At::Right)
            } else {
                (zero + 6.0, At::Left)
            };
            let room = zero - left - 10.0;
            pen.name(
                &self.names[*i],
                (x, y(*up)),
                room,
                Word::new(SMALL, pen.inks.ink).bold().at(at),
            )?;
        }
        self.say_note(pen)
    }

    fn depth_axis<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        depth_m: [f64; 2],
        (left, top, bottom): (f64, f64, f64),
    ) -> Drawn<DB> {
        let (name, per_m) = unit(depth_m);
        let axis = Axis::linear(depth_m[0] * per_m, depth_m[1] * per_m);
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        pen.down(left, top, bottom, pen.inks.line, 1.0)?;
        for tick in axis.ticks(((bottom - top) / 34.0).max(2.0) as usize) {
            let at = top + axis.unit(tick) * (bottom - top);
            pen.across(left - 4.0, left, at, pen.inks.line, 1.0)?;
            pen.word(&text::short(tick), (left - 7.0, at), word)?;
        }
        let said = format!("depth in {name}");
        pen.word(&said, (4.0, 8.0), Word::new(TICK, pen.inks.slate))
    }
}

/// Half the height of a bar: a third of the way to the nearest neighbour, at most 6 pixels.
fn half_bar(known: &[(usize, f64)], tall: f64) -> f64 {
    let mut ups: Vec<f64> = known.iter().map(|k| k.1).collect();
    ups.sort_by(f64::total_cmp);
    let gap = ups
        .windows(2)
        .map(|w| w[1] - w[0])
        .filter(|g| *g > 1e-9)
        .fold(2.0, f64::min);
    (gap * tall / 2.0 * 0.38).clamp(0.5, 6.0)
}
