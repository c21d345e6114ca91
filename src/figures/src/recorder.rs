//! Drawings as lists of what was drawn.
//!
//! Every figure is drawn on a [`Recorder`] and played back on the backend that was asked for. So the code of a figure is compiled
//! for one backend, not for each: the page carries it once.
use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, IntoDrawingArea};
use plotters::element::{Drawable, PointCollection};
use plotters_backend::{
    BackendColor, BackendCoord, BackendStyle, BackendTextStyle, DrawingBackend, DrawingErrorKind,
    FontFamily, FontStyle, FontTransform, text_anchor,
};
use std::cell::RefCell;
use std::convert::Infallible;
use std::rc::Rc;

/// A colour and a width.
#[derive(Clone, Copy)]
struct Ink(BackendColor, u32);

impl Ink {
    fn of(style: &impl BackendStyle) -> Self {
        Ink(style.color(), style.stroke_width())
    }
}

impl BackendStyle for Ink {
    fn color(&self) -> BackendColor {
        self.0
    }
    fn stroke_width(&self) -> u32 {
        self.1
    }
}

/// How a text is set.
#[derive(Clone)]
struct Set {
    color: BackendColor,
    size: f64,
    bold: bool,
    transform: FontTransform,
    anchor: text_anchor::Pos,
    family: String,
}

impl BackendTextStyle for Set {
    type FontError = Infallible;
    fn color(&self) -> BackendColor {
        self.color
    }
    fn size(&self) -> f64 {
        self.size
    }
    fn transform(&self) -> FontTransform {
        self.transform.clone()
    }
    fn style(&self) -> FontStyle {
        if self.bold {
            FontStyle::Bold
        } else {
            FontStyle::Normal
        }
    }
    fn anchor(&self) -> text_anchor::Pos {
        self.anchor
    }
    fn family(&self) -> FontFamily<'_> {
        FontFamily::Name(&self.family)
    }
    /// Nothing here measures text: the figures estimate its width themselves.
    fn layout_box(&self, _: &str) -> Result<((i32, i32), (i32, i32)), Infallible> {
        Ok(((0, 0), (0, 0)))
    }
    fn draw<E, F: FnMut(i32, i32, BackendColor) -> Result<(), E>>(
        &self,
        _: &str,
        _: BackendCoord,
        _: F,
    ) -> Result<Result<(), E>, Infallible> {
        Ok(Ok(()))
    }
}

#[derive(Clone)]
enum Stroke {
    Pixel(BackendCoord, BackendColor),
    Line(BackendCoord, BackendCoord, Ink),
    Rect(BackendCoord, BackendCoord, Ink, bool),
    Path(Vec<BackendCoord>, Ink),
    Circle(BackendCoord, u32, Ink, bool),
    Polygon(Vec<BackendCoord>, Ink),
    Text(String, BackendCoord, Set),
}

/// A backend that keeps what is drawn on it.
pub struct Recorder {
    size: (u32, u32),
    strokes: Rc<RefCell<Vec<Stroke>>>,
}

/// Draws with `drawing` on a recorder of the size of `area`, then plays it back on `area`.
pub fn through<DB: DrawingBackend>(
    area: &DrawingArea<DB, Shift>,
    drawing: impl FnOnce(
        &DrawingArea<Recorder, Shift>,
    ) -> Result<(), plotters::drawing::DrawingAreaErrorKind<Infallible>>,
) -> Result<(), plotters::drawing::DrawingAreaErrorKind<DB::ErrorType>> {
    let strokes = Rc::new(RefCell::new(Vec::new()));
    let recorder = Recorder {
        size: area.dim_in_pixel(),
        strokes: Rc::clone(&strokes),
    };
    let drawn = drawing(&recorder.into_drawing_area());
    // A recorder itself never fails; what it was given before a mistake of the caller is played back all the same.
    debug_assert!(drawn.is_ok());
    let strokes = strokes.take();
    area.draw(&Played(strokes))
}

