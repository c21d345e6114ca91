/** The whole of one component: map, spectrum, filter, single trials, course and average. */
import { placeOf } from "./carriers.js";
import { make } from "./kit.js";
import { picks } from "./fields.js";
import { figureSlot } from "./figure.js";
import { factor } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */

/** @type {{ row: HTMLTableRowElement, slots: ReturnType<typeof figureSlot>[], told: HTMLElement, id: string } | null} */
let shown = null;

/** @type {[string, string, string][]} */
const PARTS = [
  ["map", "Pattern", ""],
  ["spectrum", "Spectrum", "dB; bands: 95 % interval"],
  ["filter", "Filter", ""],
  ["course", "Power around the event", ""],
  ["average", "Average around the event", ""],
  ["trials", "Trials", "in order of time"],
  ["trials-by-power", "Trials by power", "least power in the signal window first"],
  ["trials-by-lag", "Trials by the next event", "soonest first; marks: the next event"],
  ["time-frequency", "Power over time and frequency", "dB against the reference windows"],
  ["consistency", "Phase consistency", "1: the same phase in every trial"],
  ["powers", "Power in every window", "dB of the reference’s mean; bars: median and middle half"],
];
/** Seconds of the channels that stand above a component's series. */
const [BEFORE_S, SHOWN_S] = [1, 4];

export const openedRow = {
  /** @param {App} app @param {string} id @param {number} columns */
  open(app, id, columns) {
    const told = make("p", { class: "told" });
    const slots = PARTS.map(([kind, title, hint]) =>
      figureSlot(app, `${id}-${kind}`, { section: "components", title, hint, label: `${title} of ${id.replace("-", " component ")}` }));
    const onset = Math.max(0, (now().sheet?.windows?.trials.find(({ dropped }) => !dropped)?.onset_s ?? BEFORE_S) - BEFORE_S);
    slots.push(figureSlot(app, `${id}-excerpt`, { section: "components", title: "In the channels", hint: "the five where its pattern is largest, and below them the component itself", label: `Channels with the series of ${id.replace("-", " component ")} beneath`, load: () => app.bridge.excerpt(id.replace("-", " "), onset, SHOWN_S) }));
    const [map, spectrum, filter, course, average, trials, byPower, byLag, picture, consistency, powers, excerpt] = slots.map(({ root }) => root);
    const by = picks("Spectrum by", "spectrum", (value) => app.change((recipe) => void (recipe.spectrum = value === "multitaper" ? "multitaper" : "welch")));
    by.show([{ value: "welch", label: "Welch" }, { value: "multitaper", label: "multitaper" }], now().recipe?.spectrum ?? "welch");
    spectrum?.append(make("div", { class: "choice spectrum-by" }, "Spectrum by ", by.root));
    const last = make("div", { class: "halves" }, average, trials, byPower, byLag, picture, consistency, powers, excerpt);
    const row = make("tr", { class: "whole" }, make("td", { colspan: columns }, make("div", { class: "opened-one" }, told, map, spectrum, filter, course, last)));
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
    end === "weaker" ? "Weaker in signal" : "Stronger in signal", ": fitted ", factor(typical.fitted), ...held, ". Its pattern is largest at ", strong(placeOf(largest_at, now().summary)),
    ...(peak_hz === null ? [] : [", its spectra differ most at ", strong(`${Number(peak_hz.toPrecision(3))} Hz`)]),
    ...(stability === null ? [] : [`; across folds the pattern keeps its shape with a cosine of ${stability.toFixed(2)}`]),
    ...(places_changed ? [`, and it changed places in ${places_changed} of ${sheet.recipe.evidence.folds} folds`] : []), ".",
  );
}
