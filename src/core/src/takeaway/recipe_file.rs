//! `recipe.json`: written with every default in place, read strictly.
use super::strict::{self, Shape};
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Recipe, recipe_check};

type Keys = &'static [(&'static str, bool, Shape)];

const EVENT_WINDOW_KEYS: Keys = &[
    ("event", true, Shape::Text),
    ("also", false, Shape::List(&Shape::Text)),
    ("from_s", true, Shape::Number),
    ("to_s", true, Shape::Number),
    ("until", false, Shape::Maybe(&Shape::Text)),
    ("first", false, Shape::Maybe(&Shape::Whole)),
    ("last", false, Shape::Maybe(&Shape::Whole)),
    ("leave_out", false, Shape::List(&Shape::Whole)),
    ("equal", false, Shape::Flag),
];
const EVENT_WINDOW: Shape = Shape::Object(EVENT_WINDOW_KEYS);

const SPAN_LIST: Shape = Shape::List(&Shape::Pair);
const SPANS: Shape = Shape::Either(
    &[SPAN_LIST, Shape::Text],
    "a list of spans [[from, to], …] in seconds, or the label of annotations",
);
const WITHIN: Shape = Shape::Maybe(&Shape::Either(
    &[SPAN_LIST, Shape::Text, EVENT_WINDOW],
    "a window around events, a list of spans [[from, to], …] in seconds, or the label of annotations",
));
const PIECE: Shape = Shape::Maybe(&Shape::Number);

const CONTRAST: Shape = Shape::Kinds(&[
    (
        "windows",
        &[
            ("signal", true, EVENT_WINDOW),
            ("reference", true, EVENT_WINDOW),
        ],
    ),
    (
        "spans",
        &[
            ("signal", true, SPANS),
            ("reference", true, SPANS),
            ("piece_s", false, PIECE),
        ],
    ),
    (
        "band",
        &[
            ("centre_hz", true, Shape::Number),
            ("half_width_hz", true, Shape::Number),
            ("reference", false, Shape::Word(&["flanks", "broadband"])),
            ("within", false, WITHIN),
            ("piece_s", false, PIECE),
        ],
    ),
    ("repeatable", EVENT_WINDOW_KEYS),
    (
        "slow",
        &[
            ("lag_s", true, Shape::Number),
            ("within", false, WITHIN),
            ("piece_s", false, PIECE),
        ],
    ),
]);

const RECORDING: Shape = Shape::Object(&[
    ("rate_hz", false, Shape::Maybe(&Shape::Number)),
    ("unit", false, Shape::Maybe(&Shape::Text)),
    (
        "axes",
        false,
        Shape::Maybe(&Shape::Word(&[
            "channels,samples",
            "samples,channels",
            "frames,height,width",
        ])),
    ),
    ("variable", false, Shape::Maybe(&Shape::Text)),
    ("events", false, Shape::Maybe(&EVENTS)),
]);

const EVENTS: Shape = Shape::Object(&[
    ("onset", true, Shape::Text),
    ("unit", false, Shape::Word(&["s", "ms", "samples"])),
    ("label", false, Shape::Maybe(&Shape::Text)),
    ("duration", false, Shape::Maybe(&Shape::Text)),
]);

const PAIRS: Shape = Shape::Either(
    &[
        Shape::Word(&["neighbours"]),
        Shape::List(&Shape::List(&Shape::Text)),
    ],
    "\"neighbours\" or a list of pairs of channel names",
);

pub(super) const CHANNELS: Shape = Shape::Object(&[
    ("leave_out", false, Shape::List(&Shape::Text)),
    ("interpolate", false, Shape::List(&Shape::Text)),
    ("keep", false, Shape::List(&Shape::Text)),
    (
        "reference",
        false,
        Shape::Either(
            &[
                Shape::Word(&["as recorded", "average"]),
                Shape::List(&Shape::Text),
                Shape::Object(&[("bipolar", true, PAIRS)]),
            ],
            "\"as recorded\", \"average\", a list of channel names or {\"bipolar\": …}",
        ),
    ),
    ("positions", false, POSITIONS),
]);

const POSITIONS: Shape = Shape::Object(&[
    (
        "grid",
        false,
        Shape::Object(&[
            ("rows", true, Shape::Whole),
            ("columns", true, Shape::Whole),
            ("spacing_mm", false, Shape::Number),
            (
                "first",
                false,
                Shape::Word(&["top-left", "top-right", "bottom-left", "bottom-right"]),
            ),
            ("along", false, Shape::Word(&["rows", "columns"])),
            ("prefix", false, Shape::Text),
        ]),
    ),
    (
        "probe",
        false,
        Shape::Object(&[
            ("spacing_um", true, Shape::Number),
            ("order", false, Shape::Word(&["top-down", "bottom-up"])),
            ("prefix", false, Shape::Text),
        ]),
    ),
    ("at", false, Shape::Named(&Shape::List(&Shape::Number))),
]);

