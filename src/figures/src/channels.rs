//! How large every channel is, and how much mains hum is in it.
use crate::axis::{Axis, range};
use crate::frame::{Frame, LEFT, PlotBox, RIGHT};
use crate::head::Mark;
use crate::pen::{At, Drawn, Pen, SMALL, TICK, Word};
use crate::table::{Table, maybe};
use crate::{Plot, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::{ChannelState, Sheet};

/// Bars reach their full height at this many decibels.
const FULL_DB: f64 = 30.0;
/// A bar is dark from this many decibels above the middle channel on.
const DARK_DB: f64 = 10.0;
const TOP: f64 = 28.0;
const BARS: f64 = 32.0;
/// Between the stems and the tallest bar; a value may stand there.
const GAP: f64 = 20.0;

/// See [`crate::Figure::Channels`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Channels {
    /// The channels, in file order.
    pub stems: Vec<Stem>,
    /// The unit they share, if they do.
    pub unit: Option<String>,
    /// What the mains excess is about.
    pub mains_hz: Option<f64>,
}

/// One channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Stem {
    /// Label.
    pub name: String,
    /// Its unit.
    pub unit: String,
    /// Standard deviation, where it is a number above 0.
    pub sd: Option<f64>,
    /// Mains excess in dB.
    pub mains_db: Option<f64>,
    /// What became of it.
    pub mark: Mark,
    /// Why, where there is a reason.
    pub reason: String,
}

impl Channels {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let first = sheet.channels.first()?;
        let shared = sheet.channels.iter().all(|c| c.unit == first.unit);
        let names = text::Shared::of(sheet.channels.iter().map(|c| c.name.as_str()));
        let stems = sheet.channels.iter().map(|c| Stem {
            name: names.without(&c.name),
            unit: c.unit.clone(),
            sd: c.sd.filter(|v| v.is_finite()),
            mains_db: c.mains_db.filter(|v| v.is_finite()),
            mark: Mark::of(&c.state),
            reason: match &c.state {
                ChannelState::Unusable(why) | ChannelState::NeedsALook(why) => why.clone(),
                _ => String::new(),
            },
        });
        Some(Channels {
            stems: stems.collect(),
            unit: shared.then(|| first.unit.clone()),
            mains_hz: sheet.channels.iter().find_map(|c| c.mains_hz),
        })
    }

    fn has_mains(&self) -> bool {
        self.stems.iter().any(|s| s.mains_db.is_some())
    }

    fn names_room(&self) -> f64 {
        let longest = self
            .stems
            .iter()
            .map(|s| text::width(&text::clean(&s.name), SMALL));
        longest.fold(16.0, f64::max).min(84.0)
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let below = self.names_room()
            + 12.0
            + if self.has_mains() {
                BARS + GAP + 4.0
            } else {
                0.0
            };
        let sizes: Vec<f64> = self
            .stems
            .iter()
            .filter_map(|s| s.sd)
            .filter(|v| *v > 0.0)
            .collect();
        let (low, high) = range(&sizes).unwrap_or((1.0, 10.0));
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - below).max(TOP + 20.0),
            x: Axis::linear(-0.5, self.stems.len() as f64 - 0.5),
            y: Axis::log(low / 1.6, high * 1.5),
        }
    }

    fn stems<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame, pitch: f64) -> Drawn<DB> {
        let r = (pitch * 0.32).clamp(1.4, 4.0);
        for (i, stem) in self.stems.iter().enumerate() {
            let x = frame.px(i as f64);
            let y = stem
                .sd
                .filter(|v| *v > 0.0)
                .map_or(frame.bottom - r, |v| frame.py_inside(v));
            let out = stem.mark == Mark::Cross;
            if out {
                pen.dashed_rule((x, y), (x, frame.bottom), pen.inks.line, (2.0, 3.0))?;
            } else {
                pen.down(
                    x,
                    y,
                    frame.bottom,
                    pen.inks.line,
                    if pitch > 5.0 { 1.5 } else { 1.0 },
                )?;
            }
            stem.mark
                .draw(pen, (x, y), if out { r.max(3.0) } else { r })?;
        }
        Ok(())
    }

    fn mains<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame, pitch: f64) -> Drawn<DB> {
        let base = frame.bottom + GAP + BARS;
        let mut known: Vec<f64> = self.stems.iter().filter_map(|s| s.mains_db).collect();
        known.sort_by(f64::total_cmp);
        let middle = known.get(known.len() / 2).copied().unwrap_or(0.0);
        let full = known.last().copied().unwrap_or(0.0).max(FULL_DB);
        let half = (pitch * 0.3).clamp(0.5, 3.5);
        let mut used = f64::NEG_INFINITY;
        for (i, stem) in self.stems.iter().enumerate() {
            let Some(db) = stem.mains_db.filter(|db| *db > 0.0) else {
                continue;
            };
            let x = frame.px(i as f64);
            let strong = db > DARK_DB && db > middle + DARK_DB;
            let ink = if strong {
                pen.inks.ink
            } else {
                pen.inks.area()
            };
            let top = base - db / full * BARS;
            pen.rect((x - half, top), (x + half, base), ink)?;
            if strong && x > used + 2.0 {
                let said = text::decibels(db);
                let wide = text::width(&said, SMALL);
                let middle = x.min(pen.w - wide / 2.0);
                let word = Word::new(SMALL, pen.inks.ink).at(At::Middle);
                pen.word(&said, (middle, top - 8.0), word)?;
                used = middle + wide;
            }
        }
        pen.across(frame.left, frame.right, base, pen.inks.line, 1.0)?;
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        let hz = self
            .mains_hz
            .map_or("mains".to_owned(), |hz| format!("{} Hz", text::hertz(hz)));
        // Below this the larger of 50 and 60 Hz is a matter of chance.
        let words = if known.last().is_none_or(|most| *most < DARK_DB) {
            ["no mains".to_owned(), "found".to_owned()]
        } else {
            [hz, "excess".to_owned()]
        };
        pen.word(&words[0], (LEFT - 9.0, base - 30.0), word)?;
        pen.word(&words[1], (LEFT - 9.0, base - 16.0), word)?;
        Ok(())
    }

    fn names<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        top: f64,
        pitch: f64,
    ) -> Drawn<DB> {
        let room = self.names_room();
        let every = (12.5 / pitch).ceil().max(1.0) as usize;
        let odd = |i: usize| matches!(self.stems[i].mark, Mark::Ring | Mark::Cross);
        let near = |i: usize| {
            let from = i.saturating_sub(every - 1);
            (from..(i + every).min(self.stems.len())).any(|j| j != i && odd(j))
        };
        let mut last_odd: Option<usize> = None;
        for (i, stem) in self.stems.iter().enumerate() {
            let wanted = odd(i) && last_odd.is_none_or(|l| i - l >= every);
            if wanted {
                last_odd = Some(i);
            } else if i % every != 0 || near(i) && every > 1 {
                continue;
            }
            let ink = if odd(i) { pen.inks.ink } else { pen.inks.slate };
            let word = Word::new(SMALL, ink).at(At::Right).upward();
            pen.name(&stem.name, (frame.px(i as f64), top), room, word)?;
        }
        Ok(())
    }
}

