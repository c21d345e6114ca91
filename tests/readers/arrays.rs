//! NPY, NPZ, MAT-files and TIFF stacks against the libraries that wrote them: NumPy, SciPy and tifffile (`reference/make_arrays.py`).
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recipe::{Axes, Given};
use teasel_core::recording::{Layout, MemorySource, OpenOptions, Opening, Recording, open};
use teasel_core::takeaway::archive;
use teasel_tests::Lcg;

const FOLDER: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/reference/arrays");

fn bytes_of(name: &str) -> Vec<u8> {
    let path = format!("{FOLDER}/{name}");
    std::fs::read(&path).unwrap_or_else(|e| panic!("{path}: {e}"))
}

/// 250 a second, in counts.
fn given(axes: Option<Axes>) -> Given {
    Given {
        rate_hz: Some(250.0),
        unit: Some("counts".into()),
        axes,
        variable: None,
        ..Given::default()
    }
}

fn read(name: &str, bytes: &[u8], given: Given) -> Result<Recording> {
    let source = MemorySource::new(name, bytes.to_vec());
    let options = OpenOptions {
        given,
        ..OpenOptions::default()
    };
    open(Box::new(source), Vec::new(), options)
}

/// A committed file, under its name and under one that says nothing.
fn read_twice(name: &str, given: Given) -> Recording {
    let bytes = bytes_of(name);
    let named = read(name, &bytes, given.clone()).unwrap_or_else(|p| panic!("{p}"));
    let unnamed = read("unknown", &bytes, given).unwrap_or_else(|p| panic!("{p}"));
    assert_eq!(named.samples, unnamed.samples);
    named
}

fn refused(name: &str, given: Given) -> Problem {
    match read(name, &bytes_of(name), given) {
        Err(problem) => problem,
        Ok(recording) => panic!("{name} was opened as {}", recording.format),
    }
}

/// The formula of `make_arrays.py`: 3 channels × 40 samples.
fn planted(signed: bool) -> Vec<Vec<f32>> {
    let value = |c: i32, t: i32| ((37 * c + 11 * t) % 201 - if signed { 100 } else { 0 }) as f32;
    (0..3)
        .map(|c| (0..40).map(|t| value(c, t)).collect())
        .collect()
}

/// The formula of `make_arrays.py`: 6 frames of 4 × 5, one row of samples a pixel.
fn movie() -> Vec<Vec<f32>> {
    let value = |f: i32, r: i32, c: i32| ((29 * f + 7 * r + 13 * c) % 250) as f32;
    (0..4)
        .flat_map(|r| (0..5).map(move |c| (r, c)))
        .map(|(r, c)| (0..6).map(|f| value(f, r, c)).collect())
        .collect()
}

fn is_the_movie(name: &str, axes: Option<Axes>, format: &str) {
    let recording = read_twice(name, given(axes));
    assert_eq!(recording.samples, movie(), "{name}");
    assert_eq!(recording.format, format, "{name}");
    let layout = Layout::Frames {
        height: 4,
        width: 5,
        pixels: (0..20).collect(),
    };
    assert_eq!(recording.layout, layout, "{name}");
    assert_eq!(recording.channels[7].name, "r2c3", "{name}");
    assert_eq!(recording.channels[7].unit, "counts", "{name}");
    assert_eq!((recording.rate_hz, recording.sample_count()), (250.0, 6));
}

#[test]
fn numpy_arrays_of_every_type_order_and_version() {
    let rows = Some(Axes::ChannelsSamples);
    let columns = Some(Axes::SamplesChannels);
    let cases = [
        ("f4-little.npy", rows, true),
        ("f4-big.npy", rows, true),
        ("f8-little.npy", rows, true),
        ("f8-big.npy", rows, true),
        ("i1.npy", rows, true),
        ("i2-little.npy", rows, true),
        ("i2-big.npy", rows, true),
        ("i4-little.npy", rows, true),
        ("i8-little.npy", rows, true),
        ("u1.npy", rows, false),
        ("u2-little.npy", rows, false),
        ("u2-big.npy", rows, false),
        ("u4-little.npy", rows, false),
        ("fortran.npy", rows, true),
        ("samples-first.npy", columns, true),
        ("samples-first-fortran.npy", columns, true),
        ("version-2.npy", rows, true),
    ];
    for (name, axes, signed) in cases {
        let recording = read_twice(name, given(axes));
        assert_eq!(recording.samples, planted(signed), "{name}");
        assert_eq!(recording.format, "NPY");
        assert_eq!(recording.channels[2].name, "channel 3");
        assert_eq!(recording.layout, Layout::Head);
    }
}

