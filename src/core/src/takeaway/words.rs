//! Numbers and names as people read them: ratios, times, counts, p, lists.
//!
//! # Signs
//! Minus is U+2212, ranges take an en dash, a factor U+00D7, and a number keeps its unit by a no-break space.
use crate::recipe::{Contrast, EventWindow};
use crate::sheet::{MovieCard, Sheet};

/// No-break space.
pub(super) const NB: char = '\u{a0}';

/// A name from a file for a sentence: on one line, no invisible marks, at most `most` characters of it.
pub(super) fn plain(text: &str, most: usize) -> String {
    let clean: String = text
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .filter(|c| !invisible(*c))
        .collect();
    let clean = clean.split_whitespace().collect::<Vec<_>>().join(" ");
    if clean.chars().count() <= most {
        return clean;
    }
    let kept: String = clean.chars().take(most.saturating_sub(1)).collect();
    format!("{}…", kept.trim_end())
}

/// Marks that turn the direction of writing or take no room.
pub(super) fn invisible(c: char) -> bool {
    matches!(c,
        '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{61c}')
}

/// A name in a reading: at most 32 characters.
pub(super) fn name(text: &str) -> String {
    let short = plain(text, 32);
    if short.is_empty() {
        "(without a name)".into()
    } else {
        short
    }
}

/// A channel's place in a sentence: its name, and of a movie's pixel `row 12, column 40`.
pub(super) fn place(sheet: &Sheet, channel: &str) -> String {
    let pixel = || {
        let (row, column) = channel.strip_prefix('r')?.split_once('c')?;
        let number = |text: &str| text.parse::<u32>().ok();
        Some(format!(
            "row{NB}{}, column{NB}{}",
            number(row)?,
            number(column)?
        ))
    };
    let pixel = sheet.movie.as_ref().and_then(|_| pixel());
    pixel.unwrap_or_else(|| name(channel))
}

/// What carries the samples: channels, the pixels of a movie, or its bins.
pub(super) fn carrier(sheet: &Sheet, count: usize) -> &'static str {
    match &sheet.movie {
        None => one(count, "channel", "channels"),
        Some(card) if side(card) > 1 => one(count, "bin", "bins"),
        Some(_) => one(count, "pixel", "pixels"),
    }
}

/// Pixels along a side of a movie's bins.
pub(super) fn side(card: &MovieCard) -> u32 {
    card.width.checked_div(card.columns).unwrap_or(1).max(1)
}

fn minus(text: String) -> String {
    text.replace('-', "\u{2212}")
}

/// A number with a fixed count of decimals.
pub(super) fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    // No minus before a rounded zero.
    if text
        .trim_start_matches('-')
        .chars()
        .all(|c| c == '0' || c == '.')
    {
        return text.trim_start_matches('-').into();
    }
    minus(text)
}

/// Three figures that matter: 0.035, 0.35, 2.83, 28.3, 283.
pub(super) fn three(value: f64) -> String {
    let size = value.abs();
    if !size.is_finite() {
        return "not a number".into();
    }
    if size >= 1e6 || (size > 0.0 && size < 1e-3) {
        return scientific(value);
    }
    let decimals = match size {
        s if s >= 99.95 => 0,
        s if s >= 9.995 => 1,
        s if s >= 0.0995 || s == 0.0 => 2,
        s if s >= 0.00995 => 3,
        _ => 4,
    };
    let text = fixed(value, decimals);
    if decimals == 0 {
        grouped_text(&text)
    } else {
        text
    }
}

fn scientific(value: f64) -> String {
    let text = format!("{value:.1e}");
    match text.split_once('e') {
        Some((head, power)) => {
            let raised: String = power
                .chars()
                .map(|c| match c {
                    '-' => '⁻',
                    '0' => '⁰',
                    '1' => '¹',
                    '2' => '²',
                    '3' => '³',
                    '4' => '⁴',
                    '5' => '⁵',
                    '6' => '⁶',
                    '7' => '⁷',
                    '8' => '⁸',
                    _ => '⁹',
                })
                .collect();
            minus(format!("{head}×10{raised}"))
        }
        None => minus(text),
    }
}

