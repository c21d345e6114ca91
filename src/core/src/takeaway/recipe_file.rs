//! `recipe.json`: written with every default in place, read strictly.
use super::strict::{self, Shape};
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Recipe, recipe_check};

const EVENT_WINDOW: Shape = Shape::Object(&[
    ("event", true, Shape::Text),
    ("from_s", true, Shape::Number),
    ("to_s", true, Shape::Number),
]);

pub(super) const CHANNELS: Shape = Shape::Object(&[
    ("leave_out", false, Shape::List(&Shape::Text)),
    ("interpolate", false, Shape::List(&Shape::Text)),
    (
        "reference",
        false,
        Shape::Either(
            &[
                Shape::Word(&["as recorded", "average"]),
                Shape::List(&Shape::Text),
            ],
            "\"as recorded\", \"average\" or a list of channel names",
        ),
    ),
]);

pub(super) const FILTER: Shape = Shape::Object(&[
    ("high_pass_hz", false, Shape::Maybe(&Shape::Number)),
    ("low_pass_hz", false, Shape::Maybe(&Shape::Number)),
    ("notch_hz", false, Shape::List(&Shape::Number)),
    ("resample_hz", false, Shape::Maybe(&Shape::Number)),
]);

const RECIPE: Shape = Shape::Object(&[
    ("teasel_recipe", true, Shape::Whole),
    ("channels", false, CHANNELS),
    ("filter", false, FILTER),
    (
        "keep",
        false,
        Shape::Either(
            &[Shape::Whole, Shape::Word(&["auto", "best"])],
            "a whole number above 1, \"auto\" or \"best\"",
        ),
    ),
    ("measure", false, Shape::Word(&["typical", "total"])),
    (
        "contrast",
        true,
        Shape::Kinds(
            &[(
                "windows",
                &[
                    ("signal", true, EVENT_WINDOW),
                    ("reference", true, EVENT_WINDOW),
                ],
            )],
            &["spans", "band", "repeatable", "slow"],
        ),
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
    ("spectrum", false, Shape::Word(&["welch", "multitaper"])),
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
    let recipe: Recipe = serde_json::from_str(text).map_err(|e| {
        Problem::new(
            Kind::Recipe,
            "the recipe breaks its rules",
            "mend it there, or take it from Teasel again",
        )
        .at(format!("line {}, column {}", e.line(), e.column()))
        .expected_found("a recipe", e)
    })?;
    recipe_check(&recipe).map_err(|mut problem| {
        problem.place = problem.place.map(|path| strict::place_of(text, &path));
        problem
    })?;
    Ok(recipe)
}