#[test]
fn movies_keep_their_height_and_width() {
    is_the_movie("movie.npy", Some(Axes::FramesHeightWidth), "NPY");
    is_the_movie("movie-fortran.npy", Some(Axes::FramesHeightWidth), "NPY");
    is_the_movie(
        "movie-frames-last.npy",
        Some(Axes::HeightWidthFrames),
        "NPY",
    );
    is_the_movie(
        "movie.mat",
        Some(Axes::HeightWidthFrames),
        "MAT-file level 5",
    );
    for name in [
        "plain.tif",
        "big-endian.tif",
        "8-bit.tif",
        "float.tif",
        "lzw.tif",
        "deflate.tif",
        "packbits.tif",
        "lzw-predictor.tif",
        "float-deflate.tif",
        "tiles.tif",
    ] {
        is_the_movie(name, None, "TIFF");
    }
    is_the_movie("big.tif", None, "BigTIFF");
}

#[test]
fn what_an_array_does_not_say_is_asked_at_once() {
    let problem = refused("f4-little.npy", Given::default());
    assert_eq!(problem.kind, Kind::NeedsAnswer);
    let keys: Vec<&str> = problem.asks.iter().map(|a| a.key.as_str()).collect();
    assert_eq!(keys, ["axes", "rate_hz", "unit"]);
    let axes = &problem.asks[0];
    assert_eq!(axes.guess.as_deref(), Some("channels,samples"));
    assert!(axes.question.contains("3 × 40"), "{}", axes.question);

    let problem = refused("movie.mat", Given::default());
    assert_eq!(
        problem.asks[0].guess.as_deref(),
        Some("height,width,frames")
    );
    let problem = refused("plain.tif", Given::default());
    let keys: Vec<&str> = problem.asks.iter().map(|a| a.key.as_str()).collect();
    assert_eq!(keys, ["rate_hz", "unit"]);
    // An answer that does not fit is asked for again.
    let wrong = Given {
        rate_hz: None,
        ..given(Some(Axes::FramesHeightWidth))
    };
    let problem = refused("f4-little.npy", wrong);
    let keys: Vec<&str> = problem.asks.iter().map(|a| a.key.as_str()).collect();
    assert_eq!(keys, ["axes", "rate_hz"]);
}

#[test]
fn volts_become_microvolts() {
    let volts = Given {
        unit: Some("mV".into()),
        ..given(Some(Axes::ChannelsSamples))
    };
    let recording = read_twice("i2-little.npy", volts);
    assert_eq!(recording.channels[0].unit, "µV");
    assert_eq!(recording.samples[1][3], 1000.0 * planted(true)[1][3]);
}

#[test]
fn a_rate_beside_the_samples_is_used() {
    let silent = Given {
        rate_hz: None,
        ..given(Some(Axes::ChannelsSamples))
    };
    for (name, rate_hz) in [
        ("stored.npz", 250.0),
        ("plain.mat", 250.0),
        ("packed.mat", 250.0),
    ] {
        let recording = read_twice(name, silent.clone());
        assert_eq!(recording.rate_hz, rate_hz, "{name}");
        assert_eq!(recording.samples, planted(true), "{name}");
    }
    // Numbers that stand in an element's own tag.
    let small = read_twice("small.mat", silent);
    assert_eq!(small.samples, [[1.0, 2.0], [3.0, 4.0]]);
    assert_eq!(small.rate_hz, 10.0);
}

