//! Every figure of a sheet as SVG.
use teasel_core::sheet::Sheet;

/// Name, caption and SVG of every figure that the sheet gives.
pub fn drawings(_sheet: &Sheet) -> Vec<(String, String, String)> {
    Vec::new()
}

/// Whether a figure says something by itself; small ones are parts of a table.
pub fn stands_alone(name: &str) -> bool {
    !(name.ends_with("-small") || name == "ratio-axis" || name.ends_with("-ratio"))
}
