//! One recording, one recipe, and the steps between them.
use crate::convert::{Outcome, from_js, thrown, to_js};
use crate::source::JsSource;
use crate::take;
use js_sys::Function;
use serde::{Deserialize, Serialize};
use std::mem;
use teasel_core::analysis::{self, Analysis, Progress, Proposal, Stage};
use teasel_core::demo;
use teasel_core::error::{Kind, Problem};
use teasel_core::recipe::{Given, Recipe, given_check};
use teasel_core::recording::{OpenOptions, Opening, Recording, SideFile};
use teasel_core::sheet::Sheet;
use teasel_core::takeaway::readings;
use wasm_bindgen::JsValue;
use wasm_bindgen::prelude::wasm_bindgen;

/// What a worker holds.
#[wasm_bindgen]
#[derive(Default)]
pub struct Session {
    state: State,
    /// The question that a demo brings along.
    brought: Option<Proposal>,
    /// What was told of the recording.
    given: Given,
}

#[derive(Default)]
enum State {
    #[default]
    Empty,
    Opening(Box<Opening>),
    Open(Box<Recording>),
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

    /// Reads a recording's header; `step` reads the rest. `read` is `(offset, length) => Uint8Array`, synchronous; `sides` is
    /// `[{name, bytes}]`; `salvage` opens the whole records before a cut; `given` is a recipe's `recording`.
    pub fn begin(
        &mut self,
        name: String,
        bytes: f64,
        read: Function,
        sides: JsValue,
        salvage: bool,
        given: JsValue,
    ) -> Outcome<()> {
        self.state = State::Empty;
        self.brought = None;
        let sides: Vec<NamedBytes> = from_js(sides)?;
        let sides = sides
            .into_iter()
            .map(|side| SideFile {
                name: side.name,
                bytes: side.bytes,
            })
            .collect();
        self.given = from_js(given)?;
        given_check(&self.given).map_err(thrown)?;
        let source = JsSource::new(name, bytes, read);
        let opening = Opening::begin(
            Box::new(source),
            sides,
            OpenOptions {
                salvage,
                given: self.given.clone(),
            },
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
        self.brought = Some(Proposal {
            recipe: made.recipe,
            why: why.to_owned(),
        });
        self.state = State::Open(Box::new(made.recording));
        Ok(())
    }

    /// `{recording, channels}` of what is open, before any recipe.
    pub fn summary(&self) -> Outcome<JsValue> {
        to_js(&analysis::summary(self.recording()?))
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
            State::Open(_) | State::Empty => return Err(thrown(nothing_open())),
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

    /// Channels as recorded over a span of time.
    pub fn traces(&self, from_s: f64, seconds: f64, channels: &[usize]) -> Outcome<JsValue> {
        to_js(&teasel_figures::traces(
            self.recording()?,
            from_s,
            seconds,
            channels,
        ))
    }

    /// A file to take away: `weights-json`, `weights-csv`, `results-json`, `recipe`, `report`, `everything`; `extras` is `[{name, bytes}]`.
    pub fn takeaway(&self, kind: &str, extras: JsValue) -> Outcome<Vec<u8>> {
        let State::Analysing(analysis) = &self.state else {
            return Err(thrown(nothing_open()));
        };
        let extras: Vec<NamedBytes> = from_js(extras)?;
        take::file(analysis, kind, extras).map_err(thrown)
    }
}

impl Session {
    fn finish_reading(&mut self) -> Outcome<()> {
        self.state = match mem::take(&mut self.state) {
            State::Opening(opening) => State::Open(Box::new(opening.finish().map_err(thrown)?)),
            other => other,
        };
        Ok(())
    }

    fn recording(&self) -> Outcome<&Recording> {
        match &self.state {
            State::Open(recording) => Ok(recording),
            State::Analysing(analysis) => Ok(analysis.recording()),
            State::Opening(_) | State::Empty => Err(thrown(nothing_open())),
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
