//! Ranges of a recipe's values, whatever the recording.
use super::{
    BandReference, Contrast, Detrend, EventWindow, Given, Keep, KeepWord, Limit, Measure, Pairs,
    Positions, Recipe, Reference, Shrink, ShrinkWord, Spans, Within,
};
use crate::error::{Kind, Problem, Result};

/// The largest whole number that every reader of JSON keeps exactly: 2^53 − 1.
pub(crate) const WHOLE_MAX: f64 = 9_007_199_254_740_991.0;

/// The highest sampling rate that can be told.
const HIGHEST_RATE_HZ: f64 = 1e7;

/// A choice of the recipe as one speaks of it.
fn in_words(path: &str) -> &'static str {
    match path {
        "recording.rate_hz" => "the sampling rate of the recording",
        "recording.unit" => "the unit of the recording",
        "recording.variable" => "the name of the array",
        "channels.reference" => "the reference",
        "channels.positions.grid.rows" => "the number of rows of the grid",
        "channels.positions.grid.columns" => "the number of columns of the grid",
        "channels.positions.grid.spacing_mm" => "the spacing of the grid",
        "channels.positions.probe.spacing_um" => "the spacing of the probe",
        "channels.positions.at" => "a position",
        "recording.events.onset" => "the column of onsets",
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
        "contrast.event" | "contrast.within.event" => "the event of the windows",
        "contrast.from_s" | "contrast.within.from_s" => "the start of the windows",
        "contrast.to_s" | "contrast.within.to_s" => "the end of the windows",
        "contrast.signal" => "the signal spans",
        "contrast.reference" => "the reference spans",
        "contrast.within" => "the spans looked into",
        "contrast.piece_s" => "the length of the pieces",
        "contrast.lag_s" => "the lag",
        "contrast.centre_hz" => "the centre of the band",
        "contrast.half_width_hz" => "the half width of the band",
        "not_used" => "what is marked as not to be used",
        "hold_back.last" => "the share that is locked away",
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
    given_check(&recipe.recording)?;
    check_keep(recipe.keep)?;
    check_best(recipe)?;
    check_filter(recipe)?;
    check_positions(recipe.channels.positions.as_ref())?;
    if recipe
        .recording
        .events
        .as_ref()
        .is_some_and(|e| e.onset.is_empty())
    {
        return Err(out(
            "recording.events.onset",
            "the name of a column",
            "an empty text",
        ));
    }
    check_mains_and_trend(recipe)?;
    check_drop_windows(recipe)?;
    check_contrast(&recipe.contrast)?;
    check_measure(recipe)?;
    check_spans("not_used", &recipe.not_used)?;
    if let Some(hold) = recipe.hold_back
        && !(0.05..=0.5).contains(&hold.last)
    {
        return Err(out(
            "hold_back.last",
            "a share from 0.05 to 0.5 of the recording",
            hold.last,
        ));
    }
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

/// Checks what is told of a recording: a rate above 0 and up to 10 MHz; a unit of 1–20 characters and a name of 1–200, none of
/// them a control character. The error's place is the path in a recipe: `recording.rate_hz`.
pub fn given_check(given: &Given) -> Result<()> {
    match given.rate_hz {
        Some(hz) if !(hz > 0.0 && hz <= HIGHEST_RATE_HZ) => Err(out(
            "recording.rate_hz",
            format!("a number of Hz above 0, at most {HIGHEST_RATE_HZ}"),
            hz,
        )),
        _ => Ok(()),
    }?;
    let texts = [
        ("recording.unit", &given.unit, 20),
        ("recording.variable", &given.variable, 200),
    ];
    for (path, text, most) in texts {
        let Some(text) = text else { continue };
        let count = text.chars().count();
        let blank = text.trim().is_empty() || text.chars().any(char::is_control);
        if blank || count > most {
            return Err(out(
                path,
                format!("a text of 1 to {most} characters on one line"),
                match blank {
                    true => "none, or one with control characters".to_owned(),
                    false => format!("{count} characters"),
                },
            ));
        }
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

fn check_positions(positions: Option<&Positions>) -> Result<()> {
    let spacing = |path: &str, value: f64, most: f64, unit: &str| {
        if value > 0.0 && value <= most {
            return Ok(());
        }
        Err(out(
            path,
            format!("a number of {unit} above 0, at most {most}"),
            value,
        ))
    };
    match positions {
        Some(Positions::Grid(grid)) => {
            within("channels.positions.grid.rows", grid.rows, 1, 1000)?;
            within("channels.positions.grid.columns", grid.columns, 1, 1000)?;
            let path = "channels.positions.grid.spacing_mm";
            spacing(path, grid.spacing_mm, 1000.0, "mm")
        }
        Some(Positions::Probe(probe)) => {
            let path = "channels.positions.probe.spacing_um";
            spacing(path, probe.spacing_um, 1e6, "µm")
        }
        Some(Positions::At(places)) => {
            let wrong = places.iter().find(|(_, p)| {
                !(2..=3).contains(&p.len()) || p.iter().any(|v| !v.is_finite() || v.abs() > 1e6)
            });
            match wrong {
                Some((name, place)) => Err(out(
                    "channels.positions.at",
                    "two or three numbers up to 1000000 for each channel",
                    format!("{place:?} for {name}"),
                )),
                None => Ok(()),
            }
        }
        None => Ok(()),
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
/// Longest piece, lag and window, either way, in seconds.
const LONGEST_S: f64 = 1e6;
/// Most spans of one list.
const MOST_SPANS: usize = 100_000;

fn check_contrast(contrast: &Contrast) -> Result<()> {
    match contrast {
        Contrast::Windows { signal, reference } => {
            check_window("contrast.signal", signal)?;
            check_window("contrast.reference", reference)
        }
        Contrast::Spans {
            signal,
            reference,
            piece_s,
        } => {
            if signal.is_rest() {
                return Err(out(
                    "contrast.signal",
                    "spans or the label of annotations (\"rest\" is everything that is not signal; the pattern \"rest*\" reaches annotations of that name)",
                    "the word rest",
                ));
            }
            check_spans_of("contrast.signal", signal)?;
            check_spans_of("contrast.reference", reference)?;
            check_piece(*piece_s)
        }
        Contrast::Band {
            centre_hz,
            half_width_hz,
            reference,
            within,
            piece_s,
        } => {
            check_band(*centre_hz, *half_width_hz, *reference)?;
            check_within(within.as_ref())?;
            check_piece(*piece_s)
        }
        Contrast::Repeatable(window) => {
            check_window("contrast", window)?;
            check_alone(
                "contrast",
                window,
                "what repeats is averaged over windows of one length",
            )
        }
        Contrast::Slow {
            lag_s,
            within,
            piece_s,
        } => {
            let fits = *lag_s > 0.0 && *lag_s <= 3600.0;
            if !fits {
                return Err(out(
                    "contrast.lag_s",
                    "a number of seconds above 0 and up to 3600",
                    lag_s,
                ));
            }
            check_within(within.as_ref())?;
            check_piece(*piece_s)
        }
    }
}

fn check_window(path: &str, window: &EventWindow) -> Result<()> {
    for (key, value) in [("from_s", window.from_s), ("to_s", window.to_s)] {
        if !value.is_finite() || value.abs() > LONGEST_S {
            return Err(out(
                &format!("{path}.{key}"),
                "a number of seconds from −1000000 to 1000000",
                value,
            ));
        }
    }
    // With `until` the two ends belong to different events, so that their order is known only trial by trial.
    if window.from_s >= window.to_s && window.until.is_none() {
        return Err(out(
            &format!("{path}.to_s"),
            format!("a time after their start, {} s", window.from_s),
            window.to_s,
        ));
    }
    let mut labels = window.labels().chain(window.until.as_deref());
    if labels.any(str::is_empty) {
        return Err(out(
            &format!("{path}.event"),
            "the label of an event",
            "an empty text",
        ));
    }
    within(&format!("{path}.also"), window.also.len(), 0, 1000)?;
    within(
        &format!("{path}.leave_out"),
        window.leave_out.len(),
        0,
        MOST_SPANS,
    )?;
    let counted = [("first", window.first), ("last", window.last)];
    for (key, value) in counted {
        within(&format!("{path}.{key}"), value.unwrap_or(1), 1, MOST_SPANS)?;
    }
    match window.leave_out.iter().find(|n| **n == 0) {
        Some(_) => Err(out(
            &format!("{path}.leave_out"),
            "numbers of events, from 1",
            0,
        )),
        None => Ok(()),
    }
}

/// Keys of a window that make sense only beside another side.
fn check_alone(path: &str, window: &EventWindow, why: &str) -> Result<()> {
    let key = match (&window.until, window.equal) {
        (Some(_), _) => "until",
        (None, true) => "equal",
        (None, false) => return Ok(()),
    };
    Err(Problem::new(
        Kind::Recipe,
        format!("the key \"{key}\" has no meaning here: {why}"),
        "take it out of the recipe",
    )
    .at(format!("{path}.{key}")))
}

fn check_spans_of(path: &str, spans: &Spans) -> Result<()> {
    match spans {
        Spans::Times(times) if times.is_empty() => {
            Err(out(path, "at least one span, or a label", "an empty list"))
        }
        Spans::Times(times) => check_spans(path, times),
        Spans::Label(label) if label.is_empty() => {
            Err(out(path, "the label of annotations", "an empty text"))
        }
        Spans::Label(_) => Ok(()),
    }
}

fn check_spans(path: &str, spans: &[[f64; 2]]) -> Result<()> {
    within(path, spans.len(), 0, MOST_SPANS)?;
    let wrong = spans
        .iter()
        .find(|[from, to]| !(from.is_finite() && to.is_finite() && from < to));
    match wrong {
        Some([from, to]) => Err(out(
            path,
            "spans that end after they begin",
            format!("[{from}, {to}]"),
        )),
        None => Ok(()),
    }
}

fn check_piece(piece_s: Option<f64>) -> Result<()> {
    match piece_s {
        Some(s) if !(s > 0.0 && s <= 3600.0) => Err(out(
            "contrast.piece_s",
            "a number of seconds above 0 and up to 3600",
            s,
        )),
        _ => Ok(()),
    }
}

/// The lower flank, with its skirt of half a half width, must lie above 0 Hz.
fn check_band(centre_hz: f64, half_width_hz: f64, reference: BandReference) -> Result<()> {
    positive("contrast.centre_hz", Some(centre_hz))?;
    positive("contrast.half_width_hz", Some(half_width_hz))?;
    let reach = match reference {
        BandReference::Flanks => 3.5,
        BandReference::Broadband => 1.5,
    };
    if centre_hz > reach * half_width_hz {
        return Ok(());
    }
    Err(out(
        "contrast.half_width_hz",
        format!(
            "less than {:.3} Hz, so that the {} above 0 Hz",
            centre_hz / reach,
            if reference == BandReference::Flanks {
                "lower neighbour lies"
            } else {
                "band lies"
            }
        ),
        half_width_hz,
    ))
}

fn check_within(within: Option<&Within>) -> Result<()> {
    match within {
        None => Ok(()),
        Some(Within::Window(window)) => {
            check_window("contrast.within", window)?;
            check_alone("contrast.within", window, "segments are of one length")
        }
        Some(Within::Spans(spans)) if spans.is_rest() => Err(out(
            "contrast.within",
            "spans, the label of annotations, or a window around events",
            "the word rest",
        )),
        Some(Within::Spans(spans)) => check_spans_of("contrast.within", spans),
    }
}

fn check_measure(recipe: &Recipe) -> Result<()> {
    if recipe.contrast.allows(recipe.measure) {
        return Ok(());
    }
    Err(Problem::new(
        Kind::Recipe,
        "what repeats has no ratio in a single trial: the average over trials is one for all of them",
        "set measure to total",
    )
    .at("measure")
    .expected_found("\"total\"", "\"typical\""))
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
