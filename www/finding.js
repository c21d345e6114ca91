/** So far: the finding in one sentence, with the two leading maps. */
import { find, make } from "./kit.js";
import { figureSlot } from "./figure.js";
import { KIND_WORDS } from "./kinds.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */

/** @param {App} app */
export function mountFinding(app) {
  const ends = /** @type {const} */ (["stronger", "weaker"]).map((end) => {
    const slot = figureSlot(app, `${end}-1-map-small`, { section: "so-far", label: `Pattern of the leading ${end} component`, width: 92, height: 92 });
    const words = make("figcaption");
    slot.root.append(words);
    return { end, slot, words };
  });
  find(".leading").append(...ends.map(({ slot }) => slot.root));
  follow((state, before) => {
    if (state.sheet === before.sheet && state.stale === before.stale && state.summary === before.summary) return;
    const { sheet } = state;
    find("#so-far").hidden = !sheet;
    for (const { end, words } of ends) {
      const leading = sheet?.[end][0];
      // Rounded as the readings round: 11.25 to 11.2.
      const name = end === "stronger" ? make("span", { class: "of-signal" }, "component 1") : make("span", { class: "of-reference" }, "weaker 1");
      words.replaceChildren(name, make("br"), leading?.peak_hz ? `${Number((leading.peak_hz - 1e-9).toFixed(1))} Hz` : "");
    }
    sayStale();
  });
}

/** Grey numbers are of an earlier choice; says which. */
function sayStale() {
  const { stale, sheet, recipe } = now();
  const place = find("#so-far .of");
  document.documentElement.toggleAttribute("data-stale", stale);
  place.hidden = !stale;
  if (stale && sheet && recipe) place.textContent = `Grey numbers are still of ${differences(sheet.recipe, recipe).join(", ") || "the choices before"}.`;
}

/** The older choices, as far as they differ. @param {Recipe} before @param {Recipe} after */
export function differences(before, after) {
  const said = [];
  const other = (/** @type {unknown} */ a, /** @type {unknown} */ b) => JSON.stringify(a) !== JSON.stringify(b);
  if (other(before.keep, after.keep)) said.push(typeof before.keep === "number" ? `keep ${before.keep}` : `the rule “${before.keep}” for C`);
  if (before.contrast.kind !== after.contrast.kind) said.push(`the comparison of ${KIND_WORDS[before.contrast.kind]}`);
  else if (before.contrast.kind !== "windows" && other(before.contrast, after.contrast)) said.push(`the ${KIND_WORDS[before.contrast.kind]} before`);
  if (before.contrast.kind === "windows" && after.contrast.kind === "windows") for (const side of /** @type {const} */ (["signal", "reference"])) {
    const window = before.contrast[side];
    if (other(window, after.contrast[side])) said.push(`${side} ${window.from_s.toFixed(2)} to ${window.to_s.toFixed(2)} s around ${window.event}`.replace(/-/g, "−"));
  }
  if (before.measure !== after.measure) said.push(before.measure === "total" ? "total power" : "the typical trial");
  if (other(before.filter, after.filter)) said.push("the filters before");
  if (other(before.channels, after.channels)) said.push("the channels before");
  if (other(before.evidence, after.evidence) || other(before.shrink, after.shrink)) said.push("the evidence settings before");
  return said;
}
