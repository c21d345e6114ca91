//! Positions, spherical splines, spectra, courses: against published formulas and SciPy.
use teasel_core::describe::course::{self, Baseline, Span};
use teasel_core::describe::map::MapGrid;
use teasel_core::describe::positions::standard;
use teasel_core::describe::spectra::{self, End};
use teasel_core::describe::spline::{Spline, legendre_sum};
use teasel_core::describe::welch::{Welch, segment_for};
use teasel_core::recording::Stretch;
use teasel_core::sheet::Spectra;
use teasel_tests::{Lcg, close, close_all, largest, number, numbers, reference, rows};

fn places(value: &serde_json::Value) -> Vec<[f64; 3]> {
    rows(value).iter().map(|r| [r[0], r[1], r[2]]).collect()
}

#[test]
fn legendre_sums_match_the_tables() {
    let all = reference("spherical_spline");
    let cosines = numbers(&all["cosines"]);
    for table in all["tables"].as_array().unwrap() {
        let (m, terms) = (number(&table["m"]) as u32, number(&table["terms"]) as usize);
        let sums = |power| -> Vec<f64> {
            cosines
                .iter()
                .map(|&x| legendre_sum(x, power, terms))
                .collect()
        };
        close_all("g", &sums(m), &numbers(&table["g"]), 1e-12);
        close_all("h", &sums(m - 1), &numbers(&table["h"]), 1e-12);
    }
}

#[test]
fn splines_match_the_fits() {
    let all = reference("spherical_spline");
    let example = &all["example"];
    let (positions, z) = (places(&example["positions"]), numbers(&example["z"]));
    let q = places(&example["q"]);
    let mut seen = 0;
    for fit in example["fits"].as_array().unwrap() {
        if number(&fit["terms"]) != 50.0 {
            continue;
        }
        seen += 1;
        let (m, lambda) = (number(&fit["m"]) as u32, number(&fit["lambda"]));
        let spline = Spline::new(&positions, m, lambda).unwrap();
        let mut expected = numbers(&fit["c"]);
        expected.push(number(&fit["c0"]));
        let scale = largest(&expected);
        close_all("c", &spline.coefficients(&z), &expected, 1e-8 * scale);

        let values = numbers(&fit["value_at_q"]);
        close_all("values", &spline.interpolate(&z, &q), &values, 1e-8);
        let product = spline.matrix(&q) * nalgebra_vector(&z);
        close_all("product", product.as_slice(), &values, 1e-8);

        let others: Vec<[f64; 3]> = without(&positions, 4);
        let rebuilt = Spline::new(&others, m, lambda).unwrap();
        let row: Vec<f64> = rebuilt.matrix(&positions[4..5]).iter().copied().collect();
        close_all(
            "weights",
            &row,
            &numbers(&fit["weights_row_for_channel_4"]),
            1e-8,
        );
        let value = rebuilt.interpolate(&without(&z, 4), &positions[4..5])[0];
        close(
            "rebuilt",
            value,
            number(&fit["channel_4_rebuilt_from_others"]),
            1e-8,
        );
    }
    assert_eq!(seen, 3);
}

fn nalgebra_vector(values: &[f64]) -> nalgebra::DVector<f64> {
    nalgebra::DVector::from_column_slice(values)
}

fn without<T: Clone>(values: &[T], index: usize) -> Vec<T> {
    let mut left = values.to_vec();
    left.remove(index);
    left
}

#[test]
fn splines_refuse_what_cannot_be_fitted() {
    let few: Vec<[f64; 3]> = ["Fz", "Cz", "Pz"].map(|n| standard(n).unwrap()).to_vec();
    let problem = Spline::new(&few, 4, 1e-5).unwrap_err();
    assert_eq!(problem.found.as_deref(), Some("3"));
    let mut twice: Vec<[f64; 3]> = ["Fz", "Cz", "Pz", "T7", "T8", "T3"]
        .map(|n| standard(n).unwrap())
        .to_vec();
    let problem = Spline::new(&twice, 4, 1e-5).unwrap_err();
    assert_eq!(problem.place.as_deref(), Some("positions 4 and 6"));
    twice[5] = [0.0, f64::NAN, 1.0];
    let problem = Spline::new(&twice, 4, 1e-5).unwrap_err();
    assert_eq!(problem.place.as_deref(), Some("position 6"));
    twice[5] = [0.0; 3];
    assert!(Spline::new(&twice, 4, 1e-5).is_err());
}

