//! Words on a figure.
use super::{Drawn, Pen, Point};
use crate::text;
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{FontStyle, FontTransform, RGBAColor, TextStyle};
use plotters_backend::DrawingBackend;

/// Where a word stands about its point.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum At {
    Left,
    Middle,
    Right,
}

/// A word's looks; its point is at half its height.
#[derive(Clone, Copy)]
pub(crate) struct Word {
    pub size: f64,
    pub color: RGBAColor,
    pub bold: bool,
    pub at: At,
    pub upward: bool,
}

impl Word {
    pub fn new(size: f64, color: RGBAColor) -> Self {
        Word {
            size,
            color,
            bold: false,
            at: At::Left,
            upward: false,
        }
    }
    pub fn bold(self) -> Self {
        Word { bold: true, ..self }
    }
    pub fn at(self, at: At) -> Self {
        Word { at, ..self }
    }
    /// Reads from below to above.
    pub fn upward(self) -> Self {
        Word {
            upward: true,
            ..self
        }
    }
}

/// Size of labels.
pub(crate) const LABEL: f64 = 12.5;

/// Size of ticks and captions of axes.
pub(crate) const TICK: f64 = 12.0;

/// Size where there is little room; nothing is smaller.
pub(crate) const SMALL: f64 = 11.0;

impl<DB: DrawingBackend> Pen<'_, DB> {
    /// Writes text as it is; names from a file go through [`text::fit`] before.
    pub fn word(&self, said: &str, at: Point, word: Word) -> Drawn<DB> {
        if said.is_empty() || !at.0.is_finite() || !at.1.is_finite() {
            return Ok(());
        }
        let weight = if word.bold {
            FontStyle::Bold
        } else {
            FontStyle::Normal
        };
        let side = match word.at {
            At::Left => HPos::Left,
            At::Middle => HPos::Center,
            At::Right => HPos::Right,
        };
        let size = word.size * self.look.units();
        let mut style = TextStyle::from((self.look.face.as_str(), size, weight))
            .color(&word.color)
            .pos(Pos::new(side, VPos::Center));
        if word.upward {
            style = style.transform(FontTransform::Rotate270);
        }
        self.area.draw_text(said, &style, self.point(at))
    }

    /// Writes a name from a file, shortened to `room` pixels.
    pub fn name(&self, said: &str, at: Point, room: f64, word: Word) -> Drawn<DB> {
        self.word(&text::fit(said, word.size, room), at, word)
    }
}