pub(super) const FILTER: Shape = Shape::Object(&[
    ("high_pass_hz", false, Shape::Maybe(&Shape::Number)),
    ("low_pass_hz", false, Shape::Maybe(&Shape::Number)),
    ("notch_hz", false, Shape::List(&Shape::Number)),
    ("resample_hz", false, Shape::Maybe(&Shape::Number)),
    (
        "detrend",
        false,
        Shape::Maybe(&Shape::Either(
            &[
                Shape::Word(&["mean", "linear"]),
                Shape::Object(&[("linear_every_s", true, Shape::Number)]),
            ],
            "\"mean\", \"linear\" or {\"linear_every_s\": …}",
        )),
    ),
    (
        "mains",
        false,
        Shape::Maybe(&Shape::Object(&[
            ("hz", true, Shape::Number),
            ("harmonics", false, Shape::Whole),
            ("how", false, Shape::Word(&["fit", "notch"])),
            ("window_s", false, Shape::Number),
        ])),
    ),
]);

const ROBUST: Shape = Shape::Object(&[("z", true, Shape::Number)]);

/// The keys are looked at again by serde: one of `z` and `uv`.
const LIMIT: Shape = Shape::Object(&[("z", false, Shape::Number), ("uv", false, Shape::Number)]);

const DROP_WINDOWS: Shape = Shape::Object(&[
    ("amplitude", false, LIMIT),
    ("step", false, LIMIT),
    ("flat", false, LIMIT),
    ("covariance", false, ROBUST),
]);

const RECIPE: Shape = Shape::Object(&[
    ("teasel_recipe", true, Shape::Whole),
    ("recording", false, RECORDING),
    ("channels", false, CHANNELS),
    ("filter", false, FILTER),
    ("drop_windows", false, DROP_WINDOWS),
    (
        "keep",
        false,
        Shape::Either(
            &[Shape::Whole, Shape::Word(&["auto", "best"])],
            "a whole number above 1, \"auto\" or \"best\"",
        ),
    ),
    ("measure", false, Shape::Word(&["typical", "total"])),
    ("contrast", true, CONTRAST),
    ("not_used", false, SPAN_LIST),
    (
        "hold_back",
        false,
        Shape::Maybe(&Shape::Object(&[
            ("last", true, Shape::Number),
            ("open", false, Shape::Flag),
        ])),
    ),
    (
        "shrink",
        false,
        Shape::Either(
            &[Shape::Number, Shape::Word(&["auto", "ledoit-wolf", "oas"])],
            "\"auto\", \"ledoit-wolf\", \"oas\" or a number from 0 up to, but not including, 1",
        ),
    ),
    ("components", false, Shape::Whole),
    (
        "evidence",
        false,
        Shape::Object(&[
            ("folds", false, Shape::Whole),
            ("permutations", false, Shape::Whole),
            ("bootstrap", false, Shape::Whole),
            ("seed", false, Shape::Whole),
        ]),
    ),
]);

/// Writes `recipe.json`, two spaces deep, every default in place, ending in a line feed.
pub fn recipe_json(recipe: &Recipe) -> Result<String> {
    super::to_json(recipe)
}

/// Reads `recipe.json`. Unknown keys, repeated keys, wrong types and values out of range are refused, each with line,
/// column, what was expected and what was found; ranges as in [`recipe_check`].
pub fn recipe_from_json(text: &str) -> Result<Recipe> {
    strict::check(text, &RECIPE, "the recipe", strict::RECIPE_BYTES)?;
    let mut recipe: Recipe = serde_json::from_str(text).map_err(|e| {
        Problem::new(
            Kind::Recipe,
            "the recipe breaks its rules",
            "mend it there, or take it from Teasel again",
        )
        .at(format!("line {}, column {}", e.line(), e.column()))
        .expected_found("a recipe", e)
    })?;
    if !strict::holds(text, "measure") {
        recipe.measure = recipe.contrast.usual_measure();
    }
    recipe_check(&recipe).map_err(|mut problem| {
        problem.place = problem.place.map(|path| strict::place_of(text, &path));
        problem
    })?;
    Ok(recipe)
}
