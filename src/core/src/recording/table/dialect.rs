//! What separates columns, what marks decimals, which column is what: decided from the first rows.
use super::time::{self, Clock};
use crate::error::{Kind, Problem, Result};
use crate::recording::names::counted;

/// Bytes from which the dialect is decided.
pub(super) const HEAD_BYTES: u64 = 1 << 20;
/// What may separate columns, in the order in which they are tried.
const SEPARATORS: [u8; 3] = [b'\t', b';', b','];
/// Rows that are looked at.
const LOOKED_AT: usize = 2000;
/// Names of columns that hold events, without a plural's s.
const EVENT_NAMES: [&str; 7] = [
    "event",
    "marker",
    "trigger",
    "stimulus",
    "status",
    "annotation",
    "label",
];

/// What a column holds.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Role {
    /// Samples, with the unit that the header gives.
    Channel { name: String, unit: Option<String> },
    /// Time.
    Time(Clock),
    /// Marks.
    Events { name: String },
    /// Not used, for this reason.
    Other { name: String, reason: &'static str },
}

/// How the table is written.
#[derive(Debug, Clone)]
pub(super) struct Dialect {
    pub(super) separator: u8,
    pub(super) decimal_comma: bool,
    /// Bytes before the first row: a byte order mark.
    pub(super) skip: u64,
    pub(super) has_header: bool,
    pub(super) columns: Vec<Role>,
    pub(super) warnings: Vec<String>,
}

/// How sure a table is, from a file's first bytes: plain text whose first rows hold numbers.
pub(super) fn score(head: &[u8]) -> u8 {
    let text = head.strip_prefix(b"\xef\xbb\xbf").unwrap_or(head);
    let is_text = |b: &u8| *b >= b' ' || b"\t\r\n".contains(b);
    if !text.iter().all(is_text) || text.first().is_some_and(|b| b"{[<".contains(b)) {
        return 0;
    }
    if !text.contains(&b'\n') && head.len() >= 4096 {
        return first_row_score(text);
    }
    let whole = whole_rows(text, head.len() < 4096);
    let Some(separator) = separator(whole) else {
        return 0;
    };
    let numbers = rows(whole, separator)
        .iter()
        .skip(1)
        .flat_map(|row| {
            row.iter()
                .map(|cell| either(cell, true).is_some())
                .collect::<Vec<_>>()
        })
        .fold((0_usize, 0_usize), |(yes, all), is| {
            (yes + usize::from(is), all + 1)
        });
    match numbers {
        (yes, all) if all > 0 && 2 * yes >= all => 20,
        _ => 0,
    }
}

/// A first row longer than what a probe sees: many columns of names or numbers.
fn first_row_score(text: &[u8]) -> u8 {
    let most = |separator: &u8| text.iter().filter(|b| *b == separator).count();
    match SEPARATORS.iter().map(most).max() {
        Some(columns) if columns >= 100 => 10,
        _ => 0,
    }
}

/// Text up to its last line end; all of it where it is the whole file.
fn whole_rows(text: &[u8], is_all: bool) -> &[u8] {
    match text.iter().rposition(|&b| b == b'\n') {
        Some(end) if !is_all => &text[..=end],
        _ => text,
    }
}

fn rows(text: &[u8], separator: u8) -> Vec<csv::ByteRecord> {
    csv::ReaderBuilder::new()
        .delimiter(separator)
        .comment(Some(b'#'))
        .has_headers(false)
        .flexible(true)
        .trim(csv::Trim::All)
        .from_reader(text)
        .into_byte_records()
        .take(LOOKED_AT)
        .map_while(std::result::Result::ok)
        .collect()
}

/// The first separator that stands in every row, equally often in two of three.
fn separator(text: &[u8]) -> Option<u8> {
    SEPARATORS.into_iter().find(|&separator| {
        let counts: Vec<usize> = rows(text, separator)
            .iter()
            .map(csv::ByteRecord::len)
            .collect();
        let Some(&first) = counts.first() else {
            return false;
        };
        let same = counts.iter().filter(|&&n| n == first).count();
        counts.len() > 1 && first > 1 && 3 * same >= 2 * counts.len()
    })
}

/// A cell as a number, whatever its decimal mark where `comma_may` be one.
fn either(cell: &[u8], comma_may: bool) -> Option<f64> {
    number(cell, false).or_else(|| number(cell, true).filter(|_| comma_may))
}

/// A cell as a number; with `comma` a comma marks its decimals and a point does not.
pub(super) fn number(cell: &[u8], comma: bool) -> Option<f64> {
    let mut digits = [0_u8; 48];
    let digits = digits.get_mut(..cell.len())?;
    digits.copy_from_slice(cell);
    if comma {
        if digits.contains(&b'.') {
            return None;
        }
        if let Some(mark) = digits.iter_mut().find(|b| **b == b',') {
            *mark = b'.';
        }
    }
    let first = digits.iter().find(|b| !b"+-".contains(b))?;
    // "inf" and "nan" are numbers to the parser, and none to a recorder.
    if !(first.is_ascii_digit() || *first == b'.') {
        return None;
    }
    std::str::from_utf8(digits).ok()?.parse().ok()
}

/// Whether a cell says that there is no number.
pub(super) fn is_missing(cell: &[u8]) -> bool {
    let words: [&[u8]; 4] = [b"nan", b"na", b"n/a", b"null"];
    cell.is_empty() || words.iter().any(|word| cell.eq_ignore_ascii_case(word))
}

