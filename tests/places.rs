//! Where channels lie: the 10–05 system against its construction made in another way (`reference/make_positions.py`), decorated and old names,
//! typed grids and probes, and splines on a plane against SciPy's thin-plate interpolator.
use teasel_core::describe::placing::{check, placed};
use teasel_core::describe::plate::{Plate, hull};
use teasel_core::describe::positions::standard;
use teasel_core::error::Kind;
use teasel_core::recipe::{Along, Channels, Corner, Grid, Order, Positions, Probe};
use teasel_core::recording::{Channel, Layout, Recording};
use teasel_tests::{close, close_all, numbers, reference, rows};

#[test]
fn all_345_positions_match_the_construction() {
    let all = reference("positions");
    let electrodes = all["electrodes"].as_object().unwrap();
    assert_eq!(electrodes.len(), 345);
    for (name, place) in electrodes {
        let found = standard(name).unwrap_or_else(|| panic!("{name} is unknown"));
        // Three rotations and a cross product of unit vectors: a few units in the last place of 1.
        close_all(name, &found, &numbers(place), 20.0 * f64::EPSILON);
    }
}

#[test]
fn names_as_they_stand_in_recordings() {
    for (written, plain) in [
        ("EEG Fp1-REF", "Fp1"),
        ("eeg fp1", "Fp1"),
        ("FP1-A2", "Fp1"),
        ("EEG_Fp1", "Fp1"),
        ("Fp1.", "Fp1"),
        ("fz-LE", "Fz"),
        ("EEG CPP5H-Ref", "CPP5h"),
        ("T3", "T7"),
        ("T4", "T8"),
        ("EEG T5-REF", "P7"),
        ("T6", "P8"),
    ] {
        assert_eq!(standard(written), standard(plain), "{written}");
        assert!(standard(plain).is_some(), "{plain}");
    }
    for other in ["ECG", "Fp1-F3", "EOG left", "X1", "", "EEG", "T3-T4", "G12"] {
        assert_eq!(standard(other), None, "{other}");
    }
}

#[test]
fn left_and_right_mirror_each_other() {
    for (left, right) in [
        ("F7", "F8"),
        ("TTP7h", "TTP8h"),
        ("OI1", "OI2"),
        ("POO9h", "POO10h"),
    ] {
        let (l, r) = (standard(left).unwrap(), standard(right).unwrap());
        assert_eq!([-l[0], l[1], l[2]], r);
    }
}

#[test]
fn plates_match_thin_plate_splines() {
    let all = reference("positions");
    let pairs = |key: &str| -> Vec<[f64; 2]> {
        rows(&all["plate"][key])
            .iter()
            .map(|r| [r[0], r[1]])
            .collect()
    };
    let places = pairs("places");
    let plate = Plate::new(&places, 0.0).unwrap();
    let found = plate.interpolate(&numbers(&all["plate"]["values"]), &pairs("at"));
    // The system of 27 equations has a condition number near 1e4: 1e-11 leaves two digits of slack.
    close_all(
        "plate",
        &found,
        &numbers(&all["plate"]["interpolated"]),
        1e-10,
    );
    for sum in plate.matrix(&pairs("at")).column_sum().iter() {
        close("row", *sum, 1.0, 1e-10);
    }
    let mut expected = pairs("hull");
    let mut corners = hull(&places);
    let order = |a: &[f64; 2], b: &[f64; 2]| a[0].total_cmp(&b[0]);
    expected.sort_by(order);
    corners.sort_by(order);
    assert_eq!(corners, expected);
}

#[test]
fn plates_refuse_lines_and_doubled_places() {
    let line: Vec<[f64; 2]> = (0..6).map(|k| [f64::from(k), 2.0 * f64::from(k)]).collect();
    assert!(Plate::new(&line, 0.0).is_err());
    let doubled = [[0.0, 0.0], [1.0, 0.0], [0.0, 1.0], [1.0, 0.0], [1.0, 1.0]];
    let problem = Plate::new(&doubled, 0.0).unwrap_err();
    assert_eq!(problem.place.as_deref(), Some("positions 2 and 4"));
    assert!(Plate::new(&doubled[..3], 0.0).is_err());
}

fn recording(names: &[&str]) -> Recording {
    Recording {
        rate_hz: 100.0,
        channels: names
            .iter()
            .map(|name| Channel {
                name: (*name).to_owned(),
                unit: "µV".to_owned(),
                position: None,
            })
            .collect(),
        samples: vec![vec![0.0; 10]; names.len()],
        ..Recording::default()
    }
}

