//! What is said of the kinds of contrast that are not made of event windows: the question, the sides, the method.
use super::words::{self, NB};
use crate::recipe::{BandReference, Contrast, ContrastKind, EventWindow, Spans, Within};
use crate::sheet::{Permutation, Sheet};

/// "10.0 ± 2.0 Hz".
fn band(centre_hz: f64, half_width_hz: f64) -> String {
    format!(
        "{}{NB}±{NB}{}",
        words::trimmed(centre_hz, 2),
        words::hertz(half_width_hz)
    )
}

/// The labels of a window's events: "buoy", "buoy and swell".
pub(super) fn events(window: &EventWindow) -> String {
    let all: Vec<String> = window.labels().map(words::name).collect();
    words::list(&all)
}

fn spans(spans: &Spans) -> String {
    match spans {
        Spans::Times(times) => format!(
            "{} marked {}",
            words::grouped(times.len()),
            words::one(times.len(), "span", "spans")
        ),
        Spans::Label(label) => format!("the spans of {}", words::name(label)),
    }
}

fn within_words(within: Option<&Within>) -> String {
    match within {
        None => String::new(),
        Some(Within::Window(window)) => {
            format!(", {} from {}", words::window(window), events(window))
        }
        Some(Within::Spans(list)) => format!(", in {}", spans(list)),
    }
}

/// The two sides in words: what is of interest, and what it is compared with.
pub(super) fn sides(contrast: &Contrast) -> [String; 2] {
    match contrast {
        Contrast::Windows { signal, reference } => [
            format!("{} from {}", words::window(signal), events(signal)),
            format!("{} from {}", words::window(reference), events(reference)),
        ],
        Contrast::Spans {
            signal, reference, ..
        } => [
            spans(signal),
            if reference.is_rest() {
                "the rest".into()
            } else {
                spans(reference)
            },
        ],
        Contrast::Band {
            centre_hz,
            half_width_hz,
            reference,
            within,
            ..
        } => [
            format!(
                "the rhythm at {}{}",
                band(*centre_hz, *half_width_hz),
                within_words(within.as_ref())
            ),
            match reference {
                BandReference::Flanks => "its neighbours in frequency".into(),
                BandReference::Broadband => "all frequencies".into(),
            },
        ],
        Contrast::Repeatable(window) => [
            format!(
                "what repeats over trials of {}, {}",
                events(window),
                words::window(window)
            ),
            "the single trials".into(),
        ],
        Contrast::Slow { lag_s, within, .. } => [
            format!("what changes slowly{}", within_words(within.as_ref())),
            format!("what changes within {}", words::seconds(*lag_s)),
        ],
    }
}

/// How a finding opens: "At 10 ± 2 Hz".
pub(super) fn opening(contrast: &Contrast) -> String {
    match contrast {
        Contrast::Windows { signal, .. } => format!(
            "{} {}",
            words::capital(words::side_of(signal)),
            events(signal)
        ),
        Contrast::Spans { .. } => format!("In {}", sides(contrast)[0]),
        Contrast::Band {
            centre_hz,
            half_width_hz,
            ..
        } => format!("At {}", band(*centre_hz, *half_width_hz)),
        Contrast::Repeatable(window) => format!("Over trials of {}", events(window)),
        Contrast::Slow { lag_s, .. } => format!("At a lag of {}", words::seconds(*lag_s)),
    }
}

/// "of buoy", "of these spans".
pub(super) fn of(contrast: &Contrast) -> String {
    match contrast {
        Contrast::Windows { signal, .. } => format!("of {}", events(signal)),
        Contrast::Spans { .. } => "of these spans".into(),
        Contrast::Band { .. } | Contrast::Slow { .. } => "of the recording".into(),
        Contrast::Repeatable(window) => format!("of {}", events(window)),
    }
}

/// One sentence for the methods paragraph: the sides, how they were cut, and the sources.
pub(super) fn method(sheet: &Sheet) -> Option<String> {
    let card = sheet.windows.as_ref()?;
    let (signal, reference) = (&card.signal, &card.reference);
    let many = |n: usize| words::grouped(n);
    let length = words::seconds(signal.seconds);
    let [of_interest, other] = sides(&sheet.recipe.contrast);
    Some(match &sheet.recipe.contrast {
        Contrast::Windows { .. } => return None,
        Contrast::Spans { .. } => format!(
            "{} (signal, {} pieces) were compared with {} (reference, {} pieces); spans were cut into pieces of {length}, so that a typical piece can be spoken of.",
            words::capital(&of_interest),
            many(signal.used),
            other,
            many(reference.used)
        ),
        Contrast::Band {
            reference: BandReference::Flanks,
            ..
        } => format!(
            "In {} segments of {length}, {of_interest} (signal) was compared with the bands on either side of it, half as wide each, that begin one half width beyond it (reference; Nikulin et al., 2011).",
            many(signal.used)
        ),
        Contrast::Band {
            reference: BandReference::Broadband,
            ..
        } => format!(
            "In {} segments of {length}, {of_interest} (signal) was compared with all frequencies (reference; de Cheveigné & Arzounian, 2015), scaled so that the average channel has a ratio of 1.",
            many(signal.used)
        ),
        Contrast::Repeatable(_) => format!(
            "{} (signal) was compared with {other} (reference): the variance of the average over {} trials times their number, over the mean variance of a trial (de Cheveigné & Simon, 2008), which is 1 where nothing repeats.",
            words::capital(&of_interest),
            many(signal.used)
        ),
        Contrast::Slow { lag_s, .. } => format!(
            "In {} segments of {length}, sums of samples {} apart (signal) were compared with their differences (reference): with r the autocorrelation at that lag, the ratio is (1 + r)/(1 − r), so that the filters are those of the symmetrised lagged covariance against the covariance.",
            many(signal.used),
            words::seconds(*lag_s)
        ),
    })
}

/// What was exchanged, for the methods paragraph: "1,000 random swaps of the two windows within trials".
pub(super) fn arrangements(sheet: &Sheet, test: &Permutation) -> String {
    let n = words::grouped(test.done);
    let paired = sheet.windows.as_ref().is_some_and(|w| w.paired);
    let [all, some] = match (sheet.recipe.contrast.kind(), paired) {
        (ContrastKind::Windows, true) => [
            "ways to swap the two windows within trials",
            "random swaps of the two windows within trials",
        ],
        (ContrastKind::Windows, false) => [
            "ways to label the windows",
            "random shuffles of the labels over all windows",
        ],
        (ContrastKind::Spans, _) => [
            "shifts of all labels along the row of pieces",
            "random shifts of all labels along the row of pieces",
        ],
        (ContrastKind::Band | ContrastKind::Slow, _) => [
            "ways to swap the two sides within segments, both brought to one level over all directions before",
            "random swaps of the two sides within segments, both brought to one level over all directions before",
        ],
        (ContrastKind::Repeatable, _) => [
            "ways to turn the signs of trials",
            "random turns of the signs of trials",
        ],
    };
    if test.exact {
        format!("all {n} {all}")
    } else {
        format!("{n} {some}")
    }
}

/// An arrangement in one word: "swapped".
pub(super) fn arranged(sheet: &Sheet) -> &'static str {
    let paired = sheet.windows.as_ref().is_some_and(|w| w.paired);
    match (sheet.recipe.contrast.kind(), paired) {
        (ContrastKind::Windows, false) => "shuffled",
        (ContrastKind::Windows | ContrastKind::Band | ContrastKind::Slow, _) => "swapped",
        (ContrastKind::Spans, _) => "shifted",
        (ContrastKind::Repeatable, _) => "sign-turned",
    }
}
