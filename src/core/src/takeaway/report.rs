//! The report: one page of HTML that needs nothing else, without scripts, that prints on A4.
//!
//! Names from a file are escaped by `maud` and isolated by `<bdi>`; a policy in the page forbids it to load anything.
use super::methods::{methods, references};
use super::readings::{self, Reading, Section, Span, Tone};
use super::recipe_file::recipe_json;
use super::words;
use crate::recipe::{Measure, Reference, ReferenceWord};
use crate::sheet::{
    ChannelState, Comparator, ComparatorKind, Component, End, Sheet, TotalRatio, TypicalRatio,
};
use maud::{DOCTYPE, Markup, PreEscaped, html};

const STYLE: &str = include_str!("report.css");
const POLICY: &str = "default-src 'none'; style-src 'unsafe-inline'; img-src data:; base-uri 'none'; form-action 'none'";

/// A figure of the report: name, caption, SVG.
type Drawn = (String, String, String);

/// The report of a sheet. `figures` are (name, caption, SVG text); the SVG goes in as it is, so it must come from
/// `teasel_figures`, which escapes what it writes. Figures whose section has nothing to say are left out.
pub fn report_html(sheet: &Sheet, figures: &[Drawn]) -> String {
    let page = Page {
        sheet,
        figures,
        readings: readings::readings(sheet),
    };
    page.whole().into_string()
}

struct Page<'a> {
    sheet: &'a Sheet,
    figures: &'a [Drawn],
    readings: Vec<Reading>,
}

/// A name from a file, isolated from the direction of the text around it.
fn named(text: &str) -> Markup {
    html! { bdi { (words::plain(text, 120)) } }
}

fn spans(spans: &[Span]) -> Markup {
    html! {
        @for span in spans {
            @match span.tone {
                Tone::Plain => { (span.text) }
                Tone::Strong => { b { (span.text) } }
                Tone::Signal => { b.s { (span.text) } }
                Tone::Reference => { b.r { (span.text) } }
            }
        }
    }
}

