//! The channels on what they lie on, and what became of each.
use crate::ground::{Ground, lay};
use crate::head::{Mark, NOSE, outline};
use crate::inks::see_through;
use crate::pen::{At, Drawn, Pen, Point, SMALL, Word};
use crate::places::{Area, Places, within};
use crate::table::{Table, cell};
use crate::{Plot, text};
use plotters::drawing::DrawingAreaErrorKind;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

/// See [`crate::Figure::ChannelsMap`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ChannelsMap {
    /// What they lie on.
    #[serde(default)]
    pub ground: Ground,
    /// Channels with a position.
    pub spots: Vec<Spot>,
    /// Names of those without one.
    pub nowhere: Vec<String>,
}

/// One channel on its ground.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Spot {
    /// Label.
    pub name: String,
    /// As the ground counts.
    pub at: [f64; 2],
    /// What became of it.
    pub mark: Mark,
}

impl ChannelsMap {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let shared = text::Shared::of(sheet.channels.iter().map(|c| c.name.as_str()));
        let positions: Vec<Option<[f64; 3]>> = sheet.channels.iter().map(|c| c.position).collect();
        let (ground, places) = lay(&sheet.recording.layout, &positions);
        let spots: Vec<Spot> = sheet
            .channels
            .iter()
            .zip(places)
            .filter_map(|(c, at)| {
                let at = at?;
                let whole = at.iter().all(|v| v.is_finite());
                whole.then(|| Spot {
                    name: shared.without(&c.name),
                    at,
                    mark: Mark::of(&c.state),
                })
            })
            .collect();
        let without = sheet.channels.iter().filter(|c| c.position.is_none());
        (!spots.is_empty()).then(|| ChannelsMap {
            ground,
            spots,
            nowhere: without.map(|c| c.name.clone()).collect(),
        })
    }

    /// Names that find room within the drawing; those of channels with a mark of their own always. `most` find room side by side.
    fn names<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        fits: impl Fn(&Area) -> bool,
        most: f64,
        dots: &[Point],
        r: f64,
    ) -> Drawn<DB> {
        let mut places = Places::around(dots, r + 1.0);
        let mut only_words = Places::around(&[], 0.0);
        let odd = |i: &usize| self.spots[*i].mark != Mark::Dot;
        let crowded = self.spots.len() as f64 > most;
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
            let on_sheet = |area: &Area| {
                area[0] >= 0.0 && area[2] <= pen.w && area[1] >= 0.0 && area[3] <= pen.h
            };
            let mut place = places.near(dots[i], size, gap, &fits);
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

/// The longer half side of a plane's drawing, or the length of a shaft's, in pixels.
const ROOM: f64 = 24.0;

impl ChannelsMap {
    fn on_head<DB: DrawingBackend>(&self, pen: &Pen<DB>, foot: f64) -> Drawn<DB> {
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
        let r = self.marks(pen, &dots)?;
        let fits = |area: &Area| within(area, centre, radius - 1.0);
        self.names(pen, fits, 40.0 * (radius / 105.0).powi(2), &dots, r)
    }

    fn on_plane<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        foot: f64,
        half: [f64; 2],
        pitch: Option<[f64; 2]>,
    ) -> Drawn<DB> {
        let (wide, tall) = (pen.w / 2.0 - ROOM, (pen.h - foot) / 2.0 - ROOM);
        let scale = (wide / half[0].max(0.05))
            .min(tall / half[1].max(0.05))
            .max(1.0);
        let centre = (pen.w / 2.0, (pen.h - foot) / 2.0);
        let place = |s: &Spot| (centre.0 + s.at[0] * scale, centre.1 - s.at[1] * scale);
        let dots: Vec<Point> = self.spots.iter().map(place).collect();
        let edge = |k: usize| scale * half[k] + ROOM - 4.0;
        let corner = |sign: f64| (centre.0 + sign * edge(0), centre.1 + sign * edge(1));
        let (from, to) = (corner(-1.0), corner(1.0));
        pen.frame(from, to, pen.inks.line)?;
        let r = self.marks(pen, &dots)?;
        let fits = |a: &Area| {
            a[0] > from.0 + 1.0 && a[1] > from.1 + 1.0 && a[2] < to.0 - 1.0 && a[3] < to.1 - 1.0
        };
        let most = pitch.map_or(60.0, |p| {
            if p[0].min(p[1]) * scale >= 26.0 {
                f64::INFINITY
            } else {
                0.0
            }
        });
        self.names(pen, fits, most, &dots, r)
    }

    fn on_line<DB: DrawingBackend>(&self, pen: &Pen<DB>, foot: f64) -> Drawn<DB> {
        let (top, bottom) = (16.0, pen.h - foot - 16.0);
        let x = pen.w / 2.0 - 20.0;
        pen.path(
            &[(x, top - 10.0), (x, bottom), (x, bottom + 10.0)],
            pen.inks.line,
            1.2,
        )?;
        let place = |s: &Spot| {
            (
                x,
                f64::midpoint(top, bottom) - s.at[1] * (bottom - top) / 2.0,
            )
        };
        let dots: Vec<Point> = self.spots.iter().map(place).collect();
        let r = self.marks(pen, &dots)?;
        let mut free = f64::NEG_INFINITY;
        let mut order: Vec<usize> = (0..dots.len()).collect();
        order.sort_by(|a, b| dots[*a].1.total_cmp(&dots[*b].1));
        for i in order {
            if dots[i].1 < free {
                continue;
            }
            free = dots[i].1 + 13.0;
            let word = Word::new(SMALL, pen.inks.slate).at(At::Left);
            pen.name(
                &self.spots[i].name,
                (x + r + 8.0, dots[i].1),
                pen.w / 2.0,
                word,
            )?;
        }
        Ok(())
    }

    /// Every channel's mark; its size.
    fn marks<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        dots: &[Point],
    ) -> Result<f64, DrawingAreaErrorKind<DB::ErrorType>> {
        let r = if self.spots.len() > 70 { 2.6 } else { 4.0 };
        for (spot, at) in self.spots.iter().zip(dots) {
            spot.mark.draw(pen, *at, r)?;
        }
        Ok(r)
    }
}

