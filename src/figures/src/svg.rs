//! Figures as SVG files.
use crate::fine::Fine;
use crate::inks::Inks;
use crate::look::Look;
use crate::{Figure, draw, spoken};
use plotters::drawing::IntoDrawingArea;
use plotters_svg::SVGBackend;

/// Steps between two CSS pixels.
const FINE: u32 = 10;
/// The SVG backend divides text sizes by this.
const TEXT_FACTOR: f64 = 1.24;

/// The figure as an SVG document of `width` × `height` CSS pixels on an opaque ground; scheme and face are those of `look`.
pub fn svg(figure: &Figure, width: u32, height: u32, look: &Look) -> String {
    let (width, height) = (width.max(1), height.max(1));
    let look = Look {
        scale: 1.0,
        fine: FINE,
        ..look.clone()
    };
    let mut body = String::new();
    {
        let backend = SVGBackend::with_string(&mut body, (width, height));
        let area = Fine::new(backend, FINE)
            .text_factor(TEXT_FACTOR)
            .into_drawing_area();
        // Writing into a string cannot fail.
        let _ = area.fill(&Inks::of(look.scheme).plate);
        let _ = draw(figure, &area, &look);
        let _ = area.present();
    }
    finish(&body, width, height, figure, &look)
}

/// Gives the document its true size, a title and one face, and drops what says nothing.
fn finish(body: &str, width: u32, height: u32, figure: &Figure, look: &Look) -> String {
    let drawn = body.split_once(">\n").map_or("", |(_, rest)| rest);
    let face = escape(&look.face);
    let title = escape(&spoken(figure));
    let head = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width}\" height=\"{height}\" viewBox=\"0 0 {} {}\" role=\"img\" aria-label=\"{title}\" font-family=\"{face}\" stroke-linejoin=\"round\" stroke-linecap=\"butt\" style=\"font-variant-numeric:tabular-nums lining-nums\">\n<title>{title}</title>\n",
        width * FINE,
        height * FINE,
    );
    let lean = drawn
        .replace(" opacity=\"1\"", "")
        .replace("00000000000001\"", "\"")
        .replace(".\" fill", "\" fill")
        .replace(&format!(" font-family=\"{face}\""), "")
        .replace(" font-weight=\"bold\"", " font-weight=\"600\"")
        .replace(" stroke=\"none\"", "")
        .replace(" \"/>", "\"/>")
        .replace(">\n</text>", "></text>");
    let lean = tight_texts(&lean);
    format!("{head}{lean}")
}

/// The backend sets line breaks around every text; they would be read as part of it where white space is kept.
fn tight_texts(svg: &str) -> String {
    let mut out = String::with_capacity(svg.len());
    let mut inside = false;
    for line in svg.lines() {
        out.push_str(line);
        if line.starts_with("<text") {
            inside = true;
        } else if line.starts_with("</text>") {
            inside = false;
        }
        if !inside || line.ends_with("</text>") {
            out.push('\n');
        }
    }
    out
}

/// Text as it stands in an attribute or an element.
pub(crate) fn escape(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&apos;"),
            c => out.push(c),
        }
    }
    out
}