/// A ratio in a figure: `2.83×`.
pub(super) fn factor(ratio: f64) -> String {
    format!("{}×", three(ratio))
}

/// A ratio in prose: `2.83 times`.
pub(super) fn times(ratio: f64) -> String {
    format!("{}{NB}times", three(ratio))
}

/// An interval of ratios: `2.33–3.47`.
pub(super) fn interval(bounds: [f64; 2]) -> String {
    format!("{}–{}", three(bounds[0]), three(bounds[1]))
}

/// A ratio in decibels with its sign: `+4.5 dB`.
pub(super) fn decibels(ratio: f64) -> String {
    let db = 10.0 * ratio.log10();
    format!(
        "{}{}{NB}dB",
        if db >= 0.05 { "+" } else { "" },
        fixed(db, 1)
    )
}

/// A frequency or rate: `21 Hz`, `10.5 Hz`, `487.5 Hz`.
pub(super) fn hertz(hz: f64) -> String {
    format!(
        "{}{NB}Hz",
        trimmed(hz, if hz.abs() < 100.0 { 1 } else { 2 })
    )
}

/// A number without idle zeros, at most `decimals` decimals.
pub(super) fn trimmed(value: f64, decimals: usize) -> String {
    let text = fixed(value, decimals);
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').into()
    } else {
        text
    }
}

/// A number of a recipe as it stands there, with the right minus.
pub(super) fn as_chosen(value: f64) -> String {
    minus(format!("{value}"))
}

/// A short time: `0.80 s`; as many decimals as it needs, at least two and at most four.
pub(super) fn seconds(value: f64) -> String {
    format!("{}{NB}s", seconds_number(value))
}

fn seconds_number(value: f64) -> String {
    let decimals = (2..4)
        .find(|d| {
            let scale = 10_f64.powi(*d);
            ((value * scale).round() - value * scale).abs() < 1e-6
        })
        .unwrap_or(4);
    fixed(value, decimals as usize)
}

/// A window: `0.20 to 1.00 s`.
pub(super) fn window(window: &EventWindow) -> String {
    format!(
        "{} to {}{NB}s",
        seconds_number(window.from_s),
        seconds_number(window.to_s)
    )
}

/// A duration: `4 min 0 s`, `2 h 3 min`, `12.5 s`.
pub(super) fn duration(seconds: f64) -> String {
    if !seconds.is_finite() || seconds < 0.0 {
        return "an unknown time".into();
    }
    if seconds < 60.0 {
        return format!("{}{NB}s", trimmed(seconds, 1));
    }
    let whole = seconds.round() as u64;
    let (hours, minutes, rest) = (whole / 3600, whole / 60 % 60, whole % 60);
    if hours > 0 {
        format!("{}{NB}h {minutes}{NB}min", grouped(hours as usize))
    } else {
        format!("{minutes}{NB}min {rest}{NB}s")
    }
}

/// A place on the clock: `1:58`, `1:02:03`.
pub(super) fn clock(seconds: f64) -> String {
    let whole = seconds.max(0.0).round() as u64;
    let (hours, minutes, rest) = (whole / 3600, whole / 60 % 60, whole % 60);
    if hours > 0 {
        format!("{hours}:{minutes:02}:{rest:02}")
    } else {
        format!("{minutes}:{rest:02}")
    }
}

/// A share: `99.1 %`.
pub(super) fn percent(share: f64) -> String {
    let value = share * 100.0;
    // Nothing short of all is called all.
    if (99.95..100.0).contains(&value) {
        return format!("more than 99.9{NB}%");
    }
    format!("{}{NB}%", trimmed(value, 1))
}

/// A p value: `0.004`, `0.31`, `0.00012`.
pub(super) fn p_value(p: f64) -> String {
    if p >= 0.0995 {
        fixed(p, 2)
    } else if p >= 0.0005 {
        fixed(p, 3)
    } else if p >= 1e-5 {
        let decimals = (1.0 - p.log10()).ceil() as usize;
        fixed(p, decimals)
    } else {
        scientific(p)
    }
}

