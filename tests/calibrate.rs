//! Prints the rate of p ≤ 0.05 over many null recordings:
//! `calibrate [RECORDINGS] [PERMUTATIONS] [KIND]`, every kind of contrast unless one is named.
use teasel_core::recipe::{ContrastKind, Measure};
use teasel_tests::calibration::{Noise, binomial_99, null_question, rejections};

const KINDS: [(ContrastKind, &str); 5] = [
    (ContrastKind::Windows, "windows"),
    (ContrastKind::Spans, "spans"),
    (ContrastKind::Band, "band"),
    (ContrastKind::Repeatable, "repeatable"),
    (ContrastKind::Slow, "slow"),
];

fn main() -> std::process::ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let number = |i: usize, otherwise: u64| {
        let given = arguments.get(i).and_then(|a| a.parse().ok());
        given.unwrap_or(otherwise)
    };
    let (count, permutations) = (number(0, 500), number(1, 199) as usize);
    let [low, high] = binomial_99(count);
    let rate = |n: u64| n as f64 / count as f64;
    println!(
        "{count} null recordings each, 8 channels kept 6, 20 trials (44 s at 100 Hz), {permutations} permutations, seeds from 1"
    );
    println!(
        "99 % binomial interval of the rate of p <= 0.05: {:.3} to {:.3}",
        rate(low),
        rate(high)
    );
    println!("| kind | measure | noise | stronger | weaker | |\n|---|---|---|---|---|---|");
    let mut above = 0;
    for (kind, kind_name) in KINDS {
        if arguments.get(2).is_some_and(|only| only != kind_name) {
            continue;
        }
        for (measure, name) in [(Measure::Typical, "typical"), (Measure::Total, "total")] {
            if !null_question(kind, Measure::Total, 0)
                .contrast
                .allows(measure)
            {
                continue;
            }
            for noise in Noise::ALL {
                let hits = rejections(1, count, kind, noise, measure, permutations);
                let worst = hits.into_iter().max().unwrap_or(0);
                above += usize::from(worst > high);
                let judged = match worst {
                    n if n > high => "ABOVE",
                    n if n < low => "conservative",
                    _ => "inside",
                };
                println!(
                    "| {kind_name} | {name} | {} | {:.3} | {:.3} | {judged} |",
                    noise.name(),
                    rate(hits[0]),
                    rate(hits[1])
                );
            }
        }
    }
    std::process::ExitCode::from(u8::from(above > 0))
}
