//! Writes a first corpus for every target: `cargo run --example seeds` fills `corpus/TARGET/`.
use std::{fs, io};
use teasel_core::recording::edf;
use teasel_core::takeaway::{link_encode, recipe_from_json};
use teasel_fuzz::{packed, seed, small};

const RECIPE: &str = r#"{"teasel_recipe":1,"recording":{"rate_hz":250,"unit":"uV","axes":"channels,samples"},"channels":{"leave_out":["ECG"],"reference":"average"},"filter":{"high_pass_hz":1,"notch_hz":[50]},"keep":"best","measure":"typical","contrast":{"kind":"windows","signal":{"event":"buoy","from_s":0.2,"to_s":1},"reference":{"event":"buoy","from_s":-1,"to_s":-0.2}},"shrink":0.1,"components":4,"evidence":{"folds":5,"seed":1}}"#;
const TABLE: &str =
    "time,Fz (uV),\"C,z\",trigger\n0,1.5,2,0\n0.004,NaN,-2e3,7\n0.008,3,4,\n# half\n0.012,5,6,7\n";
const COMMAS: &str = "sample;a;b\r\n0;1,5;2,5\r\n1;2,5;3,5\r\n2;-1;0\r\n";
const EVENTS: &str =
    "onset\tduration\ttrial_type\tvalue\n0.5\t0\tbuoy\t1\n1.5\t1\t\"a b\"\t2\nn/a\tn/a\tn/a\tn/a\n";
const SIDES: [&str; 4] = [
    "\0name\ttype\tunits\tstatus\nC0\tEEG\tuV\tgood\nC1\tEOG\tmV\tbad\n",
    "\u{1}name\tx\ty\tz\nC0\t-0.08\t0\t0.04\nC1\tn/a\tn/a\tn/a\n",
    "\u{2}{\"EEGCoordinateSystem\":\"Other\",\"EEGCoordinateUnits\":\"mm\",\"AnatomicalLandmarkCoordinates\":{\"NAS\":[0,90,0],\"LPA\":[-80,0,0],\"RPA\":[80,0,0]}}",
    "\u{3}{\"SamplingFrequency\":250,\"PowerLineFrequency\":50,\"EEGReference\":\"Cz\"}",
];

fn main() -> io::Result<()> {
    let mut gaps = seed(2, 40);
    gaps.stretches[0].count = 20;
    gaps.stretches.push(teasel_core::recording::Stretch {
        first: 20,
        count: 20,
        onset_s: 5.0,
    });
    let link =
        |names| recipe_from_json(RECIPE).map_or_else(|p| p.to_string(), |r| link_encode(&r, names));
    let seeds: &[(&str, Vec<Vec<u8>>)] = &[
        ("edf", vec![small(), written(&gaps)]),
        ("bdf", vec![wide(&seed(2, 10)), wide(&gaps)]),
        ("table", [TABLE, COMMAS, "1,2\n3,4\n"].map(Vec::from).to_vec()),
        ("gzip", vec![packed(TABLE.as_bytes()), packed(&small()), TABLE.into()]),
        ("recipe", vec![RECIPE.into()]),
        ("link", vec![link(true).into(), link(false).into()]),
        ("weights", vec![b"{\"teasel_weights\":1,\"channels\":[{\"name\":\"A\",\"unit\":\"uV\"}],\"rate_hz\":250,\"filters\":[[1]],\"patterns\":[[1]],\"ratios\":[1]}".to_vec()]),
        ("events", vec![EVENTS.into()]),
        ("sides", SIDES.map(Vec::from).to_vec()),
    ];
    // Arrays and stacks made by general libraries, beside the checks.
    for target in ["npy", "npz", "mat", "tiff"] {
        let folder = format!("corpus/{target}");
        fs::create_dir_all(&folder)?;
        for entry in fs::read_dir("../tests/reference/arrays")? {
            let path = entry?.path();
            let ending = path
                .extension()
                .and_then(|e| e.to_str())
                .unwrap_or_default();
            if target.starts_with(ending)
                && let Some(name) = path.file_name()
            {
                fs::copy(&path, format!("{folder}/{}", name.to_string_lossy()))?;
            }
        }
    }
    for (target, files) in seeds {
        let folder = format!("corpus/{target}");
        fs::create_dir_all(&folder)?;
        for (index, bytes) in files.iter().enumerate() {
            fs::write(format!("{folder}/seed-{index}"), bytes)?;
        }
    }
    Ok(())
}

fn written(recording: &teasel_core::recording::Recording) -> Vec<u8> {
    edf::write(recording, &edf::Identity::default()).unwrap_or_default()
}

fn wide(recording: &teasel_core::recording::Recording) -> Vec<u8> {
    edf::write_24_bit(recording, &edf::Identity::default()).unwrap_or_default()
}