/// A count: `1,000`.
pub(super) fn grouped(count: usize) -> String {
    grouped_text(&count.to_string())
}

fn grouped_text(digits: &str) -> String {
    let (sign, digits) = match digits.strip_prefix('\u{2212}') {
        Some(rest) => ("\u{2212}", rest),
        None => ("", digits),
    };
    let mut text = String::from(sign);
    for (at, digit) in digits.chars().enumerate() {
        if at > 0 && (digits.len() - at) % 3 == 0 {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

/// A count as a word up to twelve.
pub(super) fn count(count: usize) -> String {
    const WORDS: [&str; 13] = [
        "no", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten",
        "eleven", "twelve",
    ];
    WORDS
        .get(count)
        .map_or_else(|| grouped(count), |w| (*w).to_string())
}

/// The same with a capital.
pub(super) fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| {
        first.to_uppercase().chain(letters).collect()
    })
}

/// As a sentence of its own; one that begins with the symbol p keeps it small.
pub(super) fn capital_unless_p(text: &str) -> String {
    if text.starts_with("p ") {
        text.into()
    } else {
        capital(text)
    }
}

/// "is" or "are", "window" or "windows": the first for one.
pub(super) fn one<'a>(count: usize, single: &'a str, many: &'a str) -> &'a str {
    if count == 1 { single } else { many }
}

/// "a, b and c".
pub(super) fn list(items: &[String]) -> String {
    match items {
        [] => String::new(),
        [only] => only.clone(),
        [head @ .., last] => format!("{} and {last}", head.join(", ")),
    }
}

/// "after", "before" or "around", by where a window lies.
pub(super) fn side_of(window: &EventWindow) -> &'static str {
    if window.from_s >= 0.0 {
        "after"
    } else if window.to_s <= 0.0 {
        "before"
    } else {
        "around"
    }
}

/// The two windows of a contrast of event windows.
pub(super) fn windows(contrast: &Contrast) -> Option<(&EventWindow, &EventWindow)> {
    contrast.event_windows()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_as_people_read_them() {
        let cases = [
            (three(2.834), "2.83"),
            (three(0.346), "0.35"),
            (three(0.0349), "0.035"),
            (three(28.34), "28.3"),
            (three(9.999), "10.0"),
            (three(283.4), "283"),
            (three(12_345.0), "12,345"),
            (three(0.0), "0.00"),
            (three(1.2e-7), "1.2×10⁻⁷"),
            (decibels(2.83), "+4.5\u{a0}dB"),
            (decibels(0.35), "\u{2212}4.6\u{a0}dB"),
            (decibels(1.0), "0.0\u{a0}dB"),
            (hertz(10.5), "10.5\u{a0}Hz"),
            (hertz(250.0), "250\u{a0}Hz"),
            (seconds(0.8), "0.80\u{a0}s"),
            (seconds(-0.2), "\u{2212}0.20\u{a0}s"),
            (seconds(0.1234), "0.1234\u{a0}s"),
            (seconds(0.125), "0.125\u{a0}s"),
            (duration(240.0), "4\u{a0}min 0\u{a0}s"),
            (duration(7380.0), "2\u{a0}h 3\u{a0}min"),
            (duration(12.5), "12.5\u{a0}s"),
            (clock(118.2), "1:58"),
            (percent(0.991), "99.1\u{a0}%"),
            (percent(0.99997), "more than 99.9\u{a0}%"),
            (percent(1.0), "100\u{a0}%"),
            (p_value(0.31), "0.31"),
            (p_value(0.0039), "0.004"),
            (p_value(1.0 / 1001.0), "0.001"),
            (p_value(0.00012), "0.00012"),
            (grouped(1_000_000), "1,000,000"),
            (count(3), "three"),
            (count(40), "40"),
            (capital("ten"), "Ten"),
            (list(&["a".into(), "b".into(), "c".into()]), "a, b and c"),
            (name("F\u{202e}z\n<b>"), "Fz <b>"),
        ];
        for (found, expected) in cases {
            assert_eq!(found, expected);
        }
        assert_eq!(name(&"x".repeat(200)).chars().count(), 32);
    }
}