impl Page<'_> {
    fn reading(&self, section: Section) -> Option<&Reading> {
        self.readings.iter().find(|r| r.section == section)
    }

    fn whole(&self) -> Markup {
        let name = words::plain(&self.sheet.recording.name, 120);
        html! {
            (DOCTYPE)
            html lang="en" {
                head {
                    meta charset="utf-8";
                    meta http-equiv="Content-Security-Policy" content=(POLICY);
                    meta name="viewport" content="width=device-width, initial-scale=1";
                    meta name="generator" content={ (crate::PROGRAM) " " (crate::VERSION) };
                    title { (name) " · " (crate::PROGRAM) " report" }
                    style { (PreEscaped(STYLE)) }
                }
                body {
                    div.sheet {
                        header.top {
                            span.brand { (crate::PROGRAM) " report" }
                            span.what { (named(&name)) " · " (self.question()) }
                        }
                        main {
                            (self.finding())
                            (self.step(Section::Recording, self.recording()))
                            (self.step(Section::Channels, self.channels()))
                            (self.step(Section::Windows, self.figure("windows")))
                            (self.step(Section::Compression, self.compression()))
                            (self.step(Section::Components, self.components()))
                            (self.step(Section::Evidence, self.evidence()))
                            (self.doubts())
                            (self.methods())
                            (self.recipe())
                        }
                        footer.foot {
                            span { b { (crate::CAUTION) } }
                            span { (crate::PROGRAM) " " (crate::VERSION) }
                        }
                    }
                }
            }
        }
    }

    fn question(&self) -> Markup {
        let Some((signal, reference)) = words::windows(&self.sheet.recipe.contrast) else {
            let [first, second] = super::kinds::sides(&self.sheet.recipe.contrast);
            return html! {
                "what differs between " span.s { (first) } " and " span.r { (second) } "?"
            };
        };
        html! {
            "what differs between " span.s { (words::window(signal)) }
            " from " (named(&signal.event)) " and " span.r { (words::window(reference)) }
            " from " (named(&reference.event)) "?"
        }
    }

    fn finding(&self) -> Markup {
        html! {
            @if let Some(reading) = self.reading(Section::SoFar) {
                section.finding aria-labelledby="h-so-far" {
                    h1 id="h-so-far" { "The finding" }
                    p.say { (spans(&reading.text)) }
                    @if let Some(but) = &reading.but { p.but { i { "But" } " " (spans(but)) } }
                }
            }
        }
    }

    /// A section: heading, reading and doubt in the margin, the rest beside them.
    fn step(&self, section: Section, inside: Markup) -> Markup {
        html! {
            @if let Some(reading) = self.reading(section) {
                section.step aria-labelledby={ "h-" (section.id()) } {
                    div.margin {
                        h2 id={ "h-" (section.id()) } { (section.title()) }
                        p.reading { (spans(&reading.text)) }
                        @if let Some(but) = &reading.but { p.but { i { "But" } " " (spans(but)) } }
                    }
                    div { (inside) }
                }
            }
        }
    }

    fn plain_step(id: &str, title: &str, inside: Markup) -> Markup {
        html! {
            section.step aria-labelledby={ "h-" (id) } {
                div.margin { h2 id={ "h-" (id) } { (title) } }
                div { (inside) }
            }
        }
    }

    fn svg(&self, name: &str) -> Option<&Drawn> {
        self.figures.iter().find(|(n, _, _)| n == name)
    }

    /// A figure with its caption; its text alternative is in the SVG, its reading beside it.
    fn figure(&self, name: &str) -> Markup {
        self.figure_in(name, "")
    }

    /// Under a heading that names the component, the caption goes on without its name.
    fn figure_in(&self, name: &str, class: &str) -> Markup {
        html! {
            @if let Some((_, caption, svg)) = self.svg(name) {
                @let own = name.starts_with("stronger-") || name.starts_with("weaker-");
                @let caption = match caption.split_once(": ") {
                    Some((_, rest)) if own => words::capital(rest),
                    _ => caption.clone(),
                };
                figure class=[(!class.is_empty()).then_some(class)] {
                    figcaption { (caption) }
                    (drawing(svg))
                }
            }
        }
    }

    fn recording(&self) -> Markup {
        let card = &self.sheet.recording;
        html! {
            dl.facts {
                dt { "file" } dd { (named(&card.name)) }
                dt { "format" } dd { (named(&card.format)) }
                dt { "length" } dd { (words::duration(card.duration_s)) " at " (words::hertz(card.rate_hz)) }
                @if !card.events.is_empty() {
                    dt { "events" }
                    dd {
                        @for (k, (label, count)) in card.events.iter().take(12).enumerate() {
                            @if k > 0 { ", " }
                            (named(label)) " " (words::grouped(*count))
                        }
                        @if card.events.len() > 12 { " and " (card.events.len() - 12) " more kinds" }
                    }
                }
                @for side in &card.side_files { dt { "side file" } dd { (named(side)) } }
                @for other in card.others.iter().take(8) {
                    dt { "not analysed" } dd { (named(&other.name)) ": " (named(&other.reason)) }
                }
                @if card.others.len() > 8 { dt {} dd { (card.others.len() - 8) " more" } }
            }
            (self.figure("overview"))
        }
    }

    fn channels(&self) -> Markup {
        let of = |pick: fn(&ChannelState) -> bool| -> Vec<&str> {
            self.sheet
                .channels
                .iter()
                .filter(|c| pick(&c.state))
                .map(|c| c.name.as_str())
                .collect()
        };
        let out = of(|s| matches!(s, ChannelState::LeftOut | ChannelState::Unusable(_)));
        let replaced = of(|s| matches!(s, ChannelState::Interpolated));
        html! {
            div.pair { dl.facts {
                @if !out.is_empty() { dt { "left out" } dd { (list(&out)) } }
                @if !replaced.is_empty() { dt { "interpolated" } dd { (list(&replaced)) } }
                dt { "reference" }
                dd {
                    @match &self.sheet.recipe.channels.reference {
                        Reference::Word(ReferenceWord::AsRecorded) => { "as recorded" }
                        Reference::Word(ReferenceWord::Average) => { "average of the used channels" }
                        Reference::Named(names) => {
                            (list(&names.iter().map(String::as_str).collect::<Vec<_>>()))
                        }
                        Reference::Bipolar(_) => { "differences of two channels each" }
                    }
                }
                @if let Some(card) = &self.sheet.preparation {
                    dt { "filters" }
                    dd {
                        @if card.filters.is_empty() { "none" }
                        @for (k, filter) in card.filters.iter().enumerate() { @if k > 0 { br; } (filter) }
                    }
                    dt { "after it" } dd { (card.channels.len()) " channels of rank " (card.rank) " at " (words::hertz(card.rate_hz)) }
                }
            } (self.figure_in("channels-map", "narrow")) }
            (self.figure("channels"))
        }
    }

    fn compression(&self) -> Markup {
        html! { (self.figure("eigenvalues")) (self.figure("keep")) }
    }

    fn components(&self) -> Markup {
        let sheet = self.sheet;
        html! {
            div.scroll tabindex="0" role="region" aria-label="What differs" { table.comps {
                caption { "What differs" }
                thead {
                    tr {
                        th scope="col" {}
                        th.l scope="col" { "pattern" }
                        th.l scope="col" { "spectrum" }
                        th.l scope="col" { "largest at" }
                        th scope="col" { "peak" }
                        th scope="col" { "typical, held-out" }
                        th scope="col" { "total, held-out" }
                        th scope="col" { "fitted" }
                        th scope="col" { "p" }
                    }
                }
                tbody {
                    @if !sheet.stronger.is_empty() { tr.end { td colspan="9" { span.s { "Stronger in signal" } } } }
                    @for (k, component) in sheet.stronger.iter().enumerate() { (self.row("stronger", k, component)) }
                    @if !sheet.weaker.is_empty() { tr.end { td colspan="9" { span.r { "Weaker in signal" } } } }
                    @for (k, component) in sheet.weaker.iter().enumerate() { (self.row("weaker", k, component)) }
                }
            } }
            @for (end, k) in self.looked_at() { (self.close_up(end, k)) }
        }
    }

    fn row(&self, end: &str, k: usize, component: &Component) -> Markup {
        let small = |part: &str| {
            html! {
                @if let Some((_, _, svg)) = self.svg(&format!("{end}-{}-{part}", k + 1)) { (drawing(svg)) }
            }
        };
        // A ratio that could not be tested is not quoted alone.
        let fitted = match (held_out_any(component), self.sheet.recipe.measure) {
            (false, _) => None,
            (true, Measure::Typical) => Some(component.typical.fitted),
            (true, Measure::Total) => Some(component.total.fitted),
        };
        html! {
            tr.not[!readings::passes(component)] {
                th scope="row" { (k + 1) }
                td { (small("map-small")) }
                td { (small("spectrum-small")) }
                td.l { (named(&component.largest_at)) }
                td { @if let Some(hz) = component.peak_hz { (words::hertz(hz)) } @else { "–" } }
                (typical_cell(&component.typical))
                (total_cell(&component.total))
                td { @if let Some(ratio) = fitted { (words::factor(ratio)) } @else { "–" } }
                td { @if let Some(p) = component.p { (words::p_value(p)) } @else { "–" } }
            }
        }
    }

    /// Components shown large: those that pass, at most three at each end; the first of each end where none does.
    fn looked_at(&self) -> Vec<(&'static str, usize)> {
        let end = |name, components: &[Component]| -> Vec<(&'static str, usize)> {
            (0..components.len())
                .filter(|k| readings::passes(&components[*k]))
                .take(3)
                .map(|k| (name, k))
                .collect()
        };
        let mut all = end("stronger", &self.sheet.stronger);
        all.extend(end("weaker", &self.sheet.weaker));
        if all.is_empty() {
            all.extend((!self.sheet.stronger.is_empty()).then_some(("stronger", 0)));
            all.extend((!self.sheet.weaker.is_empty()).then_some(("weaker", 0)));
        }
        all
    }

    fn close_up(&self, end: &str, k: usize) -> Markup {
        let name = |part: &str| format!("{end}-{}-{part}", k + 1);
        let drawn = |part: &str| self.svg(&name(part)).is_some();
        let any = ["map", "spectrum", "filter", "course", "average", "trials"]
            .iter()
            .any(|p| drawn(p));
        html! {
            @if any {
                div.comp {
                    h3 { span class=(if end == "stronger" { "s" } else { "r" }) { (words::capital(end)) " component " (k + 1) } }
                    div.pair {
                        (self.figure_in(&name("map"), "narrow"))
                        (self.figure_in(&name("filter"), "narrow"))
                    }
                    (self.figure(&name("spectrum")))
                    (self.figure(&name("course")))
                    (self.figure(&name("average")))
                    (self.figure(&name("trials")))
                }
            }
        }
    }

    fn evidence(&self) -> Markup {
        let sheet = self.sheet;
        html! {
            @if let Some(test) = &sheet.permutation {
                dl.facts {
                    dt { "null hypothesis" } dd { (test.null) }
                    dt { "arrangements" }
                    dd {
                        (words::grouped(test.done))
                        @if test.exact { ", all there are" } @else if test.done < test.asked { " of " (words::grouped(test.asked)) " so far" }
                    }
                    dt { "p" }
                    dd { "family-wise over the components of an end: each is compared with the most extreme one of every arrangement" }
                }
            }
            @if !sheet.compare.is_empty() { (self.comparators()) }
            (self.figure("beside"))
            div.pair { (self.figure("alike")) (self.figure("alike-weaker")) }
            (self.figure("trial-by-trial"))
        }
    }

    fn comparators(&self) -> Markup {
        let first = self.sheet.first();
        let name = match self.sheet.leading {
            End::Stronger => "Component 1",
            End::Weaker => "Weaker component 1",
        };
        html! {
            table {
                caption { "Beside it, on the same held-out windows" }
                thead { tr { th scope="col" {} th.l scope="col" { "chosen" } th scope="col" { "typical" } th scope="col" { "total" } } }
                tbody {
                    @if let Some(component) = first {
                        tr {
                            th scope="row" { (name) } td.l {}
                            (typical_cell(&component.typical)) (total_cell(&component.total))
                        }
                    }
                    @for comparator in &self.sheet.compare {
                        tr {
                            th scope="row" { (rival(comparator.kind)) }
                            td.l { (chosen(comparator)) }
                            (typical_cell(&comparator.typical)) (total_cell(&comparator.total))
                        }
                    }
                }
            }
        }
    }

    fn doubts(&self) -> Markup {
        html! {
            @if !self.sheet.warnings.is_empty() {
                (Self::plain_step("doubts", "What to doubt", html! {
                    ul.doubts { @for warning in &self.sheet.warnings { li { bdi { (words::plain(warning, 600)) } } } }
                }))
            }
        }
    }

    fn methods(&self) -> Markup {
        Self::plain_step(
            "methods",
            "Methods",
            html! {
                p.methods { (methods(self.sheet)) }
                ul.works { @for work in references(self.sheet) { li { (work) } } }
            },
        )
    }

    fn recipe(&self) -> Markup {
        html! {
            @if let Ok(json) = recipe_json(&self.sheet.recipe) {
                (Self::plain_step("recipe", "Recipe", html! {
                    p.quiet style="margin-bottom:10px" { "With the recording, this file gives every number here again, on the page or in the terminal." }
                    pre { (visible(&json)) }
                }))
            }
        }
    }
}

