//! One recording, one recipe, and the steps between them.
use crate::convert::{Outcome, from_js, from_js_with_bytes, thrown, to_js};
use crate::source::JsSource;
use crate::take;
use serde::{Deserialize, Serialize};
use std::mem;
use teasel_core::analysis::lines::{Kind as LineKind, Lines, Track};
use teasel_core::analysis::{self, Analysis, Progress, Proposal, Stage, Summary};
use teasel_core::demo;
use teasel_core::error::{Kind, Problem};
use teasel_core::recipe::{Given, Recipe, given_check};
use teasel_core::recording::{
    Large, MEMORY_BYTES, OpenOptions, Opened, Opening, Recording, SideFile,
};
use teasel_core::sheet::Sheet;
use teasel_core::takeaway::{Fact, Form, Row, Weights, clean, excerpt, facts, readings};
use wasm_bindgen::JsValue;
use wasm_bindgen::prelude::wasm_bindgen;

/// What a worker holds.
#[wasm_bindgen]
#[derive(Default)]
pub struct Session {
    state: State,
    /// The question that a demo brings along.
    brought: Option<Proposal>,
    /// What was made to draw lines of what is open.
    lines: Lines,
    /// What was told of the recording.
    given: Given,
}

#[derive(Default)]
enum State {
    #[default]
    Empty,
    Opening(Box<Opening>),
    Open(Box<Recording>),
    /// Open, with its samples left in the file.
    Large(Box<Large>),
    Analysing(Box<Analysis>),
}

/// A small file, whole, as JavaScript hands it over.
#[derive(Deserialize)]
pub struct NamedBytes {
    /// Name without folder.
    pub name: String,
    /// Content.
    #[serde(with = "serde_bytes")]
    pub bytes: Vec<u8>,
}

/// The lines that can be drawn now.
#[derive(Serialize)]
struct Tracks {
    recorded: Track,
    prepared: Option<Track>,
    components: Option<Track>,
}

/// A [`Summary`], and what is told of it.
#[derive(Serialize)]
struct Summed {
    #[serde(flatten)]
    summary: Summary,
    facts: Vec<Fact>,
}

/// [`Progress`], and whether nothing is left.
#[derive(Serialize)]
struct Told {
    #[serde(flatten)]
    progress: Progress,
    finished: bool,
}

#[wasm_bindgen]
impl Session {
    /// Holds nothing.
    #[wasm_bindgen(constructor)]
    #[must_use]
    pub fn new() -> Session {
        Session::default()
    }

    /// Reads a recording's header; `step` reads the rest. `files` is `[{name, bytes, read}]`, the files of one recording in any order, `bytes` their
    /// lengths and `read` `(offset, length) => Uint8Array`, synchronous; `sides` is
    /// `[{name, bytes}]`; `salvage` opens the whole records before a cut; `given` is a recipe's `recording`.
    pub fn begin(
        &mut self,
        files: Vec<JsValue>,
        sides: JsValue,
        salvage: bool,
        given: JsValue,
    ) -> Outcome<()> {
        self.state = State::Empty;
        self.brought = None;
        self.lines = Lines::default();
        let sides: Vec<NamedBytes> = from_js_with_bytes(sides)?;
        let sides = sides
            .into_iter()
            .map(|side| SideFile {
                name: side.name,
                bytes: side.bytes,
            })
            .collect();
        self.given = from_js(given)?;
        given_check(&self.given).map_err(thrown)?;
        let sources: Outcome<Vec<_>> = files.iter().map(JsSource::of).collect();
        let opening = Opening::begin_joined(
            sources?,
            sides,
            OpenOptions {
                salvage,
                given: self.given.clone(),
            },
            MEMORY_BYTES,
        );
        self.state = State::Opening(Box::new(opening.map_err(thrown)?));
        Ok(())
    }

