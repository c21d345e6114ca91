//! A pattern spread over the head.
use super::surface::View;
use super::{KEY, Map};
use crate::head::{NOSE, outline};
use crate::inks::Ramp;
use crate::pen::{Drawn, Pen};
use crate::places::within;
use crate::topography::circle;
use plotters_backend::DrawingBackend;
use teasel_core::describe::map::EXTENT;

impl Map {
    pub(super) fn head_map<DB: DrawingBackend>(&self, pen: &Pen<DB>, ramp: &Ramp) -> Drawn<DB> {
        let (r, top) = if self.small {
            let r = (pen.w / 2.0 - 3.0).min(pen.h / (2.0 + NOSE) - 1.5).max(4.0);
            (r, pen.h - 1.5 - 2.0 * r)
        } else {
            let foot = KEY + if self.note().is_some() { 18.0 } else { 4.0 };
            let r = (pen.w / 2.0 - 14.0)
                .min((pen.h - foot) / (2.0 + NOSE) - 2.0)
                .max(10.0);
            (r, 2.0 + r * NOSE)
        };
        let view = View {
            centre: (pen.w / 2.0, top + r),
            scale: r / self.radius,
            extent: EXTENT,
        };
        self.surface(pen, view, &circle(self.radius), ramp)?;
        let line = if self.small { 1.0 } else { 1.2 };
        outline(pen, view.centre, r, pen.inks.ink, line)?;
        if self.small {
            return Ok(());
        }
        let fits = |area: &_| within(area, view.centre, r - 2.0);
        self.dots(pen, view, ramp, r * 0.9, fits, |p| self.grid_at(p, EXTENT))?;
        self.say_note(pen)
    }
}
