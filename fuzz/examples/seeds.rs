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
    ];
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
