//! The head seen from above, and the channels on it.
use crate::look::see_through;
use crate::pen::{At, Drawn, Pen, Point, SMALL, Word};
use crate::table::{Table, cell};
use crate::topography::flat;
use crate::{Plot, text};
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use std::f64::consts::{PI, TAU};
use teasel_core::sheet::{ChannelState, Sheet};

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

/// See [`crate::Figure::ChannelsMap`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ChannelsMap {
    /// Channels with a position.
    pub spots: Vec<Spot>,
    /// Names of those without one.
    pub nowhere: Vec<String>,
}

/// One channel on the head.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Spot {
    /// Label.
    pub name: String,
    /// On the plane: right, front; 1 is the circle of Fpz, T7, Oz, T8.
    pub at: [f64; 2],
    /// What became of it.
    pub mark: Mark,
}

impl ChannelsMap {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let spots: Vec<Spot> = sheet
            .channels
            .iter()
            .filter_map(|c| {
                let at = flat(c.position?);
                let whole = at.iter().all(|v| v.is_finite());
                whole.then(|| Spot {
                    name: c.name.clone(),
                    at,
                    mark: Mark::of(&c.state),
                })
            })
            .collect();
        let without = sheet.channels.iter().filter(|c| c.position.is_none());
        (!spots.is_empty()).then(|| ChannelsMap {
            spots,
            nowhere: without.map(|c| c.name.clone()).collect(),
        })
    }

    /// Names that find room inside the head; those of channels with a mark of their own always.
    fn names<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        centre: Point,
        radius: f64,
        dots: &[Point],
        r: f64,
    ) -> Drawn<DB> {
        let mut places = Places::around(dots, r + 1.0);
        let mut only_words = Places::around(&[], 0.0);
        let odd = |i: &usize| self.spots[*i].mark != Mark::Dot;
        let crowded = self.spots.len() as f64 > 40.0 * (radius / 105.0).powi(2);
        let mut order: Vec<usize> = (0..self.spots.len())
            .filter(|i| odd(i) || !crowded)
            .collect();
        order.sort_by_key(|i| !odd(i));
        for i in order {
            let ink = if odd(&i) {
                pen.inks.ink
            } else {
                pen.inks.slate
            };
            let said = text::fit(
                &self.spots[i].name,
                SMALL,
                if odd(&i) { 90.0 } else { 34.0 },
            );
            let size = (text::width(&said, SMALL), 11.0);
            let gap = if odd(&i) { r + 2.0 } else { r };
            let inside = |area: &Area| within(area, centre, radius - 1.0);
            let on_sheet = |area: &Area| {
                area[0] >= 0.0 && area[2] <= pen.w && area[1] >= 0.0 && area[3] <= pen.h
            };
            let mut place = places.near(dots[i], size, gap, inside);
            if odd(&i) && place.is_none() {
                place = only_words.near(dots[i], size, gap, on_sheet);
                if let Some((_, _, area)) = place {
                    let ground = see_through(pen.inks.plate, 0.85);
                    pen.rect((area[0], area[1]), (area[2], area[3]), ground)?;
                }
            }
            if let Some((at, side, _)) = place {
                pen.word(&said, at, Word::new(SMALL, ink).at(side))?;
            }
        }
        Ok(())
    }

    fn note(&self) -> Option<String> {
        let n = self.nowhere.len();
        (n > 0).then(|| format!("{} without a position", text::count(n, "channel")))
    }
}

/// Left, top, right, bottom.
pub(crate) type Area = [f64; 4];

/// Names beside dots, placed one after another where nothing stands yet.
pub(crate) struct Places {
    taken: Vec<Area>,
}

impl Places {
    pub(crate) fn around(dots: &[Point], r: f64) -> Self {
        let taken = dots.iter().map(|(x, y)| [x - r, y - r, x + r, y + r]);
        Places {
            taken: taken.collect(),
        }
    }