#[test]
fn a_map_goes_through_its_channels_and_keeps_left_from_right() {
    let names = [
        "Fp1", "Fp2", "F7", "F3", "Fz", "F4", "F8", "T7", "C3", "Cz", "C4", "T8", "P7", "P3", "Pz",
        "P4", "P8", "O1", "O2",
    ];
    let positions = names.map(|n| standard(n).unwrap());
    let grid = MapGrid::new(&positions, 57).unwrap();
    // C3 lies half way between the vertex and T7: a point of a grid with 57 points is 0.04 from the next, so −0.52 or −0.48.
    let pattern: Vec<f64> = names.map(|n| f64::from(u8::from(n == "C3"))).to_vec();
    let values = grid.values(&pattern);
    assert_eq!(values.len(), 57 * 57);
    assert!(values.iter().all(|v| v.is_finite()));
    let (peak, _) = values
        .iter()
        .enumerate()
        .filter(|(k, _)| {
            let [x, y] = grid.at(k / 57, k % 57);
            x.hypot(y) <= grid.radius
        })
        .max_by(|a, b| a.1.total_cmp(b.1))
        .unwrap();
    let [x, y] = grid.at(peak / 57, peak % 57);
    assert!((x + 0.5).abs() < 0.06 && y.abs() < 0.06, "peak at {x}, {y}");
    let there = Spline::new(&positions, 4, 1e-5)
        .unwrap()
        .interpolate(&pattern, &[standard("C3").unwrap()])[0];
    close("peak", values[peak], there, 0.01);
    assert_eq!(grid.radius, 1.0);
    // A constant is its own map.
    let ones = grid.values(&vec![1.0; names.len()]);
    close_all("constant", &ones, &vec![1.0; 57 * 57], 1e-9);
}

#[test]
fn electrode_labels_are_understood() {
    let same = [
        ("Fz", "EEG Fz-REF"),
        ("Fz", "Fz-Ref"),
        ("Fz", "fz"),
        ("Cz", "EEG Cz"),
        ("Fp1", "EEG FP1-A1"),
        ("C3", "C3-A2"),
        ("C3", "C3-M2"),
        ("FC5", "Fc5."),
        ("FCz", "Fcz."),
        ("O2", " O2 "),
        ("T7", "T3"),
        ("T8", "EEG T4-LE"),
        ("P7", "T5"),
        ("P8", "EEG T6-AVG"),
        ("A1", "EEG A1-REF"),
        ("TPP9h", "tpp9H"),
    ];
    for (name, label) in same {
        assert!(standard(name).is_some(), "{name}");
        assert_eq!(standard(name), standard(label), "{label}");
    }
    for label in [
        "C3-C4",
        "EEG Fpz-Cz",
        "F7-T3",
        "A1-A2",
        "ECG",
        "EOG",
        "EEG",
        "",
        "-",
        "FFC7",
        "C7",
        "C0",
        "Status",
        "EEG 001",
        "Fz-F",
        "EMG chin",
        "T9z",
        "T7h7",
    ] {
        assert_eq!(standard(label), None, "{label}");
    }
}

