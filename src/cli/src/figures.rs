//! Every figure of a sheet as SVG, in the light scheme and the size of the report.
use teasel_core::sheet::Sheet;
use teasel_figures::{Look, from_sheet, height, names, report_width, svg};

/// Name, caption and SVG of every figure that the sheet gives.
pub fn drawings(sheet: &Sheet) -> Vec<(String, String, String)> {
    let look = Look::default();
    names(sheet)
        .into_iter()
        .filter_map(|(name, caption)| {
            let figure = from_sheet(sheet, &name)?;
            let width = report_width(&name);
            let drawn = svg(&figure, width, height(&figure, width), &look);
            Some((name, caption, drawn))
        })
        .collect()
}
