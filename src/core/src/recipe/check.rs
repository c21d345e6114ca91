//! Ranges of a recipe's values, whatever the recording.
use super::{
    Contrast, Detrend, Keep, KeepWord, Limit, Measure, Pairs, Recipe, Reference, Shrink, ShrinkWord,
};
use crate::error::{Kind, Problem, Result};

/// The largest whole number that every reader of JSON keeps exactly: 2^53 − 1.
pub(crate) const WHOLE_MAX: f64 = 9_007_199_254_740_991.0;

/// A choice of the recipe as one speaks of it.
fn in_words(path: &str) -> &'static str {
    match path {
        "channels.reference" => "the reference",
        "filter.high_pass_hz" => "the high-pass",
        "filter.low_pass_hz" => "the low-pass",
        "filter.notch_hz" => "the notch",
        "filter.resample_hz" => "the new sampling rate",
        "filter.detrend" => "the length of a piece of the trend",
        "filter.mains" => "the removal of mains",
        "drop_windows" => "a limit for dropping windows",
        "keep" => "the number of dimensions kept",
        "shrink" => "the shrinkage",
        "components" => "the number of components",
        "contrast.signal.event" => "the event of the signal windows",
        "contrast.reference.event" => "the event of the reference windows",
        "contrast.signal.from_s" => "the start of the signal windows",
        "contrast.signal.to_s" => "the end of the signal windows",
        "contrast.reference.from_s" => "the start of the reference windows",
        "contrast.reference.to_s" => "the end of the reference windows",
        "evidence.folds" => "the number of folds",
        "evidence.permutations" => "the number of permutations",
        "evidence.bootstrap" => "the number of bootstrap samples",
        "evidence.seed" => "the seed",
        _ => "a value of the recipe",
    }
}

fn out(path: &str, expected: impl std::fmt::Display, found: impl std::fmt::Display) -> Problem {
    Problem::new(
        Kind::Recipe,
        format!("{} is out of range", in_words(path)),
        "choose a value in that range",
    )
    .at(path)
    .expected_found(expected, found)
}

fn within(path: &str, value: usize, from: usize, to: usize) -> Result<()> {
    if (from..=to).contains(&value) {
        return Ok(());
    }
    Err(out(
        path,
        format!("a whole number from {from} to {to}"),
        value,
    ))
}

fn positive(path: &str, value: Option<f64>) -> Result<()> {
    match value {
        Some(hz) if !(hz > 0.0 && hz.is_finite()) => Err(out(path, "a number of Hz above 0", hz)),
        _ => Ok(()),
    }
}

/// Checks the ranges that hold whatever the recording: `teasel_recipe` 1, keep above 1, components 1–20, folds 2–50,
/// permutations up to 100,000, bootstrap up to 20,000, from before to, shrink from 0 up to 1, rates above 0.
/// The error's place is the path of the value: `contrast.signal.from_s`.
pub fn recipe_check(recipe: &Recipe) -> Result<()> {
    if recipe.teasel_recipe != 1 {
        return Err(Problem::new(
            Kind::Recipe,
            "this recipe is of another version of the schema",
            "use the version of Teasel that wrote it",
        )
        .at("teasel_recipe")
        .expected_found(1, recipe.teasel_recipe));
    }
    check_keep(recipe.keep)?;
    check_best(recipe)?;
    check_filter(recipe)?;
    check_mains_and_trend(recipe)?;
    check_drop_windows(recipe)?;
    check_contrast(&recipe.contrast)?;
    check_shrink(recipe.shrink, recipe.measure)?;
    within("components", recipe.components, 1, 20)?;
    let evidence = &recipe.evidence;
    within("evidence.folds", evidence.folds, 2, 50)?;
    within("evidence.permutations", evidence.permutations, 0, 100_000)?;
    within("evidence.bootstrap", evidence.bootstrap, 0, 20_000)?;
    if evidence.seed as f64 > WHOLE_MAX {
        return Err(out(
            "evidence.seed",
            "a whole number from 0 to 9007199254740991",
            evidence.seed,
        ));
    }
    if matches!(&recipe.channels.reference, Reference::Bipolar(b) if matches!(&b.bipolar, Pairs::List(list) if list.len() < 2))
    {
        return Err(out(
            "channels.reference",
            "at least two pairs of channel names",
            "fewer",
        ));
    }
    if matches!(&recipe.channels.reference, Reference::Named(names) if names.is_empty()) {
        return Err(out(
            "channels.reference",
            "at least one channel name",
            "an empty list",
        ));
    }
    Ok(())
}

fn check_keep(keep: Keep) -> Result<()> {
    match keep {
        Keep::Number(1) => Err(Problem::new(
            Kind::Recipe,
            "With C = 1 the direction is chosen by size alone and nothing is left to compare",
            "keep 2 dimensions or more",
        )
        .at("keep")
        .expected_found("a whole number above 1, \"auto\" or \"best\"", 1)),
        Keep::Number(0) => Err(out(
            "keep",
            "a whole number above 1, \"auto\" or \"best\"",
            0,
        )),
        Keep::Number(keep) => within("keep", keep, 2, 100_000),
        Keep::Word(_) => Ok(()),
    }
}