fn told(positions: Positions) -> Channels {
    Channels {
        positions: Some(positions),
        ..Channels::default()
    }
}

fn grid(first: Corner, along: Along, prefix: Option<&str>) -> Channels {
    told(Positions::Grid(Grid {
        rows: 2,
        columns: 3,
        spacing_mm: 4.0,
        first,
        along,
        prefix: prefix.map(str::to_owned),
    }))
}

/// Column and row from the lower left, in steps of the spacing.
fn steps(places: &[Option<[f64; 3]>]) -> Vec<Option<(i64, i64)>> {
    let step = |v: f64| (v / 4e-3).round() as i64;
    places
        .iter()
        .map(|p| p.map(|p| (step(p[0]), step(p[1]))))
        .collect()
}

#[test]
fn a_grid_is_counted_from_its_corner_along_its_rows_or_columns() {
    let names = ["G1", "G2", "G3", "G4", "G5", "G6"];
    let at = |first, along| steps(&placed(&recording(&names), &grid(first, along, None)).1);
    let of = |list: [(i64, i64); 6]| list.map(Some).to_vec();
    assert_eq!(
        at(Corner::TopLeft, Along::Rows),
        of([(0, 1), (1, 1), (2, 1), (0, 0), (1, 0), (2, 0)])
    );
    assert_eq!(
        at(Corner::BottomRight, Along::Rows),
        of([(2, 0), (1, 0), (0, 0), (2, 1), (1, 1), (0, 1)])
    );
    assert_eq!(
        at(Corner::TopLeft, Along::Columns),
        of([(0, 1), (0, 0), (1, 1), (1, 0), (2, 1), (2, 0)])
    );
    assert_eq!(
        at(Corner::BottomLeft, Along::Columns),
        of([(0, 0), (0, 1), (1, 0), (1, 1), (2, 0), (2, 1)])
    );
    assert_eq!(
        at(Corner::TopRight, Along::Rows),
        of([(2, 1), (1, 1), (0, 1), (2, 0), (1, 0), (0, 0)])
    );
}

#[test]
fn a_prefix_picks_the_channels_of_a_grid() {
    let recording = recording(&["Fz", "G6", "G1", "EOG", "G 2"]);
    let choices = grid(Corner::TopLeft, Along::Rows, Some("G"));
    let (layout, places) = placed(&recording, &choices);
    assert_eq!(layout, Layout::Plane);
    assert_eq!(
        steps(&places),
        [None, Some((2, 0)), Some((0, 1)), None, Some((1, 1))]
    );
    assert!(check(&recording, &choices).is_ok());
    let nobody = check(&recording, &grid(Corner::TopLeft, Along::Rows, Some("H"))).unwrap_err();
    assert_eq!(nobody.kind, Kind::Contrast);
}

#[test]
fn channels_that_are_set_aside_take_no_place_of_a_grid() {
    let mut recording = recording(&["A", "ECG", "B"]);
    recording
        .about
        .aside
        .insert("ECG".into(), "its kind is ECG".into());
    let choices = grid(Corner::TopLeft, Along::Rows, None);
    assert_eq!(
        steps(&placed(&recording, &choices).1),
        [Some((0, 1)), None, Some((1, 1))]
    );
    let kept = Channels {
        keep: vec!["ECG".into()],
        ..choices
    };
    assert_eq!(
        steps(&placed(&recording, &kept).1),
        [Some((0, 1)), Some((1, 1)), Some((2, 1))]
    );
}

#[test]
fn a_grid_that_is_too_small_is_refused_with_both_numbers() {
    let recording = recording(&["1", "2", "3", "4", "5", "6", "7"]);
    let problem = check(&recording, &grid(Corner::TopLeft, Along::Rows, None)).unwrap_err();
    assert_eq!(problem.expected.as_deref(), Some("at least 7 places"));
    assert_eq!(problem.found.as_deref(), Some("6"));
}

#[test]
fn a_probe_counts_depth_downwards_from_either_end() {
    let recording = recording(&["a", "b", "c"]);
    let depth = |order| -> Vec<f64> {
        let choices = told(Positions::Probe(Probe {
            spacing_um: 50.0,
            order,
            prefix: None,
        }));
        let (layout, places) = placed(&recording, &choices);
        assert_eq!(layout, Layout::Line);
        places.iter().map(|p| -p.unwrap()[2]).collect()
    };
    close_all(
        "from the top",
        &depth(Order::TopDown),
        &[0.0, 50e-6, 100e-6],
        1e-18,
    );
    close_all(
        "from the tip",
        &depth(Order::BottomUp),
        &[100e-6, 50e-6, 0.0],
        1e-18,
    );
}
