//! JSON side files of the BIDS standard: `*_eeg.json` and its like about the recording, `*_coordsystem.json` about its electrodes.
//!
//! Only the keys below are read; whatever else such a file holds (persons, institutions, devices) is left where it is.
use super::table::{check, without_mark};
use crate::error::{Kind, Problem, Result};
use crate::recording::{SideFile, budget::size};
use serde_json::{Map, Value};

/// Longer than this is no side file of that kind.
const LARGEST: u64 = 4 << 20;

/// What a file about the recording says.
#[derive(Debug, Default, PartialEq)]
pub(super) struct Facts {
    /// `SamplingFrequency`.
    pub(super) rate_hz: Option<f64>,
    /// `PowerLineFrequency`.
    pub(super) mains_hz: Option<f64>,
    /// `EEGReference`, or `iEEGReference`.
    pub(super) reference: Option<String>,
}

/// What a file about electrodes' coordinates says.
#[derive(Debug, Default, PartialEq)]
pub(super) struct Coordinates {
    /// Metres in a unit; `None` where it is not said or is no length.
    pub(super) unit_m: Option<f64>,
    /// The coordinates are places in a picture.
    pub(super) pixels: bool,
    /// The coordinates are of electrodes on or in the brain.
    pub(super) inside: bool,
    /// Nasion, left and right point before the ear, in the same units.
    pub(super) landmarks: Option<[[f64; 3]; 3]>,
}

/// The object in a JSON side file.
pub(super) fn object(side: &SideFile) -> Result<Map<String, Value>> {
    let what = "the side file";
    check(side, what)?;
    if side.bytes.len() as u64 > LARGEST {
        return Err(Problem::new(
            Kind::TooLarge,
            "the side file is too large",
            "give the side file that belongs to the recording",
        )
        .in_file(side.name.as_str())
        .expected_found(
            format!("at most {}", size(LARGEST)),
            size(side.bytes.len() as u64),
        ));
    }
    let broken = |place: String, found: String| {
        Problem::new(
            Kind::Damaged,
            "the side file is not a JSON object",
            "correct it, or open the recording without it",
        )
        .in_file(side.name.as_str())
        .at(place)
        .expected_found("a JSON object", found)
    };
    match serde_json::from_slice(without_mark(&side.bytes)) {
        Ok(Value::Object(map)) => Ok(map),
        Ok(_) => Err(broken("line 1".into(), "another kind of JSON".into())),
        Err(e) => Err(broken(
            format!("line {}, column {}", e.line(), e.column()),
            e.to_string()
                .split(" at line ")
                .next()
                .unwrap_or_default()
                .to_owned(),
        )),
    }
}

fn wrong(side: &SideFile, key: &str, expected: &str, found: &Value) -> Problem {
    Problem::new(
        Kind::Damaged,
        format!("{key} of the side file makes no sense"),
        "correct it, or open the recording without the side file",
    )
    .in_file(side.name.as_str())
    .at(format!("key {key}"))
    .expected_found(expected, super::short(&found.to_string()))
}

/// A number of Hz; `None` where the key is missing, null or `n/a`.
fn hertz(side: &SideFile, map: &Map<String, Value>, key: &str) -> Result<Option<f64>> {
    match map.get(key) {
        None | Some(Value::Null) => Ok(None),
        Some(Value::String(word)) if word.eq_ignore_ascii_case("n/a") => Ok(None),
        Some(value) => match value.as_f64() {
            Some(hz) if hz > 0.0 && hz <= 1e7 => Ok(Some(hz)),
            _ => Err(wrong(side, key, "a number of Hz above 0, or n/a", value)),
        },
    }
}

/// Reads files about the recording, the most general first: a key of a later one counts.
pub(super) fn facts(sides: &[&SideFile]) -> Result<Facts> {
    let mut facts = Facts::default();
    for side in sides {
        let map = object(side)?;
        let reference = ["EEGReference", "iEEGReference"]
            .iter()
            .find_map(|key| map.get(*key)?.as_str())
            .filter(|word| !word.is_empty() && !word.eq_ignore_ascii_case("n/a"))
            .map(super::short);
        facts.rate_hz = hertz(side, &map, "SamplingFrequency")?.or(facts.rate_hz);
        facts.mains_hz = hertz(side, &map, "PowerLineFrequency")?.or(facts.mains_hz);
        facts.reference = reference.or(facts.reference);
    }
    Ok(facts)
}

/// Reads a file about coordinates.
pub(super) fn coordinates(side: &SideFile) -> Result<Coordinates> {
    let map = object(side)?;
    let word = |keys: &[&str]| {
        keys.iter()
            .find_map(|key| map.get(*key)?.as_str())
            .map(str::to_lowercase)
    };
    let unit = word(&[
        "EEGCoordinateUnits",
        "iEEGCoordinateUnits",
        "MEGCoordinateUnits",
    ]);
    let inside = map.keys().any(|key| key.starts_with("iEEGCoordinate"));
    let system = word(&["iEEGCoordinateSystem"]);
    let pixels = unit.as_deref() == Some("pixels") || system.as_deref() == Some("pixels");
    let unit_m = match unit.as_deref() {
        Some("m") => Some(1.0),
        Some("cm") => Some(1e-2),
        Some("mm") => Some(1e-3),
        _ => None,
    };
    Ok(Coordinates {
        unit_m,
        pixels,
        inside,
        landmarks: landmarks(&map),
    })
}

/// Nasion, left and right, where all three are given and do not lie on a line.
fn landmarks(map: &Map<String, Value>) -> Option<[[f64; 3]; 3]> {
    let all = map.get("AnatomicalLandmarkCoordinates")?.as_object()?;
    let point = |name: &str| -> Option<[f64; 3]> {
        let list = all.get(name)?.as_array()?;
        let mut out = [0.0; 3];
        for (value, place) in list.iter().zip(&mut out) {
            *place = value.as_f64()?;
        }
        (list.len() == 3).then_some(out)
    };
    Some([point("NAS")?, point("LPA")?, point("RPA")?])
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a failed reading is a failed check")]
    use super::*;

    fn side(text: &str) -> SideFile {
        SideFile {
            name: "a_eeg.json".into(),
            bytes: text.as_bytes().to_vec(),
        }
    }

    #[test]
    fn later_files_override_key_by_key() {
        let general = side(
            "{\"SamplingFrequency\": 500, \"PowerLineFrequency\": 60, \"EEGReference\": \"Cz\"}",
        );
        let own = side("\u{feff}{\"PowerLineFrequency\": 50, \"EEGReference\": \"n/a\"}");
        let told = facts(&[&general, &own]).unwrap();
        assert_eq!(told.rate_hz, Some(500.0));
        assert_eq!(told.mains_hz, Some(50.0));
        assert_eq!(told.reference.as_deref(), Some("Cz"));
    }

    #[test]
    fn broken_facts_name_their_place() {
        for (text, place) in [
            ("{\"SamplingFrequency\": ", "line 1, column 22"),
            ("[]", "line 1"),
            ("{\"SamplingFrequency\": -1}", "key SamplingFrequency"),
            (
                "{\"PowerLineFrequency\": \"fifty\"}",
                "key PowerLineFrequency",
            ),
        ] {
            let problem = facts(&[&side(text)]).unwrap_err();
            assert_eq!(problem.kind, Kind::Damaged);
            assert_eq!(problem.place.as_deref(), Some(place), "{problem}");
        }
    }
}
