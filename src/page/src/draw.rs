//! Figures on a canvas and as SVG; sizes are CSS pixels.
use crate::convert::{Outcome, from_js, thrown, to_js};
use plotters::drawing::IntoDrawingArea;
use plotters_canvas::CanvasBackend;
use teasel_core::error::{Kind, Problem};
use teasel_figures::{Figure, Fine, Look, Scheme};
use wasm_bindgen::prelude::wasm_bindgen;
use wasm_bindgen::{JsCast, JsValue};
use web_sys::{CanvasRenderingContext2d, HtmlCanvasElement};

/// Drawing units in a device pixel: a canvas takes whole numbers, and curves climb in stairs without.
const FINE: u32 = 8;

/// Sizes the canvas to `width × height` CSS pixels of `scale` device pixels, and draws.
#[wasm_bindgen(js_name = drawFigure)]
pub fn draw_figure(
    canvas: &HtmlCanvasElement,
    figure: JsValue,
    width: f64,
    height: f64,
    scale: f64,
    dark: bool,
) -> Outcome<()> {
    let figure: Figure = from_js(figure)?;
    let scheme = if dark { Scheme::Dark } else { Scheme::Light };
    let look = Look {
        scheme,
        scale,
        fine: FINE,
        ..Look::default()
    };
    canvas.set_width((width * scale).round() as u32);
    canvas.set_height((height * scale).round() as u32);
    let context: CanvasRenderingContext2d = canvas
        .get_context("2d")?
        .ok_or_else(no_canvas)?
        .dyn_into()
        .map_err(|_| no_canvas())?;
    let shrink = 1.0 / f64::from(FINE);
    context.set_transform(shrink, 0.0, 0.0, shrink, 0.0, 0.0)?;
    let backend = CanvasBackend::with_canvas_object(canvas.clone()).ok_or_else(no_canvas)?;
    let area = Fine::new(backend, FINE).into_drawing_area();
    teasel_figures::draw(&figure, &area, &look).map_err(|error| undrawn(&error.to_string()))
}

/// Natural height for a width.
#[wasm_bindgen(js_name = figureHeight)]
pub fn figure_height(figure: JsValue, width: u32) -> Outcome<u32> {
    Ok(teasel_figures::height(&from_js(figure)?, width))
}

/// Where the plot lies in the figure, or null: `{left, right, top, bottom, x0, x1, y0, y1}`.
#[wasm_bindgen(js_name = plotBox)]
pub fn plot_box(figure: JsValue, width: u32, height: u32) -> Outcome<JsValue> {
    to_js(&teasel_figures::plot_box(&from_js(figure)?, width, height))
}

/// The figure as an SVG file, in the light scheme.
#[wasm_bindgen(js_name = figureSvg)]
pub fn figure_svg(figure: JsValue, width: u32, height: u32) -> Outcome<String> {
    Ok(teasel_figures::svg(
        &from_js(figure)?,
        width,
        height,
        &Look::default(),
    ))
}

/// The numbers behind a figure: `{columns, rows}`.
#[wasm_bindgen(js_name = figureTable)]
pub fn figure_table(figure: JsValue) -> Outcome<JsValue> {
    to_js(&teasel_figures::table(&from_js(figure)?))
}

fn no_canvas() -> JsValue {
    undrawn("this browser gives no drawing context")
}

fn undrawn(why: &str) -> JsValue {
    thrown(Problem::new(
        Kind::Unsupported,
        format!("the figure could not be drawn: {why}"),
        "Try another browser.",
    ))
}