#[test]
fn of_several_arrays_one_is_asked_for() {
    for (name, guess, also) in [
        ("deflated.npz", "eeg", "other (3 × 5)"),
        ("two.mat", "left", "right (2 × 40)"),
    ] {
        let problem = refused(name, given(Some(Axes::ChannelsSamples)));
        assert_eq!(problem.kind, Kind::NeedsAnswer);
        assert_eq!(problem.asks.len(), 1);
        let ask = &problem.asks[0];
        assert_eq!(
            (ask.key.as_str(), ask.guess.as_deref()),
            ("variable", Some(guess))
        );
        assert!(problem.what.contains(also), "{problem}");
        let told = Given {
            variable: Some(guess.into()),
            ..given(Some(Axes::ChannelsSamples))
        };
        assert_eq!(read_twice(name, told).samples, planted(true), "{name}");
        let wrong = Given {
            variable: Some("none".into()),
            ..given(Some(Axes::ChannelsSamples))
        };
        assert_eq!(refused(name, wrong).kind, Kind::NeedsAnswer);
    }
}

#[test]
fn what_is_not_read_is_said() {
    assert_eq!(
        refused("level-4.mat", Given::default()).kind,
        Kind::Unsupported
    );
    assert_eq!(
        refused("colour.tif", Given::default()).kind,
        Kind::Unsupported
    );
    let mut later = bytes_of("plain.mat");
    later[125] = 2;
    let problem = read("a.mat", &later, Given::default()).unwrap_err();
    assert_eq!(problem.kind, Kind::Unsupported);
    assert!(problem.to_string().contains("HDF5"), "{problem}");
    // An archive without arrays.
    let zip = archive(&[("a.txt".into(), vec![1])]).unwrap();
    assert_eq!(
        read("a.npz", &zip, Given::default()).unwrap_err().kind,
        Kind::Unknown
    );
}

/// A header of a few bytes that claims 100,000 × 100,000 numbers is refused before memory is taken: 64 kB would be too little for them.
#[test]
fn claims_without_bytes_are_refused() {
    let header = "{'descr':'<f8','fortran_order':False,'shape':(100000,100000)}\n";
    let npy = [
        b"\x93NUMPY\x01\x00",
        &(header.len() as u16).to_le_bytes()[..],
        header.as_bytes(),
    ]
    .concat();
    assert!(npy.len() < 80);
    let rows = Given {
        axes: Some(Axes::ChannelsSamples),
        ..given(None)
    };
    let kind = |bytes: &[u8]| read("claim", bytes, rows.clone()).unwrap_err().kind;
    assert_eq!(kind(&npy), Kind::Damaged);

    // The same inside archives: deflated bytes can claim any length.
    let zip = archive(&[("a.npy".into(), npy.clone())]).unwrap();
    assert_eq!(kind(&zip), Kind::TooLarge);

    // TIFF: one page of 100,000 × 100,000 pixels of 16 bits, without data.
    let mut tiff = b"II*\0\x08\0\0\0\x05\0".to_vec();
    for (tag, kind, value) in [
        (256u16, 4u16, 100_000u32),
        (257, 4, 100_000),
        (258, 3, 16),
        (262, 3, 1),
        (273, 4, 8),
    ] {
        tiff.extend(tag.to_le_bytes());
        tiff.extend(kind.to_le_bytes());
        tiff.extend(1u32.to_le_bytes());
        tiff.extend(value.to_le_bytes());
    }
    tiff.extend([0; 4]);
    let found = kind(&tiff);
    assert!(matches!(found, Kind::TooLarge | Kind::Damaged), "{found:?}");

    // MAT: sizes that the element cannot hold.
    let mut mat = bytes_of("two.mat");
    let at = mat
        .windows(8)
        .position(|w| w == [3, 0, 0, 0, 40, 0, 0, 0])
        .unwrap();
    mat[at..at + 8].copy_from_slice(&[0xa0, 0x86, 1, 0, 0xa0, 0x86, 1, 0]);
    assert_eq!(kind(&mat), Kind::Damaged);
}