#[test]
fn positions_follow_the_published_construction() {
    let at = |name: &str| standard(name).unwrap_or_else(|| panic!("{name}"));
    let half = 0.5f64.sqrt();
    for (name, expected) in [
        ("Cz", [0.0, 0.0, 1.0]),
        ("Fpz", [0.0, 1.0, 0.0]),
        ("Oz", [0.0, -1.0, 0.0]),
        ("T7", [-1.0, 0.0, 0.0]),
        ("T8", [1.0, 0.0, 0.0]),
        ("Fz", [0.0, half, half]),
        ("Pz", [0.0, -half, half]),
        ("C4", [half, 0.0, half]),
        // 20 % of 90° from the front
        (
            "Fp2",
            [18f64.to_radians().sin(), 18f64.to_radians().cos(), 0.0],
        ),
        (
            "P7",
            [-54f64.to_radians().sin(), -54f64.to_radians().cos(), 0.0],
        ),
        // 10 % of the midline below the equator
        (
            "Nz",
            [0.0, 22.5f64.to_radians().cos(), -22.5f64.to_radians().sin()],
        ),
        (
            "T10",
            [22.5f64.to_radians().cos(), 0.0, -22.5f64.to_radians().sin()],
        ),
    ] {
        close_all(name, &at(name), &expected, 1e-15);
    }
    // F3 is as far from F7 as from Fz, on the plane through F7, Fz and F8.
    let apart = |a: &str, b: &str| {
        let (a, b) = (at(a), at(b));
        (0..3).map(|i| (a[i] - b[i]).powi(2)).sum::<f64>().sqrt()
    };
    close("F3", apart("F3", "F7"), apart("F3", "Fz"), 1e-15);
    let (f7, fz, f8, f3) = (at("F7"), at("Fz"), at("F8"), at("F3"));
    let rows = [f7, fz, f8].map(|p| [p[0] - f3[0], p[1] - f3[1], p[2] - f3[2]]);
    let volume = nalgebra::Matrix3::from_fn(|i, j| rows[i][j]).determinant();
    close("plane", volume, 0.0, 1e-15);
    assert!(at("A1")[2] < at("T9")[2] && at("M2")[2] < at("TP10")[2]);
    assert!(at("M1")[1] < at("A1")[1] && at("M1")[0] < 0.0 && at("M2")[0] > 0.0);
}

#[test]
fn welch_matches_scipy() {
    let all = reference("dsp");
    let (x, rate) = (numbers(&all["x"]), number(&all["fs"]));
    let expected = numbers(&all["welch"]["psd"]);
    let mut welch = Welch::new(256, rate);
    let tolerance = 1e-9 * largest(&expected);
    close_all("density", &welch.density(&x), &expected, tolerance);
    // again with used buffers
    close_all("density", &welch.density(&x), &expected, tolerance);
    close(
        "step",
        welch.frequencies()[1],
        number(&all["welch"]["frequencies_step"]),
        0.0,
    );
    assert_eq!(welch.frequencies().len(), 129);
}

#[test]
fn segments_are_a_second_or_the_window() {
    assert_eq!(segment_for(2000, 250.0), 250);
    assert_eq!(segment_for(200, 250.0), 200);
    assert_eq!(segment_for(201, 250.0), 200);
    assert_eq!(segment_for(5, 250.0), 16);
    assert_eq!(segment_for(5000, 499.5), 500);
}

#[test]
fn short_windows_and_odd_segments_match_scipy() {
    let all = reference("prepare");
    let part = &all["short_welch"];
    let mut random = Lcg(number(&part["seed"]) as u64);
    let x: Vec<f64> = (0..100).map(|_| random.normal12() + 2.0).collect();
    for (segment, key) in [(128, "padded_to_128"), (33, "segments_of_33")] {
        let expected = numbers(&part[key]);
        let ours = Welch::new(segment, 128.0).density(&x);
        close_all(key, &ours, &expected, 1e-9 * largest(&expected));
    }
    assert_eq!(Welch::new(16, 128.0).density(&[]), vec![0.0; 9]);
    assert!(
        Welch::new(16, 128.0)
            .density(&[3.0])
            .iter()
            .all(|v| *v == 0.0)
    );
}

/// The component of `make_prepare.py`, description().
struct Example {
    expected: serde_json::Value,
    x: Vec<f64>,
    onsets: Vec<(usize, f64)>,
    signal: Vec<(usize, usize)>,
    reference: Vec<(usize, usize)>,
    stretches: Vec<Stretch>,
}

