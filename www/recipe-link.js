/** The recipe in the address and in the tab's memory, so that it outlives a reload. */
import { afterRest } from "./kit.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").Bridge} Bridge */
/** @typedef {import("./types").Recipe} Recipe */

const KEY = "teasel-recipe";
/** A link's recipe, and the name that whoever made it gave it. */
const LINK = /^#recipe=([^&]+)(?:&name=([^&]*))?$/;
/** Longer names are cut. */
const NAME_LETTERS = 60;
let name = nameIn(location.hash);

/** @param {string} hash */
function nameIn(hash) {
  try {
    return decodeURIComponent(LINK.exec(hash)?.[2] ?? "").slice(0, NAME_LETTERS);
  } catch {
    return "";
  }
}

/** The name of these choices, for their link. */
export const linkName = () => name;

/** @param {string} text */
export function nameLink(text) {
  name = text.trim().slice(0, NAME_LETTERS);
}

/** What stands after the address in a link to a recipe. @param {Bridge} bridge @param {Recipe} recipe @param {boolean} withNames */
export function linkTo(bridge, recipe, withNames) {
  return `#recipe=${bridge.linkEncode(recipe, withNames)}${name ? `&name=${encodeURIComponent(name)}` : ""}`;
}

/**
 * The recipe that the page was opened with: from the link, or, where the link is this tab's own, from the tab's memory, which knows the names too.
 * @param {Bridge} bridge
 * @returns {{ recipe: Recipe, link: string | null } | null} `link` is the text of a link that may have left names to the recording
 */
export function recipeAtStart(bridge) {
  const text = LINK.exec(location.hash)?.[1];
  if (!text) return null;
  const kept = remembered(bridge);
  if (kept && (bridge.linkEncode(kept, false) === text || bridge.linkEncode(kept, true) === text)) return { recipe: kept, link: null };
  return { recipe: bridge.linkDecode(text).recipe, link: text };
}

/** @param {Bridge} bridge @returns {Recipe | null} */
function remembered(bridge) {
  try {
    const text = sessionStorage.getItem(KEY);
    return text ? bridge.parseRecipe(text) : null;
  } catch {
    return null;
  }
}

/** Writes settings to the address and the whole recipe to the tab's memory, after the dials have rested. @param {Bridge} bridge */
export function mountRecipeLink(bridge) {
  const write = () => {
    const { recipe } = now();
    if (!recipe) return;
    const names = /** @type {HTMLInputElement | null} */ (document.querySelector("#with-names"))?.checked ?? false;
    history.replaceState(null, "", linkTo(bridge, recipe, names));
    try {
      sessionStorage.setItem(KEY, JSON.stringify(recipe));
    } catch {
      // A tab without storage keeps the settings in its address only.
    }
  };
  const later = afterRest(write, 250);
  follow((state, before) => state.recipe !== before.recipe && state.recipe && later());
  document.querySelector("#with-names")?.addEventListener("change", write);
  document.querySelector("#link-name")?.addEventListener("change", write);
}

/** Leaves no recipe behind in the address. */
export function clearLink() {
  name = "";
  history.replaceState(null, "", location.pathname + location.search);
  try {
    sessionStorage.removeItem(KEY);
  } catch {
    // Nothing was kept.
  }
}
