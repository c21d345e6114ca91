//! Words and numbers on a figure: how wide they are, how they are shortened, how they are written.

use std::collections::BTreeSet;

/// Text without what would break a line of XML or turn its direction: control characters and direction overrides go,
/// runs of white space become one space.
pub(crate) fn clean(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        let bad = c.is_control()
            || matches!(c, '\u{202A}'..='\u{202E}' | '\u{2066}'..='\u{2069}' | '\u{FFFE}' | '\u{FFFF}');
        if c.is_whitespace() || (bad && !out.is_empty()) {
            if !out.ends_with(' ') && !out.is_empty() {
                out.push(' ');
            }
        } else if !bad {
            out.push(c);
        }
    }
    out.trim_end().to_owned()
}

/// Width of one character in em. No backend can be asked everywhere, so these are those of a wide system face.
fn em(c: char) -> f64 {
    match c {
        'i' | 'j' | 'l' | 'I' | '\'' | '|' | '!' => 0.3,
        '.' | ',' | ':' | ';' | ' ' | '·' => 0.33,
        'f' | 't' | 'r' | '(' | ')' | '[' | ']' | '/' | '-' => 0.4,
        'm' | 'w' | 'M' | 'W' | '%' | '@' | '…' => 0.95,
        'A'..='Z' | '+' | '−' | '×' | '=' | '±' | '<' | '>' | '~' => 0.72,
        '0'..='9' => 0.62,
        '\u{0300}'..='\u{036F}' | '\u{200B}'..='\u{200F}' | '\u{FE00}'..='\u{FE0F}' => 0.0,
        c if c.is_ascii() => 0.6,
        c if (c as u32) < 0x1100 => 0.66,
        '¼' | '½' | '⅛' => 0.95,
        _ => 1.05,
    }
}

/// Estimated width of a text in pixels at a size in pixels.
pub(crate) fn width(text: &str, size: f64) -> f64 {
    text.chars().map(em).sum::<f64>() * size
}

/// The same for the heavier weight, which runs wider.
pub(crate) fn bold_width(text: &str, size: f64) -> f64 {
    1.12 * width(text, size)
}

/// The first of several wordings that fits into `room` pixels, or the last.
pub(crate) fn first<'a>(wordings: &[&'a str], size: f64, room: f64) -> &'a str {
    let fits = wordings.iter().find(|w| width(w, size) <= room);
    fits.or(wordings.last()).copied().unwrap_or("")
}

fn nearly_all(having: usize, many: usize) -> bool {
    having >= 3 && having * 5 >= many * 4
}

/// What nearly all names begin and end with, up to a space or a hyphen: "EEG " and "-REF" of "EEG Fz-REF", "EEG Cz-REF", "EOG". On a
/// label it only takes room. Four of five names must share it, and at least three; no two names become one.
#[derive(Default)]
pub(crate) struct Shared {
    head: String,
    tail: String,
}

impl Shared {
    pub(crate) fn of<'a>(names: impl Iterator<Item = &'a str> + Clone) -> Self {
        let many = names.clone().count();
        let left_by = |rest: Option<&str>| rest.is_some_and(|r| !r.trim().is_empty());
        let breaks = |c: char| c == ' ' || c == '-';
        let (mut head, mut tail) = ("", "");
        // A part that nearly all have is one of the parts of the first few names.
        for name in names.clone().take(8) {
            for (at, mark) in name.match_indices(breaks) {
                let (before, after) = (&name[..at + mark.len()], &name[at..]);
                let heads = names.clone().filter(|n| left_by(n.strip_prefix(before)));
                if before.len() > head.len() && nearly_all(heads.count(), many) {
                    head = before;
                }
                let tails = names.clone().filter(|n| left_by(n.strip_suffix(after)));
                if after.len() > tail.len() && nearly_all(tails.count(), many) {
                    tail = after;
                }
            }
        }
        let shared = Shared {
            head: head.to_owned(),
            tail: tail.to_owned(),
        };
        let different: BTreeSet<&str> = names.clone().collect();
        let shortened: BTreeSet<String> = names.map(|n| shared.without(n)).collect();
        if shortened.len() == different.len() {
            shared
        } else {
            Shared::default()
        }
    }

    /// Of a list of names.
    pub(crate) fn in_list(names: &[String]) -> Self {
        Shared::of(names.iter().map(String::as_str))
    }

    /// A name without what nearly all share.
    pub(crate) fn without(&self, name: &str) -> String {
        let rest = name.strip_prefix(self.head.as_str()).unwrap_or(name);
        let rest = rest.strip_suffix(self.tail.as_str()).unwrap_or(rest);
        if rest.trim().is_empty() {
            name.to_owned()
        } else {
            rest.to_owned()
        }
    }
}

