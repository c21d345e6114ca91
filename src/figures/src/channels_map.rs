//! The channels on the head, and what became of each.
use crate::head::{Mark, NOSE, outline};
use crate::inks::see_through;
use crate::pen::{At, Drawn, Pen, Point, SMALL, Word};
use crate::places::{Area, Places, within};
use crate::table::{Table, cell};
use crate::topography::flat;
use crate::{Plot, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

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
        let shared = text::Shared::of(sheet.channels.iter().map(|c| c.name.as_str()));
        let spots: Vec<Spot> = sheet
            .channels
            .iter()
            .filter_map(|c| {
                let at = flat(c.position?);
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
