//! The head seen from above, and the marks of channels.
use crate::pen::{Drawn, Pen, Point};
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use std::f64::consts::{PI, TAU};
use teasel_core::sheet::ChannelState;

/// Room for the nose, in radii of the head.
pub(crate) const NOSE: f64 = 0.13;

/// A head of `radius` pixels about `centre`, with nose and ears.
pub(crate) fn outline<DB: DrawingBackend>(
    pen: &Pen<DB>,
    centre: Point,
    radius: f64,
    color: RGBAColor,
    width: f64,
) -> Drawn<DB> {
    let at = |angle: f64, r: f64| {
        (
            centre.0 + radius * r * angle.cos(),
            centre.1 - radius * r * angle.sin(),
        )
    };
    let circle: Vec<Point> = (0..=120)
        .map(|i| at(TAU * f64::from(i) / 120.0, 1.0))
        .collect();
    let nose = [
        at(PI / 2.0 + 0.125, 1.0),
        at(PI / 2.0, 1.0 + NOSE),
        at(PI / 2.0 - 0.125, 1.0),
    ];
    pen.path(&nose, color, width)?;
    for side in [1.0, -1.0] {
        let ear: Vec<Point> = (0..=24)
            .map(|i| {
                let along = f64::from(i) / 24.0;
                let y = 0.14 - 0.3 * along;
                let out = 0.075 * (PI * along.powf(0.8)).sin().max(0.0).sqrt();
                let x = (1.0 - y * y).sqrt() + out;
                (centre.0 + side * radius * x, centre.1 - radius * y)
            })
            .collect();
        pen.path(&ear, color, width)?;
    }
    pen.path(&circle, color, width)
}

/// What became of a channel, as a mark.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Mark {
    /// Used: a filled dot.
    Dot,
    /// Replaced by its neighbours: a filled dot in a ring.
    Ringed,
    /// Used and in need of a look: a ring.
    Ring,
    /// Not used: a cross.
    Cross,
}

impl Mark {
    pub(crate) fn of(state: &ChannelState) -> Mark {
        match state {
            ChannelState::Used => Mark::Dot,
            ChannelState::Interpolated => Mark::Ringed,
            ChannelState::NeedsALook(_) => Mark::Ring,
            ChannelState::LeftOut | ChannelState::Unusable(_) => Mark::Cross,
        }
    }

    pub(crate) fn word(self) -> &'static str {
        match self {
            Mark::Dot => "used",
            Mark::Ringed => "interpolated",
            Mark::Ring => "needs a look",
            Mark::Cross => "left out",
        }
    }

    pub(crate) fn draw<DB: DrawingBackend>(self, pen: &Pen<DB>, at: Point, r: f64) -> Drawn<DB> {
        let inks = pen.inks;
        match self {
            Mark::Dot => pen.dot(at, r, inks.ink),
            Mark::Ringed => {
                pen.ring(at, r + 1.8, inks.ink, 1.3, inks.plate)?;
                pen.dot(at, r * 0.6, inks.ink)
            }
            Mark::Ring => pen.ring(at, r + 1.5, inks.ink, 2.0, inks.plate),
            Mark::Cross => pen.cross(at, r + 0.6, inks.ink),
        }
    }
}