    /// Makes a demo recording: `watch` or `movie`.
    #[wasm_bindgen(js_name = beginDemo)]
    pub fn begin_demo(&mut self, which: &str) -> Outcome<()> {
        let (made, why) = match which {
            "watch" => (demo::night_watch(demo::WATCH_SEED), demo::WATCH_WHY),
            "movie" => (demo::drifting_dish(demo::DISH_SEED), demo::DISH_WHY),
            _ => return Err(thrown(unknown_demo(which))),
        };
        self.lines = Lines::default();
        self.brought = Some(Proposal {
            recipe: made.recipe,
            why: why.to_owned(),
        });
        self.state = State::Open(Box::new(made.recording));
        Ok(())
    }

    /// `{recording, channels, facts}` of what is open, before any recipe.
    pub fn summary(&self) -> Outcome<JsValue> {
        let summary = match &self.state {
            State::Large(large) => analysis::summary_of_large(large),
            _ => analysis::summary(self.recording()?),
        };
        to_js(&Summed {
            facts: facts(&summary.recording, &summary.channels),
            summary,
        })
    }

    /// `{recipe, why}`: a demo's own question, else one for the most frequent event; null where no event is frequent enough.
    pub fn propose(&self) -> Outcome<JsValue> {
        let recording = self.recording()?;
        let proposal = self.brought.clone();
        let mut proposal = proposal.or_else(|| analysis::propose(recording));
        if let Some(proposal) = &mut proposal {
            proposal.recipe.recording = self.given.clone();
        }
        to_js(&proposal)
    }

    /// Takes a recipe; what it makes stale is computed by the steps that follow. On a problem nothing changes.
    #[wasm_bindgen(js_name = setRecipe)]
    pub fn set_recipe(&mut self, recipe: JsValue) -> Outcome<()> {
        let recipe: Recipe = from_js(recipe)?;
        match mem::take(&mut self.state) {
            State::Open(recording) => {
                if let Err(problem) = analysis::fits(&recording, &recipe) {
                    self.state = State::Open(recording);
                    return Err(thrown(problem));
                }
                let analysis = Analysis::new(*recording, recipe).map_err(thrown)?;
                self.state = State::Analysing(Box::new(analysis));
                Ok(())
            }
            State::Large(large) => {
                if let Err(problem) = analysis::fits_large(&large, &recipe) {
                    self.state = State::Large(large);
                    return Err(thrown(problem));
                }
                let analysis = Analysis::of_large(*large, recipe).map_err(thrown)?;
                self.state = State::Analysing(Box::new(analysis));
                Ok(())
            }
            State::Analysing(mut analysis) => {
                let set = analysis.set_recipe(recipe);
                self.state = State::Analysing(analysis);
                set.map_err(thrown)
            }
            other => {
                self.state = other;
                Err(thrown(nothing_open()))
            }
        }
    }

    /// The next bite of reading or of analysis: `{stage, done, of, news, finished}`. Reading has finished when `summary` can be asked.
    pub fn step(&mut self) -> Outcome<JsValue> {
        let (progress, finished) = match &mut self.state {
            State::Opening(opening) => {
                let (done, of) = opening.step().map_err(thrown)?;
                let progress = Progress {
                    stage: Stage::Reading,
                    done,
                    of,
                    news: false,
                };
                (progress, opening.finished())
            }
            State::Analysing(analysis) => {
                let progress = analysis.step().map_err(thrown)?;
                (progress, analysis.finished())
            }
            State::Open(_) | State::Large(_) | State::Empty => return Err(thrown(nothing_open())),
        };
        if finished {
            self.finish_reading()?;
        }
        to_js(&Told { progress, finished })
    }

    /// Everything known so far, or null; of a movie without what has a value a pixel, which the page shows as pictures only.
    pub fn sheet(&self) -> Outcome<JsValue> {
        match self.known() {
            Some(sheet) if sheet.movie.is_some() => to_js(&sheet.without_pixels()),
            known => to_js(&known),
        }
    }

