//! Coordinates between pixels for backends that only know whole ones.
use plotters_backend::{
    BackendColor, BackendCoord, BackendStyle, BackendTextStyle, DrawingBackend, DrawingErrorKind,
    FontFamily, FontStyle, FontTransform, text_anchor,
};

/// A backend that claims to be `finer` times as large as the one inside.
///
/// Backends take whole numbers, so a curve on a plain screen climbs in stairs. Here it is drawn on a grid `finer` times as
/// dense, and whoever owns the surface shrinks it again: a canvas by `setTransform(1/finer, 0, 0, 1/finer, 0, 0)`, an SVG by
/// its `viewBox`.
pub struct Fine<DB> {
    inner: DB,
    finer: u32,
    text: f64,
}

impl<DB: DrawingBackend> Fine<DB> {
    /// `finer` units in each pixel of `inner`, in both directions.
    pub fn new(inner: DB, finer: u32) -> Self {
        Fine {
            inner,
            finer: finer.max(1),
            text: 1.0,
        }
    }

    /// Text sizes are multiplied by `factor` before they reach the backend inside, for one that sizes text in its own way.
    pub fn text_factor(mut self, factor: f64) -> Self {
        self.text = factor;
        self
    }
}

struct Sized<'a, S>(&'a S, f64);

impl<S: BackendTextStyle> BackendTextStyle for Sized<'_, S> {
    type FontError = S::FontError;
    fn color(&self) -> BackendColor {
        self.0.color()
    }
    fn size(&self) -> f64 {
        self.0.size() * self.1
    }
    fn transform(&self) -> FontTransform {
        self.0.transform()
    }
    fn style(&self) -> FontStyle {
        self.0.style()
    }
    fn anchor(&self) -> text_anchor::Pos {
        self.0.anchor()
    }
    fn family(&self) -> FontFamily<'_> {
        self.0.family()
    }
    fn layout_box(&self, text: &str) -> Result<((i32, i32), (i32, i32)), Self::FontError> {
        self.0.layout_box(text)
    }
    fn draw<E, DrawFunc: FnMut(i32, i32, BackendColor) -> Result<(), E>>(
        &self,
        text: &str,
        pos: BackendCoord,
        draw: DrawFunc,
    ) -> Result<Result<(), E>, Self::FontError> {
        self.0.draw(text, pos, draw)
    }
}

type Done<DB> = Result<(), DrawingErrorKind<<DB as DrawingBackend>::ErrorType>>;

impl<DB: DrawingBackend> DrawingBackend for Fine<DB> {
    type ErrorType = DB::ErrorType;

    fn get_size(&self) -> (u32, u32) {
        let (width, height) = self.inner.get_size();
        (width * self.finer, height * self.finer)
    }
    fn ensure_prepared(&mut self) -> Done<DB> {
        self.inner.ensure_prepared()
    }
    fn present(&mut self) -> Done<DB> {
        self.inner.present()
    }
    fn draw_pixel(&mut self, point: BackendCoord, color: BackendColor) -> Done<DB> {
        self.inner.draw_pixel(point, color)
    }
    fn draw_line<S: BackendStyle>(
        &mut self,
        from: BackendCoord,
        to: BackendCoord,
        style: &S,
    ) -> Done<DB> {
        self.inner.draw_line(from, to, style)
    }
    fn draw_rect<S: BackendStyle>(
        &mut self,
        upper_left: BackendCoord,
        bottom_right: BackendCoord,
        style: &S,
        fill: bool,
    ) -> Done<DB> {
        self.inner.draw_rect(upper_left, bottom_right, style, fill)
    }
    fn draw_path<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        path: I,
        style: &S,
    ) -> Done<DB> {
        self.inner.draw_path(path, style)
    }
    fn draw_circle<S: BackendStyle>(
        &mut self,
        center: BackendCoord,
        radius: u32,
        style: &S,
        fill: bool,
    ) -> Done<DB> {
        self.inner.draw_circle(center, radius, style, fill)
    }
    fn fill_polygon<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        vert: I,
        style: &S,
    ) -> Done<DB> {
        self.inner.fill_polygon(vert, style)
    }
    fn draw_text<S: BackendTextStyle>(
        &mut self,
        text: &str,
        style: &S,
        pos: BackendCoord,
    ) -> Done<DB> {
        self.inner.draw_text(text, &Sized(style, self.text), pos)
    }
}
