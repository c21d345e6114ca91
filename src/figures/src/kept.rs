//! What the figures against the number of kept dimensions share: their axis, the ground of what is kept, the word at C.
use crate::axis::Axis;
use crate::frame::{Frame, LEFT, RIGHT};
use crate::pen::{At, Drawn, LABEL, Pen, Word};
use crate::text;
use plotters_backend::DrawingBackend;

pub(crate) const TOP: f64 = 40.0;
/// The axis of C, the same in both figures.
pub(crate) fn frame(width: f64, top: f64, bottom: f64, rank: usize, y: Axis) -> Frame {
    Frame {
        left: LEFT,
        right: width - RIGHT,
        top,
        bottom: bottom.max(top + 10.0),
        x: Axis::linear(1.0, rank.max(2) as f64),
        y,
    }
}

/// The ground of the kept dimensions and the line at C.
pub(crate) fn kept_ground<DB: DrawingBackend>(
    pen: &Pen<DB>,
    frame: &Frame,
    kept: usize,
) -> Drawn<DB> {
    let pitch = (frame.right - frame.left) / (frame.x.high - frame.x.low);
    let edge = (frame.px(kept as f64) + pitch / 2.0).min(frame.right);
    pen.rect((frame.left, frame.top), (edge, frame.bottom), pen.inks.wash)
}

/// A word beside the line at C, on the side where there is room.
pub(crate) fn beside_line<DB: DrawingBackend>(
    pen: &Pen<DB>,
    frame: &Frame,
    kept: usize,
    strong: &str,
    plain: &str,
) -> Drawn<DB> {
    let x = frame.px(kept as f64);
    let y = frame.top - 14.0;
    let (bold, rest) = (
        text::bold_width(strong, LABEL) + 7.0,
        text::width(plain, LABEL),
    );
    let word = Word::new(LABEL, pen.inks.ink);
    if x + 8.0 + bold + rest < pen.w {
        pen.word(strong, (x + 8.0, y), word.bold())?;
        pen.word(plain, (x + 8.0 + bold, y), word)
    } else if x - 8.0 - bold - rest > 0.0 {
        pen.word(strong, (x - 15.0 - rest, y), word.bold().at(At::Right))?;
        pen.word(plain, (x - 8.0, y), word.at(At::Right))
    } else if x + 8.0 + bold < pen.w {
        pen.word(strong, (x + 8.0, y), word.bold())
    } else {
        pen.word(strong, (x - 8.0, y), word.bold().at(At::Right))
    }
}