    /// The sentences beside the figures.
    pub fn readings(&self) -> Outcome<JsValue> {
        to_js(&self.known().map(readings).unwrap_or_default())
    }

    /// Names of the figures that can be drawn now.
    #[wasm_bindgen(js_name = figureNames)]
    #[must_use]
    pub fn figure_names(&self) -> Vec<String> {
        let known = self.known().map(teasel_figures::names).unwrap_or_default();
        known.into_iter().map(|(name, _)| name).collect()
    }

    /// One figure's data, or null.
    pub fn figure(&self, name: &str) -> Outcome<JsValue> {
        to_js(
            &self
                .known()
                .and_then(|sheet| teasel_figures::from_sheet(sheet, name)),
        )
    }

    /// Channels as recorded over a span of time; null where so much of a large recording would have to be read again.
    pub fn traces(&mut self, from_s: f64, seconds: f64, channels: &[usize]) -> Outcome<JsValue> {
        let Some(large) = self.large() else {
            let recording = self.recording()?;
            return to_js(&teasel_figures::traces(
                recording, from_s, seconds, channels,
            ));
        };
        if !large.reads_soon(seconds) {
            return Ok(JsValue::NULL);
        }
        let part = large.span(from_s, from_s + seconds).map_err(thrown)?;
        to_js(&teasel_figures::traces(&part, from_s, seconds, channels))
    }

    /// `{recorded, prepared, components}`: what lines there are now; the last two may be null.
    pub fn tracks(&mut self) -> Outcome<JsValue> {
        let recorded = match self.large() {
            Some(large) => Lines::recorded_large(large),
            None => Lines::recorded(self.recording()?),
        };
        let analysis = match &self.state {
            State::Analysing(analysis) => Some(analysis.as_ref()),
            _ => None,
        };
        to_js(&Tracks {
            recorded,
            prepared: analysis.and_then(Lines::prepared),
            components: analysis.and_then(Lines::components),
        })
    }

    /// Bins `first` to `first + count` of `size` samples of some lines of a kind (`recorded`, `prepared`, `components`): for each line
    /// the smallest and the largest value of each bin.
    pub fn bins(
        &mut self,
        kind: JsValue,
        which: &[usize],
        size: usize,
        first: usize,
        count: usize,
    ) -> Outcome<Vec<f32>> {
        let kind: LineKind = from_js(kind)?;
        if kind == LineKind::Recorded
            && let Some(large) = self.large()
        {
            return Lines::of_large(large, which, size, first, count).map_err(thrown);
        }
        let lines = &mut self.lines;
        match (&self.state, kind) {
            (State::Open(recording), LineKind::Recorded) => {
                Ok(lines.of_recorded(recording, which, size, first, count))
            }
            (State::Analysing(analysis), kind) => Ok(match kind {
                LineKind::Recorded => {
                    lines.of_recorded(analysis.recording(), which, size, first, count)
                }
                LineKind::Prepared => lines.of_prepared(analysis, which, size, first, count),
                LineKind::Components => lines.of_components(analysis, which, size, first, count),
            }),
            _ => Err(thrown(nothing_open())),
        }
    }

    /// A few seconds of the channels at which a component (`stronger 1`) is largest, its series beneath them.
    pub fn excerpt(&self, component: &str, from_s: f64, seconds: f64) -> Outcome<JsValue> {
        let found = excerpt(self.analysing()?, component, 5, from_s, seconds);
        let drawn = found.map(|recording| {
            let rows: Vec<usize> = (0..recording.channels.len()).collect();
            teasel_figures::traces(&recording, from_s, seconds, &rows)
        });
        to_js(&drawn)
    }

    /// What cleaning would do: `{note, others, shares, before, after}`, two figures of a few seconds; `components` are names, `how` is
    /// `remove` or `keep-only`.
    #[wasm_bindgen(js_name = cleanLook)]
    pub fn clean_look(
        &self,
        components: Vec<String>,
        how: JsValue,
        from_s: f64,
        seconds: f64,
    ) -> Outcome<JsValue> {
        let analysis = self.analysing()?;
        let cleaned = clean(analysis, &components, from_js(how)?).map_err(thrown)?;
        to_js(&take::Look::of(analysis, &cleaned, from_s, seconds))
    }

