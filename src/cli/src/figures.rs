//! Every figure of a sheet as SVG, in the light scheme and the size of the report.
use teasel_core::sheet::Sheet;
use teasel_figures::{Look, from_sheet, height, names, svg};

/// Width of a drawing in CSS pixels, by the end of its name; the report's column is 760 wide.
const WIDTHS: [(&str, u32); 8] = [
    ("map-small", 56),
    ("spectrum-small", 120),
    ("channels-map", 300),
    ("-map", 300),
    ("-filter", 300),
    ("alike", 320),
    ("alike-weaker", 320),
    ("", 760),
];

/// Name, caption and SVG of every figure that the sheet gives.
pub fn drawings(sheet: &Sheet) -> Vec<(String, String, String)> {
    let look = Look::default();
    names(sheet)
        .into_iter()
        .filter_map(|(name, caption)| {
            let figure = from_sheet(sheet, &name)?;
            let width = WIDTHS
                .iter()
                .find(|(end, _)| name.ends_with(end))
                .map_or(760, |(_, width)| *width);
            let drawn = svg(&figure, width, height(&figure, width), &look);
            Some((name, caption, drawn))
        })
        .collect()
}

/// Whether a figure says something by itself; small ones are parts of a table.
pub fn stands_alone(name: &str) -> bool {
    !(name.ends_with("-small") || name == "ratio-axis" || name.ends_with("-ratio"))
}