/// Strokes as one element whose only point is the corner of the area.
struct Played(Vec<Stroke>);

impl<'a> PointCollection<'a, BackendCoord> for &'a Played {
    type Point = BackendCoord;
    type IntoIter = std::iter::Once<BackendCoord>;
    fn point_iter(self) -> Self::IntoIter {
        std::iter::once((0, 0))
    }
}

impl<DB: DrawingBackend> Drawable<DB> for Played {
    fn draw<I: Iterator<Item = BackendCoord>>(
        &self,
        mut points: I,
        backend: &mut DB,
        _: (u32, u32),
    ) -> Result<(), DrawingErrorKind<DB::ErrorType>> {
        let (left, top) = points.next().unwrap_or((0, 0));
        let at = |p: &BackendCoord| (p.0 + left, p.1 + top);
        for stroke in &self.0 {
            match stroke {
                Stroke::Pixel(p, color) => backend.draw_pixel(at(p), *color)?,
                Stroke::Line(a, b, ink) => backend.draw_line(at(a), at(b), ink)?,
                Stroke::Rect(a, b, ink, fill) => backend.draw_rect(at(a), at(b), ink, *fill)?,
                Stroke::Path(path, ink) => backend.draw_path(path.iter().map(at), ink)?,
                Stroke::Circle(c, r, ink, fill) => backend.draw_circle(at(c), *r, ink, *fill)?,
                Stroke::Polygon(path, ink) => backend.fill_polygon(path.iter().map(at), ink)?,
                Stroke::Text(text, p, set) => backend.draw_text(text, set, at(p))?,
            }
        }
        Ok(())
    }
}

type Kept = Result<(), DrawingErrorKind<Infallible>>;

impl Recorder {
    fn keep(&mut self, stroke: Stroke) -> Kept {
        self.strokes.borrow_mut().push(stroke);
        Ok(())
    }
}

impl DrawingBackend for Recorder {
    type ErrorType = Infallible;

    fn get_size(&self) -> (u32, u32) {
        self.size
    }
    fn ensure_prepared(&mut self) -> Kept {
        Ok(())
    }
    fn present(&mut self) -> Kept {
        Ok(())
    }
    fn draw_pixel(&mut self, point: BackendCoord, color: BackendColor) -> Kept {
        self.keep(Stroke::Pixel(point, color))
    }
    fn draw_line<S: BackendStyle>(
        &mut self,
        from: BackendCoord,
        to: BackendCoord,
        style: &S,
    ) -> Kept {
        self.keep(Stroke::Line(from, to, Ink::of(style)))
    }
    fn draw_rect<S: BackendStyle>(
        &mut self,
        upper_left: BackendCoord,
        bottom_right: BackendCoord,
        style: &S,
        fill: bool,
    ) -> Kept {
        self.keep(Stroke::Rect(upper_left, bottom_right, Ink::of(style), fill))
    }
    fn draw_path<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        path: I,
        style: &S,
    ) -> Kept {
        let path = path.into_iter().collect();
        self.keep(Stroke::Path(path, Ink::of(style)))
    }
    fn draw_circle<S: BackendStyle>(
        &mut self,
        center: BackendCoord,
        radius: u32,
        style: &S,
        fill: bool,
    ) -> Kept {
        self.keep(Stroke::Circle(center, radius, Ink::of(style), fill))
    }
    fn fill_polygon<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        vert: I,
        style: &S,
    ) -> Kept {
        let path = vert.into_iter().collect();
        self.keep(Stroke::Polygon(path, Ink::of(style)))
    }
    fn draw_text<S: BackendTextStyle>(&mut self, text: &str, style: &S, pos: BackendCoord) -> Kept {
        let set = Set {
            color: style.color(),
            size: style.size(),
            bold: matches!(style.style(), FontStyle::Bold),
            transform: style.transform(),
            anchor: style.anchor(),
            family: style.family().as_str().to_owned(),
        };
        self.keep(Stroke::Text(text.to_owned(), pos, set))
    }
}