    /// A place for a word of this width and height near a dot: below, above, right or left of it, where `fits` holds.
    pub(crate) fn near(
        &mut self,
        (x, y): Point,
        (wide, high): (f64, f64),
        r: f64,
        fits: impl Fn(&Area) -> bool,
    ) -> Option<(Point, At, Area)> {
        let half = wide / 2.0;
        let tries = [
            ((x, y + r + high / 2.0 + 1.0), At::Middle, x - half),
            ((x, y - r - high / 2.0 - 1.0), At::Middle, x - half),
            ((x + r + 3.0, y), At::Left, x + r + 3.0),
            ((x - r - 3.0, y), At::Right, x - r - 3.0 - wide),
        ];
        for (at, side, left) in tries {
            let mine = [left, at.1 - high / 2.0, left + wide, at.1 + high / 2.0];
            let apart =
                |o: &Area| mine[0] >= o[2] || o[0] >= mine[2] || mine[1] >= o[3] || o[1] >= mine[3];
            if fits(&mine) && self.taken.iter().all(apart) {
                self.taken.push(mine);
                return Some((at, side, mine));
            }
        }
        None
    }
}

/// Whether an area lies wholly inside a circle.
pub(crate) fn within(area: &Area, centre: Point, radius: f64) -> bool {
    let corners = [
        (area[0], area[1]),
        (area[2], area[1]),
        (area[0], area[3]),
        (area[2], area[3]),
    ];
    corners
        .iter()
        .all(|(x, y)| (x - centre.0).hypot(y - centre.1) <= radius)
}

impl Plot for ChannelsMap {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let note = self.note();
        let foot = if note.is_some() { 20.0 } else { 4.0 };
        let far = self
            .spots
            .iter()
            .map(|s| s.at[0].hypot(s.at[1]))
            .fold(1.0, f64::max)
            + 0.12;
        let radius = (pen.w / 2.0 - 14.0)
            .min((pen.h - foot - 6.0) / (2.0 + NOSE))
            .max(10.0);
        let centre = (pen.w / 2.0, 4.0 + radius * (1.0 + NOSE));
        outline(pen, centre, radius, pen.inks.ink, 1.2)?;
        let place = |s: &Spot| {
            (
                centre.0 + s.at[0] / far * radius,
                centre.1 - s.at[1] / far * radius,
            )
        };
        let dots: Vec<Point> = self.spots.iter().map(place).collect();
        let r = if self.spots.len() > 70 { 2.6 } else { 4.0 };
        for (spot, at) in self.spots.iter().zip(&dots) {
            spot.mark.draw(pen, *at, r)?;
        }
        self.names(pen, centre, radius, &dots, r)?;
        if let Some(note) = note {
            let word = Word::new(SMALL, pen.inks.slate).at(At::Middle);
            pen.word(&note, (pen.w / 2.0, pen.h - 8.0), word)?;
        }
        Ok(())
    }

    fn height(&self, width: u32) -> u32 {
        let head = f64::from(width.min(360)) / 2.0 - 14.0;
        (head * (2.0 + NOSE) + if self.nowhere.is_empty() { 10.0 } else { 26.0 }) as u32
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&["channel", "right", "front", "state"]);
        for spot in &self.spots {
            let name = text::clean(&spot.name);
            table.row([
                name,
                cell(spot.at[0]),
                cell(spot.at[1]),
                spot.mark.word().to_owned(),
            ]);
        }
        for name in &self.nowhere {
            table.row([
                text::clean(name),
                String::new(),
                String::new(),
                String::new(),
            ]);
        }
        table
    }

    fn spoken(&self) -> String {
        let odd = self.spots.iter().filter(|s| s.mark != Mark::Dot);
        let odd: Vec<String> = odd
            .map(|s| format!("{}: {}", s.name, s.mark.word()))
            .collect();
        let rest = if odd.is_empty() {
            "All are used".to_owned()
        } else {
            odd.join(", ")
        };
        format!(
            "Positions of {} on the head. {rest}.",
            text::count(self.spots.len(), "channel")
        )
    }
}