impl Plot for ChannelsMap {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let note = self.note();
        let foot = if note.is_some() { 20.0 } else { 4.0 };
        match &self.ground {
            Ground::Head => self.on_head(pen, foot)?,
            Ground::Plane { half, pitch, .. } => self.on_plane(pen, foot, *half, *pitch)?,
            Ground::Line { .. } => self.on_line(pen, foot)?,
        }
        if let Some(note) = note {
            let word = Word::new(SMALL, pen.inks.slate).at(At::Middle);
            pen.word(&note, (pen.w / 2.0, pen.h - 8.0), word)?;
        }
        Ok(())
    }

    fn height(&self, width: u32) -> u32 {
        let note = if self.nowhere.is_empty() { 10.0 } else { 26.0 };
        let width = f64::from(width.min(360));
        let body = match &self.ground {
            Ground::Head => (width / 2.0 - 14.0) * (2.0 + NOSE),
            Ground::Plane { half, .. } => {
                let scale = (width / 2.0 - ROOM) / half[0].max(0.35);
                (2.0 * (scale * half[1] + ROOM)).clamp(90.0, width * 1.3)
            }
            Ground::Line { .. } => (self.spots.len() as f64 * 15.0).clamp(140.0, 360.0),
        };
        (body + note) as u32
    }

    fn table(&self) -> Table {
        let mut table = {
            let [across, up] = self.ground.axes();
            Table::new(&["channel", across, up, "state"])
        };
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
            "Positions of {} {}. {rest}.",
            text::count(self.spots.len(), "channel"),
            self.ground.words()
        )
    }
}
