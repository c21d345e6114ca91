//! Prints the rate of p ≤ 0.05 over many null recordings: `calibrate [RECORDINGS] [PERMUTATIONS]`.
use teasel_core::recipe::Measure;
use teasel_tests::calibration::{Noise, binomial_99, rejections};

fn main() -> std::process::ExitCode {
    let mut arguments = std::env::args().skip(1).map(|a| a.parse::<u64>());
    let count = arguments.next().and_then(Result::ok).unwrap_or(400);
    let permutations = arguments.next().and_then(Result::ok).unwrap_or(199) as usize;
    let [low, high] = binomial_99(count);
    println!(
        "{count} null recordings each, 8 channels kept 6, 20 trials, {permutations} permutations, seeds from 1"
    );
    println!(
        "99 % binomial interval of the rate of p <= 0.05: {:.3} to {:.3}",
        low as f64 / count as f64,
        high as f64 / count as f64
    );
    let mut outside = 0;
    for (measure, name) in [(Measure::Typical, "typical"), (Measure::Total, "total")] {
        for (noise, colour) in [(Noise::White, "white"), (Noise::Pink, "1/f")] {
            let hits = rejections(1, count, noise, measure, permutations);
            for (end, n) in ["stronger", "weaker"].iter().zip(hits) {
                let inside = (low..=high).contains(&n);
                outside += usize::from(!inside);
                println!(
                    "{name:8} {colour:6} {end:9} {:.3} {}",
                    n as f64 / count as f64,
                    if inside { "inside" } else { "OUTSIDE" }
                );
            }
        }
    }
    std::process::ExitCode::from(u8::from(outside > 0))
}
