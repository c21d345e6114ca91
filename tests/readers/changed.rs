//! Every reader against bytes changed at random, cut, joined and repeated; and small files that claim to be huge.
//!
//! A reader is a row of [`READERS`]: its name and files that it reads. `fuzz/` looks deeper, for longer.
use super::packed::gz;
use super::plan::{Plan, signal, text};
use super::told;
use super::written::{event, recording};
use std::time::Instant;
use teasel_core::error::{Kind, Result};
use teasel_core::recording::{MemorySource, OpenOptions, Recording, SideFile, edf, open};
use teasel_core::takeaway::{Weights, link_decode, link_encode, recipe_from_json};
use teasel_tests::Lcg;

/// One reader: its name and the files that it is tried with.
type Row = (&'static str, fn() -> Vec<Vec<u8>>);

const READERS: &[Row] = &[
    ("EDF", edf_files),
    ("BDF", bdf_files),
    ("table", tables),
    ("gzip", packed_files),
];

/// Changes of every file.
const ROUNDS: usize = 2_000;

fn small() -> Recording {
    let stretches = [(20, 0.0), (20, 5.0)];
    let mut small = recording(10.0, &stretches, &[("A", "µV"), ("B", "fT")], |c, i| {
        (i * (c + 3)) as f32
    });
    small.events = vec![event(0.5, 0.0, "buoy"), event(5.5, 1.0, "swell")];
    small
}

fn edf_files() -> Vec<Vec<u8>> {
    let plain = Plan::new(vec![signal("Fz", 5), signal("Cz", 5)], 4).bytes();
    let lists = ["+0\x14\x14\0+0.5\x14a\x14\0", "+1\x14\x14\0"];
    let plus = Plan::new(vec![signal("Fz", 6), text(16)], 2)
        .with_lists("EDF+C", &lists)
        .bytes();
    vec![
        plain,
        plus,
        edf::write(&small(), &edf::Identity::default()).unwrap(),
    ]
}

fn bdf_files() -> Vec<Vec<u8>> {
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/reference/edf");
    let codes = std::fs::read(format!("{folder}/codes.bdf")).unwrap();
    vec![
        edf::write_24_bit(&small(), &edf::Identity::default()).unwrap(),
        codes,
    ]
}

fn tables() -> Vec<Vec<u8>> {
    let texts = [
        "time,Fz (uV),\"C,z\",trigger\n0,1.5,2,0\n0.004,NaN,-2e3,7\n0.008,3,4,\n# half\n0.012,5,6,7\n",
        "sample;a;b\r\n0;1,5;2,5\r\n1;2,5;3,5\r\n2;-1;0\r\n",
        "1\t2\n3\t4\n",
    ];
    texts.map(|text| text.as_bytes().to_vec()).to_vec()
}

fn packed_files() -> Vec<Vec<u8>> {
    edf_files()
        .iter()
        .chain(&tables())
        .map(|bytes| gz(bytes))
        .collect()
}

fn opened(bytes: &[u8], salvage: bool) -> Result<Recording> {
    let options = OpenOptions {
        salvage,
        given: told(10.0, "uV"),
    };
    let source = MemorySource::new("unknown", bytes.to_vec());
    open(Box::new(source), Vec::<SideFile>::new(), options)
}

/// Whatever comes out holds together; whatever does not is answered in words.
fn sane(name: &str, bytes: &[u8], salvage: bool) {
    match opened(bytes, salvage) {
        Ok(recording) => {
            let count = recording.sample_count();
            assert!(recording.samples.iter().all(|s| s.len() == count), "{name}");
            let covered: usize = recording.stretches.iter().map(|s| s.count).sum();
            assert_eq!(covered, count, "{name}");
            assert!(
                recording.rate_hz > 0.0 && recording.rate_hz.is_finite(),
                "{name}"
            );
            assert!(
                recording.events.iter().all(|e| e.onset_s.is_finite()),
                "{name}"
            );
        }
        Err(problem) => {
            let kinds = [
                Kind::Empty,
                Kind::Unknown,
                Kind::Damaged,
                Kind::Unsupported,
                Kind::TooLarge,
                Kind::NeedsAnswer,
            ];
            assert!(kinds.contains(&problem.kind), "{name}: {problem}");
            assert!(
                !problem.what.is_empty() && !problem.advice.is_empty(),
                "{name}"
            );
        }
    }
}

/// A few bytes exchanged, a piece repeated or taken out.
fn changed(bytes: &[u8], random: &mut Lcg) -> Vec<u8> {
    let mut out = bytes.to_vec();
    let mut at = |most: usize| (random.uniform() * most as f64) as usize;
    match at(8) {
        0 => out.truncate(at(bytes.len())),
        1 => {
            let from = at(bytes.len());
            let to = (from + at(40)).min(bytes.len());
            out.splice(from..to, []);
        }
        2 => {
            let from = at(bytes.len());
            let to = (from + at(40)).min(bytes.len());
            out.splice(to..to, bytes[from..to].to_vec());
        }
        _ => {
            for _ in 0..1 + at(5) {
                let digits = b"0123456789-+.,;eE \t\r\n\"\0\x14\x15\xff";
                let place = at(out.len());
                out[place] = match at(3) {
                    0 => at(256) as u8,
                    _ => digits[at(digits.len())],
                };
            }
        }
    }
    out
}

#[test]
fn every_reader_answers_changed_bytes() {
    let mut random = Lcg(303);
    for (name, files) in READERS {
        for bytes in files() {
            assert!(
                opened(&bytes, false).is_ok(),
                "{name}: {:?}",
                opened(&bytes, false).err()
            );
            for round in 0..ROUNDS {
                sane(name, &changed(&bytes, &mut random), round % 3 == 0);
            }
        }
    }
}

#[test]
fn every_reader_answers_a_cut_at_every_length() {
    for (name, files) in READERS {
        for bytes in files() {
            for length in 0..bytes.len() {
                sane(name, &bytes[..length], length % 2 == 0);
            }
        }
    }
}

#[test]
fn fifty_bytes_that_claim_ten_billion_samples() {
    // 100,000 channels of 100,000 samples, in 50 bytes of each format.
    let mut edf = format!("{:<8}{:<20}", "0", "100000 100000").into_bytes();
    edf.resize(50, b'9');
    let mut bdf = edf.clone();
    bdf[..8].copy_from_slice(b"\xffBIOSEMI");
    // The length at a packed file's end says 4 GB.
    let mut packed = gz(b"a,b\n1,2\n");
    let at = packed.len() - 4;
    packed[at..].copy_from_slice(&u32::MAX.to_le_bytes());
    packed.truncate(50);
    let table = b"a,b\n1e99999,100000\n100000,99999999999999999999999".to_vec();
    for (name, bytes) in [
        ("EDF", edf),
        ("BDF", bdf),
        ("gzip", packed),
        ("table", table),
    ] {
        let start = Instant::now();
        let problem = opened(&bytes, false).unwrap_err();
        assert!(
            matches!(problem.kind, Kind::Damaged | Kind::TooLarge),
            "{name}: {problem}"
        );
        assert!(start.elapsed().as_millis() < 200, "{name}");
    }
}

#[test]
fn recipes_links_and_weights_answer_changed_bytes() {
    const RECIPE: &str = r#"{"teasel_recipe":1,"recording":{"rate_hz":250,"unit":"uV"},"contrast":{"kind":"windows","signal":{"event":"buoy","from_s":0.2,"to_s":1},"reference":{"event":"buoy","from_s":-1,"to_s":-0.2}}}"#;
    const WEIGHTS: &str = r#"{"teasel_weights":1,"channels":[{"name":"A","unit":"uV"}],"rate_hz":250,"filters":[[1]],"patterns":[[1]],"ratios":[1]}"#;
    let link = link_encode(&recipe_from_json(RECIPE).unwrap(), true);
    let mut random = Lcg(7);
    let mut refused = 0;
    for _ in 0..4_000 {
        let text = |source: &str, random: &mut Lcg| {
            String::from_utf8_lossy(&changed(source.as_bytes(), random)).into_owned()
        };
        refused += usize::from(recipe_from_json(&text(RECIPE, &mut random)).is_err());
        refused += usize::from(link_decode(&text(&link, &mut random)).is_err());
        refused += usize::from(Weights::from_json(&text(WEIGHTS, &mut random)).is_err());
    }
    assert!(refused > 6_000);
}