fn example() -> Example {
    let expected = reference("prepare")["description"].clone();
    let n = number(&expected["samples"]) as usize;
    let mut random = Lcg(number(&expected["seed"]) as u64);
    let onsets: Vec<usize> = (0..9)
        .map(|k| 150 + 330 * k + (40.0 * random.uniform()) as usize)
        .collect();
    let given: Vec<f64> = onsets.iter().map(|&o| o as f64).collect();
    assert_eq!(given, numbers(&expected["onsets"]));
    let mut x: Vec<f64> = (0..n).map(|_| random.normal12()).collect();
    for &onset in &onsets {
        for (i, value) in x[onset..onset + 100].iter_mut().enumerate() {
            *value += 1.5 * (std::f64::consts::TAU * 20.0 * i as f64 / 100.0).sin() + 0.5;
        }
    }
    Example {
        signal: onsets.iter().map(|&o| (o, 90)).collect(),
        reference: onsets.iter().map(|&o| (o - 90, 90)).collect(),
        onsets: onsets.iter().map(|&o| (o, o as f64 / 100.0)).collect(),
        stretches: vec![Stretch {
            first: 0,
            count: n,
            onset_s: 0.0,
        }],
        expected,
        x,
    }
}

const SPAN: Span = Span {
    from_s: -1.0,
    to_s: 1.51,
};

#[test]
fn spectra_match_scipy() {
    let e = example();
    let s = spectra::of_component(&e.x, &e.signal, &e.reference, 100.0, 400, 3);
    assert_eq!(s.segment, 90);
    for (ours, key) in [(&s.signal, "psd_signal"), (&s.reference, "psd_reference")] {
        let expected = numbers(&e.expected[key]);
        close_all(key, ours, &expected, 1e-9 * largest(&expected));
    }
    let sides = [
        (&s.signal, &s.signal_low, &s.signal_high),
        (&s.reference, &s.reference_low, &s.reference_high),
    ];
    for (mean, low, high) in sides {
        for k in 0..mean.len() {
            assert!(low[k] < mean[k] && mean[k] < high[k], "bin {k}");
        }
    }
    // 20 Hz is bin 18 of 100/90 Hz.
    assert_eq!(spectra::peak_hz(&s, End::Stronger), Some(20.0));
    assert!(spectra::peak_db(&s, End::Stronger).unwrap() > 10.0);
    let turned = spectra::of_component(&e.x, &e.reference, &e.signal, 100.0, 0, 3);
    assert_eq!(spectra::peak_hz(&turned, End::Weaker), Some(20.0));
    assert_eq!(turned.signal_low, turned.signal);
    let again = spectra::of_component(&e.x, &e.signal, &e.reference, 100.0, 400, 3);
    assert_eq!(s, again);
    let none = spectra::of_component(&e.x, &[], &e.reference, 100.0, 10, 3);
    assert!(none.signal.iter().all(|v| *v == 0.0) && none.reference == s.reference);
}

#[test]
fn the_peak_is_neither_the_largest_power_nor_the_largest_ratio() {
    let flat = |values: [f64; 5]| values.to_vec();
    // Bin 1: much power, a hair more in signal. Bin 3: noise floor, tenfold. Bin 2: doubled rhythm. Bin 0 does not count.
    let signal = flat([9.0, 101.0, 8.0, 0.1, 0.02]);
    let reference = flat([1.0, 100.0, 4.0, 0.01, 0.04]);
    let zeros = vec![0.0; 5];
    let mut s = Spectra {
        hz: flat([0.0, 1.0, 2.0, 3.0, 4.0]),
        signal_low: zeros.clone(),
        signal_high: zeros.clone(),
        reference_low: zeros.clone(),
        reference_high: zeros,
        signal,
        reference,
        segment: 8,
    };
    assert_eq!(spectra::peak_hz(&s, End::Stronger), Some(2.0));
    close(
        "dB",
        spectra::peak_db(&s, End::Stronger).unwrap(),
        10.0 * 2f64.log10(),
        1e-12,
    );
    assert_eq!(spectra::peak_hz(&s, End::Weaker), Some(4.0));
    s.signal = s.reference.clone();
    assert_eq!(spectra::peak_hz(&s, End::Stronger), None);
}

