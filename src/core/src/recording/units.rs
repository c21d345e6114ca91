//! Units of samples. Voltages become µV, everything else stays as it is written.

/// Factor to µV for a voltage, `None` for anything else. The sign for micro comes as `u`, as U+00B5 and as U+03BC.
pub(crate) fn to_microvolts(unit: &str) -> Option<f64> {
    match unit {
        "uV" | "µV" | "μV" | "uv" | "UV" | "microV" => Some(1.0),
        "V" | "v" => Some(1e6),
        "mV" | "mv" => Some(1e3),
        "nV" | "nv" => Some(1e-3),
        _ => None,
    }
}

/// A unit as it is kept, and the factor that brings the file's numbers to it.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Unit {
    /// `µV` for voltages, otherwise as written.
    pub(crate) name: String,
    /// Multiplies the numbers of the file.
    pub(crate) factor: f64,
}

impl Unit {
    /// The unit for what is written.
    pub(crate) fn of(written: &str) -> Unit {
        match to_microvolts(written) {
            Some(factor) => Unit {
                name: "µV".to_owned(),
                factor,
            },
            None => Unit {
                name: written.to_owned(),
                factor: 1.0,
            },
        }
    }
}
