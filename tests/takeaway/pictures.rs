//! Tapers, multitaper densities, wavelets and sign flips against SciPy and NumPy (`reference/make_takeaway.py`).
use teasel_core::describe::multitaper::{Multitaper, dpss};
use teasel_core::describe::time_frequency::Picture;
use teasel_core::evidence::signflip::sign_flip;
use teasel_core::recording::Stretch;
use teasel_tests::{Lcg, close, close_all, number, numbers, reference, rows};

fn noise(seed: u64, count: usize) -> Vec<f64> {
    let mut rng = Lcg(seed);
    (0..count).map(|_| rng.uniform() - 0.5).collect()
}

#[test]
fn tapers_are_scipys() {
    let values = reference("takeaway");
    for (length, expected) in values["dpss"].as_object().unwrap() {
        let tapers = dpss(length.parse().unwrap(), 3.0, 5);
        for (k, (ours, theirs)) in tapers.iter().zip(rows(expected)).enumerate() {
            // Both solve the same eigenproblem to rounding; neighbouring eigenvalues differ by more than 1e-3 of the largest.
            close_all(&format!("taper {k} of {length}"), ours, &theirs, 1e-9);
        }
    }
}

#[test]
fn multitaper_densities_are_the_mean_of_tapered_periodograms() {
    let values = reference("takeaway");
    let case = &values["multitaper"];
    let mut estimate = Multitaper::new(80, number(&case["rate_hz"]));
    let ours = estimate.density(&noise(11, 80));
    let theirs = numbers(&case["density"]);
    let most = teasel_tests::largest(&theirs);
    close_all("density", &ours, &theirs, 1e-9 * most);
    assert_eq!(estimate.half_bandwidth_hz(), 3.75);
}

/// The picture at chosen times, by numpy.convolve with the whole recording.
#[test]
fn wavelets_are_direct_convolution() {
    let values = reference("takeaway");
    let case = &values["morlet"];
    let rate = number(&case["rate_hz"]);
    let series = noise(5, 3000);
    let stretches = [Stretch {
        first: 0,
        count: 3000,
        onset_s: 0.0,
    }];
    let onsets: Vec<usize> = numbers(&case["onsets"])
        .iter()
        .map(|o| *o as usize)
        .collect();
    let hz = numbers(&case["hz"]);
    let (power, consistency) = (rows(&case["power"]), rows(&case["consistency"]));
    for (k, offset) in numbers(&case["offsets"]).into_iter().enumerate() {
        // A span of one sample has one time: its own.
        let at = offset / rate;
        let mut picture = Picture::new(hz.clone(), at, at + 1.0 / rate, rate);
        for onset in &onsets {
            picture.add_trial(&series, &stretches, *onset);
        }
        let found = picture.finish().unwrap();
        assert_eq!(found.t_s, [at]);
        for (f, hz) in hz.iter().enumerate() {
            // Cells are f32.
            let ours = f64::from(found.consistency[f][0].unwrap());
            close(
                &format!("consistency at {hz} Hz"),
                ours,
                consistency[f][k],
                1e-6,
            );
        }
        // Power is told as a ratio: of two offsets, through a reference of one sample at each onset.
        let own = |shift: usize| -> Vec<f64> {
            let mut ratio = Picture::new(hz.clone(), at, at + 1.0 / rate, rate);
            for onset in &onsets {
                ratio.add_trial(&series, &stretches, *onset);
                ratio.add_reference(&series, &stretches, (onset + shift, 1));
            }
            let found = ratio.finish().unwrap();
            let db = found.db.iter().map(|row| f64::from(row[0].unwrap()));
            db.collect()
        };
        let against_15 = own(15);
        for (f, hz) in hz.iter().enumerate() {
            let theirs = 10.0 * (power[f][k] / power[f][2]).log10();
            close(&format!("power at {hz} Hz"), against_15[f], theirs, 1e-4);
        }
    }
}

#[test]
fn sign_flips_are_scipys_permutation_test() {
    for case in reference("takeaway")["sign_flips"].as_array().unwrap() {
        let larger = case["side"] == "greater";
        let ours = sign_flip(&numbers(&case["logs"]), larger, 1).unwrap();
        assert!(ours.exact);
        close("p", ours.p.unwrap(), number(&case["p"]), 1e-12);
    }
}