/// Decides everything from the first bytes of a file.
pub(super) fn decide(head: &[u8], is_all: bool) -> Result<Dialect> {
    let text = head.strip_prefix(b"\xef\xbb\xbf").unwrap_or(head);
    let skip = (head.len() - text.len()) as u64;
    let whole = whole_rows(text, is_all);
    let separator = separator(whole).ok_or_else(|| {
        super::read::damaged("the rows of the table differ in their columns")
            .at("the first rows")
            .expected_found("as many columns in every row", "another number in each")
    })?;
    let rows = rows(whole, separator);
    let (first, rest) = rows.split_first().ok_or_else(nothing)?;
    let comma_may = separator != b',';
    let is_name = |cell: &[u8]| !is_missing(cell) && either(cell, comma_may).is_none();
    let has_header = first.iter().any(is_name);
    let body = if has_header { rest } else { &rows[..] };
    if body.is_empty() {
        return Err(nothing());
    }
    let names: Vec<String> = match has_header {
        true => first.iter().map(text_of).collect(),
        false => vec![String::new(); first.len()],
    };
    if names.iter().any(|name| name.eq_ignore_ascii_case("onset")) {
        return Err(Problem::new(
            Kind::Unsupported,
            "this is a table of events, not of samples",
            "open the recording it belongs to, and drop this table with it",
        )
        .at("line 1")
        .expected_found("a column for each channel", "a column named onset"));
    }
    let decimal_comma = comma_may && commas(body);
    let mut dialect = Dialect {
        separator,
        decimal_comma,
        skip,
        has_header,
        columns: Vec::new(),
        warnings: Vec::new(),
    };
    let mut channels = 0;
    for (index, name) in names.iter().enumerate() {
        let cells = Cells {
            body,
            index,
            decimal_comma,
        };
        let role = dialect.role(name, index, &cells, &mut channels);
        dialect.columns.push(role);
    }
    if channels == 0 {
        return Err(super::read::damaged("no column of the table holds samples")
            .at("line 1")
            .expected_found(
                "a column of numbers for each channel",
                counted(names.len() as u64, "other column"),
            ));
    }
    Ok(dialect)
}

fn nothing() -> Problem {
    Problem::new(
        Kind::Empty,
        "the table has no row of samples",
        "check whether it was saved whole",
    )
    .expected_found("rows of numbers", "none")
}

fn text_of(cell: &[u8]) -> String {
    let text = match std::str::from_utf8(cell) {
        Ok(text) => text.to_owned(),
        Err(_) => cell.iter().map(|&b| b as char).collect(),
    };
    text.chars()
        .filter(|c| !c.is_control())
        .collect::<String>()
        .trim()
        .to_owned()
}

/// Whether the numbers mark their decimals with a comma: more of them than with a point.
fn commas(body: &[csv::ByteRecord]) -> bool {
    let cells = || body.iter().flat_map(csv::ByteRecord::iter);
    let with = |mark: u8| {
        cells()
            .filter(|cell| cell.contains(&mark) && either(cell, true).is_some())
            .count()
    };
    with(b',') > with(b'.')
}

/// One column of the first rows.
pub(super) struct Cells<'a> {
    body: &'a [csv::ByteRecord],
    index: usize,
    decimal_comma: bool,
}

impl Cells<'_> {
    fn cells(&self) -> impl Iterator<Item = &[u8]> {
        self.body
            .iter()
            .map(|row| row.get(self.index).unwrap_or(b""))
    }
    /// The numbers; `None` where a cell is none.
    pub(super) fn numbers(&self) -> Option<Vec<f64>> {
        self.cells()
            .map(|cell| number(cell, self.decimal_comma))
            .collect()
    }
    fn is_text(&self) -> bool {
        let mut some = false;
        for cell in self.cells() {
            if number(cell, self.decimal_comma).is_some() {
                return false;
            }
            some |= !is_missing(cell);
        }
        some
    }
}

impl Dialect {
    fn role(&mut self, name: &str, index: usize, cells: &Cells<'_>, channels: &mut usize) -> Role {
        let plain = name.to_lowercase();
        let singular = plain.strip_suffix('s').unwrap_or(&plain);
        if EVENT_NAMES.contains(&singular) {
            return Role::Events {
                name: name.to_owned(),
            };
        }
        let taken = self
            .columns
            .iter()
            .any(|role| matches!(role, Role::Time(_)));
        if !taken && let Some(factor) = time::factor(&plain) {
            let clock = Clock::new(name, factor, &cells.numbers().unwrap_or_default());
            return Role::Time(clock);
        }
        if index == 0
            && let Some(numbers) = cells.numbers()
        {
            if time::counts(&numbers, name) {
                return Role::Other {
                    name: if name.is_empty() {
                        "column 1".to_owned()
                    } else {
                        name.to_owned()
                    },
                    reason: "it counts the samples",
                };
            }
            if time::rises_evenly(&numbers) {
                let called = if name.is_empty() {
                    "The first column".to_owned()
                } else {
                    format!("The column \"{name}\"")
                };
                self.warnings.push(format!(
                    "{called} rises by equal steps and was taken for the time in seconds."
                ));
                return Role::Time(Clock::new(name, 1.0, &numbers));
            }
        }
        if cells.is_text() {
            return Role::Other {
                name: name.to_owned(),
                reason: "it holds text",
            };
        }
        *channels += 1;
        let (label, unit) = time::unit_of(name);
        Role::Channel {
            name: match label.as_str() {
                "" => format!("channel {channels}"),
                _ => label,
            },
            unit,
        }
    }
}
