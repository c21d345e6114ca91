//! Recipes as text, and inside an address; names in their order.
use crate::convert::{Outcome, from_js, thrown, to_js};
use serde::Serialize;
use teasel_core::recipe::Recipe;
use teasel_core::takeaway::{link_decode, link_encode, recipe_from_json, recipe_json};
use wasm_bindgen::JsValue;
use wasm_bindgen::prelude::wasm_bindgen;

/// Reads recipe.json.
#[wasm_bindgen(js_name = parseRecipe)]
pub fn parse_recipe(text: &str) -> Outcome<JsValue> {
    to_js(&recipe_from_json(text).map_err(thrown)?)
}

/// Writes recipe.json.
#[wasm_bindgen(js_name = recipeText)]
pub fn recipe_text(recipe: JsValue) -> Outcome<String> {
    recipe_json(&from_js::<Recipe>(recipe)?).map_err(thrown)
}

/// Places of the names in the order in which files of one recording are joined.
#[wasm_bindgen(js_name = naturalOrder)]
#[must_use]
pub fn natural_order(names: Vec<String>) -> Vec<u32> {
    let mut places: Vec<u32> = (0..).take(names.len()).collect();
    places.sort_by(|a, b| {
        teasel_core::recording::natural_order(&names[*a as usize], &names[*b as usize])
    });
    places
}

/// What stands after `#recipe=`.
#[wasm_bindgen(js_name = linkEncode)]
pub fn encode(recipe: JsValue, with_names: bool) -> Outcome<String> {
    Ok(link_encode(&from_js::<Recipe>(recipe)?, with_names))
}

/// A link's recipe; `events` is null where it is whole, or the ranks (1 is the most frequent) of the events that are to be filled in from the
/// recording by [`complete`]; `without` says what else the link left out.
#[wasm_bindgen(js_name = linkDecode)]
pub fn decode(text: &str) -> Outcome<JsValue> {
    #[derive(Serialize)]
    struct Link {
        recipe: Recipe,
        events: Option<[usize; 2]>,
        without: Vec<String>,
    }
    let link = link_decode(text).map_err(thrown)?;
    to_js(&Link {
        recipe: link.recipe,
        events: link.events,
        without: link.without,
    })
}

/// A link's recipe with the events of a recording (label → count), and what was filled in, each a sentence.
#[wasm_bindgen(js_name = linkComplete)]
pub fn complete(text: &str, events: JsValue) -> Outcome<JsValue> {
    #[derive(Serialize)]
    struct Completed {
        recipe: Recipe,
        notes: Vec<String>,
    }
    let link = link_decode(text).map_err(thrown)?;
    let (recipe, notes) = link.complete(&from_js(events)?).map_err(thrown)?;
    to_js(&Completed { recipe, notes })
}