    /// A cleaned recording: `form` is `edf`, `npy` or `csv` (what it did to every channel).
    pub fn cleaned(&self, components: Vec<String>, how: JsValue, form: &str) -> Outcome<Vec<u8>> {
        let cleaned = clean(self.analysing()?, &components, from_js(how)?).map_err(thrown)?;
        let bytes = match form {
            "csv" => cleaned.csv().map(String::into_bytes),
            "npy" => cleaned.bytes(Form::Npy),
            _ => cleaned.bytes(Form::Edf),
        };
        bytes.map_err(thrown)
    }

    /// Saved filters on the recording that is open, around the windows of a recipe, without fitting anything:
    /// `{rows, notes, csv, figures}`.
    pub fn carry(&self, weights: &str, recipe: JsValue) -> Outcome<JsValue> {
        let weights = Weights::from_json(weights).map_err(thrown)?;
        let recipe: Recipe = from_js(recipe)?;
        let recording = match &self.state {
            State::Analysing(analysis) => analysis.recorded(),
            _ => self.recording()?,
        };
        let carried = weights.carry(recording, &recipe).map_err(thrown)?;
        to_js(&take::Told::of(&carried).map_err(thrown)?)
    }

    /// What this recording gives to the table and the group of a set, as the text of `row.json`.
    pub fn row(&self, folder: &str) -> Outcome<String> {
        let sheet = self.known().ok_or_else(|| thrown(nothing_open()))?;
        Row::of(sheet, folder).json().map_err(thrown)
    }

    /// A file to take away: `weights-json`, `weights-csv`, `results-json`, `recipe`, `report`, `everything`; `extras` is `[{name, bytes}]`.
    pub fn takeaway(&self, kind: &str, extras: JsValue) -> Outcome<Vec<u8>> {
        let State::Analysing(analysis) = &self.state else {
            return Err(thrown(nothing_open()));
        };
        let extras: Vec<NamedBytes> = from_js_with_bytes(extras)?;
        take::file(analysis, kind, extras).map_err(thrown)
    }
}

impl Session {
    fn finish_reading(&mut self) -> Outcome<()> {
        self.state = match mem::take(&mut self.state) {
            State::Opening(opening) => match opening.opened().map_err(thrown)? {
                Opened::Whole(recording) => State::Open(recording),
                Opened::Large(large) => State::Large(large),
            },
            other => other,
        };
        Ok(())
    }

    fn recording(&self) -> Outcome<&Recording> {
        match &self.state {
            State::Open(recording) => Ok(recording),
            State::Large(large) => Ok(large.outline()),
            State::Analysing(analysis) => Ok(analysis.recording()),
            State::Opening(_) | State::Empty => Err(thrown(nothing_open())),
        }
    }

    fn large(&mut self) -> Option<&mut Large> {
        match &mut self.state {
            State::Large(large) => Some(large),
            State::Analysing(analysis) => analysis.large(),
            _ => None,
        }
    }

    fn analysing(&self) -> Outcome<&Analysis> {
        match &self.state {
            State::Analysing(analysis) => Ok(analysis),
            _ => Err(thrown(nothing_open())),
        }
    }

    fn known(&self) -> Option<&Sheet> {
        match &self.state {
            State::Analysing(analysis) => Some(analysis.sheet()),
            _ => None,
        }
    }
}

fn nothing_open() -> Problem {
    Problem::new(
        Kind::Contrast,
        "no recording is open",
        "Open a recording first.",
    )
}

fn unknown_demo(which: &str) -> Problem {
    Problem::new(
        Kind::Unknown,
        format!("there is no demo recording called {which}"),
        "Open the demo recording watch or movie.",
    )
}
