//! A pattern on a plane: squares where the electrodes form a regular grid, a smooth surface within the outermost of them elsewhere.
use super::make::PLANE_EXTENT;
use super::surface::View;
use super::{KEY, Map};
use crate::inks::{Ramp, step};
use crate::pen::{Drawn, Pen, Point};
use plotters_backend::DrawingBackend;

/// Room around the outermost electrodes of a surface, in units of the ground.
const RIM: f64 = 0.06;
/// Room beside the map and above it, in pixels.
const MARGIN: f64 = 10.0;

/// Room around the outermost electrodes, across and upwards.
fn rim(pitch: Option<[f64; 2]>) -> [f64; 2] {
    pitch.map_or([RIM; 2], |p| p.map(|step| step / 2.0))
}

/// Height of the map alone at a figure's width.
pub(super) fn height(width: f64, half: [f64; 2], pitch: Option<[f64; 2]>) -> f64 {
    let rim = rim(pitch);
    let scale = (width / 2.0 - MARGIN) / (half[0] + rim[0]).max(0.35);
    let tall = 2.0 * scale * (half[1] + rim[1]) + MARGIN;
    tall.clamp(60.0, width * 1.2)
}

impl Map {
    pub(super) fn plane_map<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        half: [f64; 2],
        pitch: Option<[f64; 2]>,
        hull: &[[f64; 2]],
        ramp: &Ramp,
    ) -> Drawn<DB> {
        let rim = rim(pitch);
        let (margin, foot) = match self.small {
            true => (2.0, 2.0),
            false => (MARGIN, KEY + if self.note().is_some() { 18.0 } else { 4.0 }),
        };
        let wide = (pen.w / 2.0 - margin) / (half[0] + rim[0]);
        let tall = (pen.h - foot - margin) / 2.0 / (half[1] + rim[1]);
        let view = View {
            centre: (pen.w / 2.0, margin + (pen.h - foot - margin) / 2.0),
            scale: wide.min(tall).max(1.0),
            extent: PLANE_EXTENT,
        };
        match pitch {
            Some(pitch) => self.squares(pen, view, pitch, ramp)?,
            None => self.sheet_of(pen, view, hull, ramp)?,
        }
        if self.small {
            return Ok(());
        }
        let (left, top) = view.to((-half[0] - rim[0], half[1] + rim[1]));
        let (right, bottom) = view.to((half[0] + rim[0], -half[1] - rim[1]));
        let fits = |a: &[f64; 4]| a[0] >= left && a[1] >= top && a[2] <= right && a[3] <= bottom;
        let under = |p: Point| match pitch {
            Some(pitch) => self.square_at(p, pitch),
            None => self.grid_at(p, PLANE_EXTENT),
        };
        self.dots(pen, view, ramp, right - left, fits, under)?;
        self.say_note(pen)
    }

    /// One square an electrode; a place without one stays empty.
    fn squares<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        view: View,
        pitch: [f64; 2],
        ramp: &Ramp,
    ) -> Drawn<DB> {
        let limit = self.limit();
        for (place, value) in self.places.iter().zip(&self.values) {
            let Some([x, y]) = *place else {
                continue;
            };
            if !value.is_finite() {
                continue;
            }
            let from = view.to((x - pitch[0] / 2.0, y + pitch[1] / 2.0));
            let to = view.to((x + pitch[0] / 2.0, y - pitch[1] / 2.0));
            pen.rect(from, to, ramp[step(*value, limit)])?;
            if !self.small {
                pen.frame(from, (to.0 + 1.0, to.1 + 1.0), pen.inks.rule)?;
            }
        }
        Ok(())
    }

    fn square_at(&self, (x, y): Point, pitch: [f64; 2]) -> f64 {
        let inside =
            |p: &[f64; 2]| (p[0] - x).abs() <= pitch[0] / 2.0 && (p[1] - y).abs() <= pitch[1] / 2.0;
        let at = self
            .places
            .iter()
            .position(|p| p.as_ref().is_some_and(inside));
        at.map_or(0.0, |i| self.values[i])
    }

    /// The surface within the outermost electrodes, and the line around them.
    fn sheet_of<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        view: View,
        hull: &[[f64; 2]],
        ramp: &Ramp,
    ) -> Drawn<DB> {
        let border: Vec<Point> = hull.iter().map(|p| (p[0], p[1])).collect();
        self.surface(pen, view, &border, ramp)?;
        let mut line: Vec<Point> = border.iter().map(|p| view.to(*p)).collect();
        line.extend(line.first().copied());
        pen.path(&line, pen.inks.line, 1.0)
    }
}