#[test]
fn courses_match_numpy() {
    let e = example();
    let paired = Baseline::Paired(&e.reference);
    let (course, image) = course::of_component(
        &e.x,
        &e.stretches,
        "buoy",
        &e.onsets,
        paired,
        SPAN,
        100.0,
        2000,
        7,
    )
    .unwrap();
    let expected = |key: &str| numbers(&e.expected[key]);
    assert_eq!(course.trials as f64, number(&e.expected["trials_that_fit"]));
    assert_eq!(course.event, "buoy");
    close_all("t", &course.t_s, &expected("t_s"), 1e-12);
    close_all("power", &course.mean_db, &expected("mean_db"), 1e-9);
    close_all("average", &course.average, &expected("average"), 1e-9);
    close_all("image t", &image.t_s, &expected("image_t_s"), 1e-12);
    assert_eq!(image.db.len(), course.trials);
    let ends = rows(&e.expected["image_first_and_last"]);
    for (row, expected) in [
        (&image.db[0], &ends[0]),
        (&image.db[course.trials - 1], &ends[1]),
    ] {
        let row: Vec<f64> = row.iter().map(|&v| f64::from(v)).collect();
        // f32 of some tens of dB
        close_all("image", &row, expected, 1e-5);
    }
    let pooled = Baseline::Pooled(&e.reference);
    let (course, _) = course::of_component(
        &e.x,
        &e.stretches,
        "buoy",
        &e.onsets,
        pooled,
        SPAN,
        100.0,
        0,
        7,
    )
    .unwrap();
    close_all("pooled", &course.mean_db, &expected("mean_db_pooled"), 1e-9);
    assert_eq!(course.low_db, course.mean_db);
}

/// The bootstrap of a mean is nearly normal with the population standard deviation over √n. With 2,000 samples a 2.5 % point
/// has a standard error of √(0.025 · 0.975 / 2000) / φ(1.96) = 0.06 of that; four of them, and as much again for the skewness of nine
/// trials.
#[test]
fn intervals_are_as_wide_as_the_normal_approximation_says() {
    let e = example();
    let paired = Baseline::Paired(&e.reference);
    let (course, _) = course::of_component(
        &e.x,
        &e.stretches,
        "buoy",
        &e.onsets,
        paired,
        SPAN,
        100.0,
        2000,
        7,
    )
    .unwrap();
    let deviations = numbers(&e.expected["average_standard_deviation"]);
    for (k, deviation) in deviations.iter().enumerate() {
        let se = deviation / (course.trials as f64).sqrt();
        close(
            "low",
            course.average_low[k],
            course.average[k] - 1.96 * se,
            0.48 * se,
        );
        close(
            "high",
            course.average_high[k],
            course.average[k] + 1.96 * se,
            0.48 * se,
        );
        assert!(course.low_db[k] < course.mean_db[k] && course.mean_db[k] < course.high_db[k]);
    }
    let (same, _) = course::of_component(
        &e.x,
        &e.stretches,
        "buoy",
        &e.onsets,
        paired,
        SPAN,
        100.0,
        2000,
        7,
    )
    .unwrap();
    let (other, _) = course::of_component(
        &e.x,
        &e.stretches,
        "buoy",
        &e.onsets,
        paired,
        SPAN,
        100.0,
        2000,
        8,
    )
    .unwrap();
    assert_eq!(course, same);
    assert_ne!(course.low_db, other.low_db);
}

#[test]
fn trials_that_leave_their_stretch_are_not_counted() {
    let e = example();
    let cut = e.onsets[4].0 + 50;
    let n = e.x.len();
    let stretches = [
        Stretch {
            first: 0,
            count: cut,
            onset_s: 0.0,
        },
        Stretch {
            first: cut,
            count: n - cut,
            onset_s: 60.0,
        },
    ];
    let paired = Baseline::Paired(&e.reference);
    let run = |onsets: &[(usize, f64)], stretches: &[Stretch]| {
        course::of_component(&e.x, stretches, "buoy", onsets, paired, SPAN, 100.0, 20, 7)
    };
    let whole = run(&e.onsets, &e.stretches).unwrap().0.trials;
    assert_eq!(run(&e.onsets, &stretches).unwrap().0.trials, whole - 1);
    assert!(run(&[(20, 0.2)], &e.stretches).is_none());
    assert!(run(&[(n + 5, 99.0)], &e.stretches).is_none());
    assert!(run(&[], &e.stretches).is_none());
}
