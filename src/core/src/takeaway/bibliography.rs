//! The works that a methods paragraph cites, as BibTeX.

/// One entry from a line of the list of references: `Authors (year). Title. Journal volume, pages.` or
/// `Authors (year). Title. Publisher.`
pub(super) fn entry(line: &str) -> String {
    let (authors, rest) = line.split_once(" (").unwrap_or((line, ""));
    let (year, rest) = rest.split_once("). ").unwrap_or(("", rest));
    let (title, place) = split_title(rest);
    let place = place.trim_end_matches('.');
    let authors = people(authors);
    let first: String = authors
        .split(',')
        .next()
        .unwrap_or("")
        .chars()
        .filter(|c| c.is_ascii_alphanumeric())
        .collect();
    let key = format!("{}{year}", first.to_ascii_lowercase());
    let mut fields = vec![
        ("author", authors),
        ("year", year.to_owned()),
        ("title", format!("{{{title}}}")),
    ];
    // A journal's place ends in "volume, pages".
    let kind = match place.rsplit_once(", ") {
        Some((journal, pages)) if journal.ends_with(|c: char| c.is_ascii_digit()) => {
            let (name, volume) = journal.rsplit_once(' ').unwrap_or((journal, ""));
            fields.push(("journal", name.to_owned()));
            fields.push(("volume", volume.to_owned()));
            fields.push(("pages", pages.replace('–', "--")));
            "article"
        }
        _ => {
            fields.push(("publisher", place.to_owned()));
            "book"
        }
    };
    let lines: Vec<String> = fields
        .iter()
        .map(|(name, value)| format!("  {name} = {{{}}}", escaped(value)))
        .collect();
    format!("@{kind}{{{key},\n{}\n}}\n", lines.join(",\n"))
}

/// `Arsigny, V., Fillard, P. & Ayache, N.` → `Arsigny, V. and Fillard, P. and Ayache, N.`
fn people(authors: &str) -> String {
    let parts: Vec<&str> = authors.split(" & ").collect();
    let each = parts.iter().flat_map(|part| part.split("., "));
    let whole = each.map(|name| {
        let name = name.trim_end_matches(',');
        if name.ends_with('.') {
            name.to_owned()
        } else {
            format!("{name}.")
        }
    });
    whole.collect::<Vec<_>>().join(" and ")
}

/// The title ends at the last full stop before the journal or publisher.
fn split_title(rest: &str) -> (&str, &str) {
    let inner = rest.trim_end_matches('.');
    match inner.rfind(". ") {
        Some(at) => (&rest[..at], &rest[at + 2..]),
        None => (rest, ""),
    }
}

fn escaped(text: &str) -> String {
    text.replace('&', "\\&").replace('%', "\\%")
}

#[cfg(test)]
mod tests {
    use super::entry;

    #[test]
    fn an_article_and_a_book() {
        let article = entry(
            "Thomson, D. J. & Other, A.-B. (1982). Spectrum estimation. Proceedings of the IEEE 70, 1055–1096.",
        );
        let expected = "@article{thomson1982,\n  author = {Thomson, D. J. and Other, A.-B.},\n  year = {1982},\n  title = {{Spectrum estimation}},\n  journal = {Proceedings of the IEEE},\n  volume = {70},\n  pages = {1055--1096}\n}\n";
        assert_eq!(article, expected);
        let book = entry(
            "Fisher, N. I. (1993). Statistical Analysis of Circular Data. Cambridge University Press.",
        );
        assert!(
            book.starts_with("@book{fisher1993,")
                && book.contains("publisher = {Cambridge University Press}"),
            "{book}"
        );
    }
}