const VICTIMS: [&str; 14] = [
    "i2-little.npy",
    "movie-fortran.npy",
    "version-2.npy",
    "stored.npz",
    "deflated.npz",
    "plain.mat",
    "packed.mat",
    "movie.mat",
    "small.mat",
    "plain.tif",
    "big.tif",
    "lzw-predictor.tif",
    "packbits.tif",
    "tiles.tif",
];

fn answers(name: &str) -> Given {
    let axes = match name {
        "movie-fortran.npy" => Axes::FramesHeightWidth,
        "movie.mat" => Axes::HeightWidthFrames,
        _ => Axes::ChannelsSamples,
    };
    Given {
        variable: name.ends_with(".npz").then(|| "eeg".into()),
        ..given(Some(axes))
    }
}

/// Whatever came out of these bytes is a recording that hangs together, and no larger than they can hold.
fn sane(what: &str, bytes: &[u8], given: Given) {
    if let Ok(recording) = read("a", bytes, given) {
        let samples: usize = recording.samples.iter().map(Vec::len).sum();
        assert!(4 * samples <= 8 * bytes.len() + (8 << 20), "{what}");
        assert_eq!(recording.samples.len(), recording.channels.len(), "{what}");
        let equal = recording
            .samples
            .iter()
            .all(|s| s.len() == recording.sample_count());
        assert!(equal, "{what}");
        assert_eq!(
            recording.stretches[0].count,
            recording.sample_count(),
            "{what}"
        );
    }
}

#[test]
fn cut_at_every_length() {
    for name in VICTIMS {
        let whole = bytes_of(name);
        assert!(read(name, &whole, answers(name)).is_ok(), "{name}");
        for length in 0..whole.len() {
            sane(
                &format!("{name} cut at {length}"),
                &whole[..length],
                answers(name),
            );
        }
        // The numbers of an NPY file end with it: without the last byte it must be refused.
        if name.ends_with(".npy") {
            let cut = &whole[..whole.len() - 1];
            assert_eq!(
                read(name, cut, answers(name)).unwrap_err().kind,
                Kind::Damaged
            );
        }
    }
}

#[test]
fn changed_bytes() {
    let mut random = Lcg(11);
    for name in VICTIMS {
        let whole = bytes_of(name);
        for round in 0..400 {
            let mut bytes = whole.clone();
            for _ in 0..1 + round % 4 {
                let at = (random.uniform() * bytes.len() as f64) as usize;
                bytes[at] = (random.uniform() * 256.0) as u8;
            }
            sane(&format!("{name}, round {round}"), &bytes, answers(name));
        }
        // Headers lie at the beginning: change those more often.
        for round in 0..400 {
            let mut bytes = whole.clone();
            let at = (random.uniform() * bytes.len().min(200) as f64) as usize;
            bytes[at] = (random.uniform() * 256.0) as u8;
            sane(
                &format!("{name}, header, round {round}"),
                &bytes,
                answers(name),
            );
        }
    }
}

/// A long array comes in more than one slice, and says how far it is.
#[test]
fn slices() {
    let samples = 1_500_000u32;
    let header = format!("{{'descr':'<f4','fortran_order':False,'shape':({samples}, 2)}}\n");
    let mut bytes = b"\x93NUMPY\x01\x00".to_vec();
    bytes.extend((header.len() as u16).to_le_bytes());
    bytes.extend(header.as_bytes());
    for t in 0..samples {
        bytes.extend((t as f32).to_le_bytes());
        bytes.extend((-(t as f32)).to_le_bytes());
    }
    let options = OpenOptions {
        given: given(Some(Axes::SamplesChannels)),
        ..OpenOptions::default()
    };
    let source = Box::new(MemorySource::new("long.npy", bytes));
    let mut opening = Opening::begin(source, Vec::new(), options).unwrap();
    let mut steps = 0;
    while !opening.finished() {
        let (done, of) = opening.step().unwrap();
        assert!(done <= of);
        steps += 1;
    }
    assert!(steps > 1);
    let recording = opening.finish().unwrap();
    let right = (0..samples as usize)
        .all(|t| recording.samples[0][t] == t as f32 && recording.samples[1][t] == -(t as f32));
    assert!(right);
}