impl Plot for Channels {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let pitch = (frame.right - frame.left) / self.stems.len().max(1) as f64;
        let unit = self.unit.as_deref().unwrap_or("each in its own unit");
        let caption = text::fit(&format!("Standard deviation, {unit}"), TICK, pen.w - 60.0);
        pen.word(&caption, (4.0, 9.0), Word::new(TICK, pen.inks.slate))?;
        let ticks = frame.y.size_ticks(5);
        let labels: Vec<String> = ticks.iter().map(|t| text::short(*t)).collect();
        frame.y_grid(pen, &ticks, &labels)?;
        self.stems(pen, &frame, pitch)?;
        let mut below = frame.bottom;
        if self.has_mains() {
            self.mains(pen, &frame, pitch)?;
            below += GAP + BARS;
        } else {
            pen.across(frame.left, frame.right, below, pen.inks.line, 1.0)?;
        }
        self.names(pen, &frame, below + 7.0, pitch)
    }

    fn height(&self, _width: u32) -> u32 {
        let below = self.names_room()
            + 12.0
            + if self.has_mains() {
                BARS + GAP + 4.0
            } else {
                0.0
            };
        (TOP + 150.0 + below) as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&[
            "channel",
            "unit",
            "standard_deviation",
            "mains_excess_dB",
            "state",
            "reason",
        ]);
        for s in &self.stems {
            table.row([
                text::clean(&s.name),
                text::clean(&s.unit),
                maybe(s.sd),
                maybe(s.mains_db),
                s.mark.word().to_owned(),
                text::clean(&s.reason),
            ]);
        }
        table
    }

    fn spoken(&self) -> String {
        format!(
            "Standard deviation and mains excess of {}, in recording order.",
            text::count(self.stems.len(), "channel")
        )
    }
}