/// C by held-out ratio with an inner choice of γ at every C, in every fold and every permutation, would take hours.
fn check_best(recipe: &Recipe) -> Result<()> {
    let best = recipe.keep == Keep::Word(KeepWord::Best);
    let auto = recipe.shrink == Shrink::Word(ShrinkWord::Auto);
    if !(best && auto && recipe.measure == Measure::Total) {
        return Ok(());
    }
    Err(Problem::new(
        Kind::Recipe,
        "two choices by held-out ratio inside one another take too long",
        "set shrink to a number such as 0.01, keep to a number, or measure to typical",
    )
    .at("shrink")
    .expected_found(
        "a number, where keep is \"best\" and measure is \"total\"",
        "\"auto\"",
    ))
}

fn check_filter(recipe: &Recipe) -> Result<()> {
    let filter = &recipe.filter;
    positive("filter.high_pass_hz", filter.high_pass_hz)?;
    positive("filter.low_pass_hz", filter.low_pass_hz)?;
    positive("filter.resample_hz", filter.resample_hz)?;
    for hz in &filter.notch_hz {
        positive("filter.notch_hz", Some(*hz))?;
    }
    within("filter.notch_hz", filter.notch_hz.len(), 0, 50)
        .map_err(|p| p.expected_found("at most 50 notches", filter.notch_hz.len()))?;
    match (filter.high_pass_hz, filter.low_pass_hz) {
        (Some(high), Some(low)) if high >= low => Err(out(
            "filter.low_pass_hz",
            format!("a number of Hz above the high-pass, {high}"),
            low,
        )),
        _ => Ok(()),
    }
}

fn check_mains_and_trend(recipe: &Recipe) -> Result<()> {
    let filter = &recipe.filter;
    let number = |path: &str, value: f64, from: f64, to: f64| {
        if (from..=to).contains(&value) {
            return Ok(());
        }
        Err(out(path, format!("a number from {from} to {to}"), value))
    };
    if let Some(Detrend::Pieces(pieces)) = filter.detrend {
        number("filter.detrend", pieces.linear_every_s, 0.1, 1e6)?;
    }
    if let Some(mains) = filter.mains {
        positive("filter.mains", Some(mains.hz))?;
        within("filter.mains", mains.harmonics, 1, 20)?;
        number("filter.mains", mains.window_s, 0.5, 60.0)?;
    }
    Ok(())
}

fn check_drop_windows(recipe: &Recipe) -> Result<()> {
    let drop = &recipe.drop_windows;
    let robust = drop.covariance.map(Limit::Robust);
    let limits = [drop.amplitude, drop.step, drop.flat, robust];
    for limit in limits.into_iter().flatten() {
        let (value, from) = match limit {
            Limit::Robust(robust) => (robust.z, 1.0),
            Limit::Absolute(absolute) => (absolute.uv, 0.0),
        };
        if !value.is_finite() || value < from || value > 1e9 {
            return Err(out(
                "drop_windows",
                format!("a number of at least {from}"),
                value,
            ));
        }
    }
    Ok(())
}

fn check_contrast(contrast: &Contrast) -> Result<()> {
    let Contrast::Windows { signal, reference } = contrast;
    for (side, window) in [("signal", signal), ("reference", reference)] {
        for (key, value) in [("from_s", window.from_s), ("to_s", window.to_s)] {
            if !value.is_finite() || value.abs() > 1e6 {
                return Err(out(
                    &format!("contrast.{side}.{key}"),
                    "a number of seconds from −1000000 to 1000000",
                    value,
                ));
            }
        }
        if window.from_s >= window.to_s {
            return Err(out(
                &format!("contrast.{side}.to_s"),
                format!("a time after their start, {} s", window.from_s),
                window.to_s,
            ));
        }
        if window.event.is_empty() {
            return Err(out(
                &format!("contrast.{side}.event"),
                "the label of an event",
                "an empty text",
            ));
        }
    }
    Ok(())
}

fn check_shrink(shrink: Shrink, measure: Measure) -> Result<()> {
    match (shrink, measure) {
        (Shrink::Number(value), _) if !(0.0..1.0).contains(&value) => Err(out(
            "shrink",
            "a number from 0 up to, but not including, 1",
            value,
        )),
        (Shrink::Word(ShrinkWord::LedoitWolf | ShrinkWord::Oas), Measure::Typical) => {
            Err(Problem::new(
                Kind::Recipe,
                "this shrinkage belongs to the measure total",
                "set shrink to auto or a number, or measure to total",
            )
            .at("shrink")
            .expected_found("\"auto\" or a number", "a rule for total"))
        }
        _ => Ok(()),
    }
}
