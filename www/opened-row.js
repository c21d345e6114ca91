/** The whole of one component: map, spectrum, filter, single trials, course and average. */
import { make } from "./kit.js";
import { figureSlot } from "./figure.js";
import { factor } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */

/** @type {{ row: HTMLTableRowElement, slots: ReturnType<typeof figureSlot>[], told: HTMLElement, id: string } | null} */
let shown = null;

/** @type {[string, string, string][]} */
const PARTS = [
  ["map", "Pattern", ""],
  ["spectrum", "Spectrum", "bands: 95 % interval"],
  ["filter", "Filter", "largest weights"],
  ["course", "Power around the event", "band: 95 % interval over trials"],
  ["average", "Average around the event", "the component itself, not its power"],
  ["trials", "Trials", "against each one’s reference, in order of time"],
];

export const openedRow = {
  /** @param {App} app @param {string} id @param {number} columns */
  open(app, id, columns) {
    const told = make("p", { class: "told" });
    const slots = PARTS.map(([kind, title, hint]) =>
      figureSlot(app, `${id}-${kind}`, { section: "components", title, hint, label: `${title} of ${id.replace("-", " component ")}` }));
    const [map, spectrum, filter, course, average, trials] = slots.map(({ root }) => root);
    const left = make("div", { class: "one-side" }, map, filter);
    const right = make("div", { class: "one-side" }, spectrum, course, average, trials);
    const row = make("tr", { class: "whole" }, make("td", { colspan: columns }, make("div", { class: "opened-one" }, told, left, right)));
    shown = { row, slots, told, id };
    tell();
    return row;
  },
  close() {
    shown?.slots.forEach((slot) => slot.drop());
    shown?.row.remove();
    shown = null;
  },
};

follow((state, before) => {
  if (state.sheet !== before.sheet) tell();
});

/** What the sheet's numbers say about this component. */
function tell() {
  const { sheet } = now();
  if (!shown || !sheet) return;
  const [end, number] = shown.id.split("-");
  const component = sheet[end === "weaker" ? "weaker" : "stronger"][Number(number) - 1];
  if (!component) return;
  const { typical, total, peak_hz, largest_at, stability, places_changed } = component;
  const strong = (/** @type {string} */ text) => make("b", {}, text);
  const held = typical.held_out === null ? [] : [", held-out ", strong(factor(typical.held_out)), " in a typical trial and ", factor(total.held_out), " over all power"];
  shown.told.replaceChildren(
    end === "weaker" ? "Weaker in signal" : "Stronger in signal", ": fitted ", factor(typical.fitted), ...held, ". Its pattern is largest at ", strong(largest_at),
    ...(peak_hz === null ? [] : [", its spectra differ most at ", strong(`${Number(peak_hz.toPrecision(3))} Hz`)]),
    ...(stability === null ? [] : [`; across folds the pattern keeps its shape with a cosine of ${stability.toFixed(2)}`]),
    ...(places_changed ? [`, and it changed places in ${places_changed} of ${sheet.recipe.evidence.folds} folds`] : []), ".",
  );
}