/// The text, cleaned, and cut with an ellipsis where it would be wider than `room` pixels.
pub(crate) fn fit(text: &str, size: f64, room: f64) -> String {
    let text = clean(text);
    if width(&text, size) <= room {
        return hold(text);
    }
    let mut out = String::new();
    let mut used = em('…') * size;
    for c in text.chars() {
        used += em(c) * size;
        if used > room {
            break;
        }
        out.push(c);
    }
    hold(format!("{}…", out.trim_end()))
}

/// Keeps a text that runs from right to left from turning what stands beside it.
fn hold(text: String) -> String {
    let turns = |c: char| matches!(c as u32, 0x0590..=0x08FF | 0xFB1D..=0xFDFF | 0xFE70..=0xFEFC | 0x1E800..=0x1EFFF);
    if text.chars().any(turns) {
        format!("\u{2068}{text}\u{2069}")
    } else {
        text
    }
}

/// A number with a true minus and `decimals` places; never "−0".
pub(crate) fn number(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return "–".to_owned();
    }
    let plain = format!("{value:.decimals$}");
    match plain.strip_prefix('-') {
        Some(rest) if rest.chars().all(|c| c == '0' || c == '.') => rest.to_owned(),
        Some(rest) => format!("−{rest}"),
        None => plain,
    }
}

/// A number with as many places as two leading digits need: 0.31, 1.6, 16.
pub(crate) fn short(value: f64) -> String {
    let size = value.abs();
    if size != 0.0 && !(1e-4..1e6).contains(&size) {
        return format!("{value:.1e}").replace('-', "−");
    }
    let decimals = if size == 0.0 || size >= 10.0 {
        0
    } else {
        (1.0 - size.log10().floor()).clamp(0.0, 6.0) as usize
    };
    trimmed(&number(value, decimals))
}

/// A frequency with at most one decimal place: "21", "10.5".
pub(crate) fn hertz(value: f64) -> String {
    trimmed(&number(value, 1))
}

/// Without zeros that end a fraction.
fn trimmed(long: &str) -> String {
    if long.contains('.') {
        long.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        long.to_owned()
    }
}

/// A signed number of decibels, "+6.1 dB"; whole from 10 on.
pub(crate) fn decibels(value: f64) -> String {
    let sign = if value > 0.0 { "+" } else { "" };
    let decimals = usize::from(value.abs() < 9.95);
    format!("{sign}{} dB", number(value, decimals))
}

/// A contrast ratio as a factor: "2.83×", "12.4×", "310×".
pub(crate) fn factor(ratio: f64) -> String {
    // The same digits as in the readings and the tables.
    let decimals = match ratio {
        r if r >= 99.95 => 0,
        r if r >= 9.995 => 1,
        r if r >= 0.0995 || r <= 0.0 => 2,
        r if r >= 0.00995 => 3,
        _ => 4,
    };
    format!("{}×", number(ratio, decimals))
}

/// A tick of a ratio axis: "¼×", "½×", "1×", "1.5×", "2×".
pub(crate) fn ratio_tick(ratio: f64) -> String {
    let near = |v: f64| (ratio / v - 1.0).abs() < 1e-9;
    if near(0.125) {
        "⅛×".to_owned()
    } else if near(0.25) {
        "¼×".to_owned()
    } else if near(0.5) {
        "½×".to_owned()
    } else if ratio < 0.125 && near(1.0 / (1.0 / ratio).round()) {
        format!("1/{}×", (1.0 / ratio).round())
    } else {
        format!("{}×", trimmed(&number(ratio, 3)))
    }
}

/// Seconds of a recording as minutes and seconds, "1:30", or hours and minutes with "h" from an hour on.
pub(crate) fn clock(seconds: f64, hours: bool) -> String {
    let whole = seconds.abs().round() as u64;
    let sign = if seconds < -0.5 { "−" } else { "" };
    if hours {
        format!("{sign}{}:{:02} h", whole / 3600, whole % 3600 / 60)
    } else {
        format!("{sign}{}:{:02}", whole / 60, whole % 60)
    }
}

/// "1 trial", "40 trials".
pub(crate) fn count(n: usize, one: &str) -> String {
    if n == 1 {
        format!("1 {one}")
    } else {
        format!("{} {one}s", thousands(n))
    }
}

/// Thousands set off by commas: "1,000".
pub(crate) fn thousands(n: usize) -> String {
    let digits = n.to_string();
    let mut out = String::new();
    for (i, c) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            out.push(',');
        }
        out.push(c);
    }
    out
}