/// A drawing of ours as it is, without marks that turn the direction of writing: a label may hold one.
fn drawing(svg: &str) -> PreEscaped<String> {
    PreEscaped(svg.chars().filter(|c| !words::invisible(*c)).collect())
}

/// Marks that turn the direction of writing, made visible as JSON writes them, so that the text stays valid and honest.
fn visible(json: &str) -> String {
    json.chars()
        .map(|c| {
            if words::invisible(c) {
                format!("\\u{:04x}", c as u32)
            } else {
                c.to_string()
            }
        })
        .collect()
}

fn held_out_any(component: &Component) -> bool {
    component.typical.held_out.is_some() || component.total.held_out.is_some()
}

fn list(names: &[&str]) -> Markup {
    html! { @for (k, name) in names.iter().enumerate() { @if k > 0 { ", " } (named(name)) } }
}

fn typical_cell(ratio: &TypicalRatio) -> Markup {
    html! {
        td {
            @if let Some(held) = ratio.held_out {
                b { (words::factor(held)) }
                @if let Some(bounds) = ratio.interval { small { (words::interval(bounds)) } }
                @else { small { (words::decibels(held)) } }
            } @else { "–" }
        }
    }
}

fn total_cell(ratio: &TotalRatio) -> Markup {
    html! { td { @if let Some(held) = ratio.held_out { (words::factor(held)) } @else { "–" } } }
}

fn rival(kind: ComparatorKind) -> &'static str {
    match kind {
        ComparatorKind::FirstPc => "First principal component",
        ComparatorKind::BestPc => "Best principal component",
        ComparatorKind::BestChannel => "Best channel",
        ComparatorKind::MeanOfChannels => "Mean of all channels",
        ComparatorKind::RandomDirection => "Random direction",
    }
}

fn chosen(comparator: &Comparator) -> Markup {
    html! {
        @match comparator.kind {
            ComparatorKind::FirstPc | ComparatorKind::MeanOfChannels | ComparatorKind::RandomDirection => {}
            ComparatorKind::BestPc => { @if let Some(index) = &comparator.chosen { "number " (named(index)) } }
            ComparatorKind::BestChannel => { @if let Some(name) = &comparator.chosen { (named(name)) } }
        }
        @if let (Some(folds), false) = (comparator.chosen_in_folds, comparator.kind == ComparatorKind::FirstPc) {
            small { "in " (folds) " " (words::one(folds, "fold", "folds")) }
        }
        @if let Some(share) = comparator.share {
            small { (words::percent(share)) " of the variance" }
        }
    }
}
