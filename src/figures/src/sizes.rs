//! The size each figure has in reports and exports, so that its text is read at the size it was drawn for.

/// Width of a full figure: the report's column.
const FULL: u32 = 760;
/// Width of a figure that shares the column with another.
const HALF: u32 = 366;

/// Width in CSS pixels at which a report or an export draws the figure of this name: maps, filters and histograms two to a
/// column, those of a table small, all others as wide as the column.
pub fn report_width(name: &str) -> u32 {
    match name {
        "channels-map" | "alike" | "alike-weaker" => HALF,
        _ if name.ends_with("-map-small") => 56,
        _ if name.ends_with("-spectrum-small") => 120,
        _ if name.ends_with("-map") || name.ends_with("-filter") => HALF,
        _ => FULL,
    }
}

/// Whether the figure of this name says something by itself; small ones, the ratios of a table and their axis do not, and
/// are not exported.
pub fn stands_alone(name: &str) -> bool {
    !(name.ends_with("-small") || name == "ratio-axis" || name.ends_with("-ratio"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_of_a_pair_fit_it_and_parts_of_tables_stay_there() {
        assert!(2 * report_width("stronger-1-map") + 28 <= FULL);
        assert_eq!(report_width("weaker-2-map-small"), 56);
        assert_eq!(report_width("stronger-1-course"), FULL);
        assert!(stands_alone("beside") && stands_alone("weaker-3-map"));
        for part in ["ratio-axis", "stronger-1-ratio", "weaker-2-spectrum-small"] {
            assert!(!stands_alone(part), "{part}");
        }
    }
}
