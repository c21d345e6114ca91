/** Compression: how many dimensions to keep, on a dial under the plot's own axis. */
import { find, make } from "./kit.js";
import { figureSlot } from "./figure.js";
import { count } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").PlotBox} PlotBox */

const THUMB = 24;
/** @type {Record<string, string>} */
const GUIDES = {
  share_95: "95 % of variance", parallel_analysis: "parallel analysis", noise_edge: "noise edge", hard_threshold: "hard threshold",
  one_standard_error: "one standard error", held_out_peak: "held-out peak",
};

/** @param {App} app */
export function mountCompression(app) {
  const body = find("#compression .body");
  const keep = make("input", { type: "range", id: "keep", min: 2, max: 2, step: 1, "aria-label": "Dimensions to keep" });
  const dial = make("div", { class: "dial" }, keep);
  const guides = make("div", { class: "choice guides" });
  const eigenvalues = figureSlot(app, "eigenvalues", { section: "compression", title: "How many dimensions to keep", hint: "", label: "Variance of each dimension, in dB below the largest", adjust });
  const curve = figureSlot(app, "keep", {
    section: "compression", label: "Fitted and held-out ratio of the leading component against the number of dimensions kept",
    adjust,
    placed: (box) => box && under(keep, box),
  });
  eigenvalues.root.append(curve.root, dial);
  const rules = make("p", { class: "quiet small" });
  const principal = figureSlot(app, "principal", { section: "compression", title: "The largest dimensions, not the most relevant", hint: "", label: "The first dimensions of the compression: pattern and course over the recording" });
  body.append(eigenvalues.root, guides,
    make("details", { class: "more", id: "noise-rules" }, make("summary", {}, "What the rules count"), rules),
    make("details", { class: "more", id: "principal" }, make("summary", {}, "The first dimensions"),
      make("p", { class: "quiet small" }, "What is largest is often a blink, muscle, mains or drift. Use these to see what the compression keeps; what differs between the windows stands under Components."), principal.root));

  keep.addEventListener("input", () => app.change((recipe) => void (recipe.keep = Number(keep.value))));
  follow((state, before) => {
    if (state.recipe === before.recipe && state.sheet === before.sheet) return;
    const compression = state.sheet?.compression;
    dial.hidden = !compression;
    guides.hidden = !compression;
    if (!compression) return;
    keep.max = String(compression.rank);
    keep.value = String(kept());
    keep.setAttribute("aria-valuetext", `keep ${kept()} of ${compression.rank}`);
    showGuides(app, guides);
    rules.textContent = told();
  });
}

/** What the noise rules rest on. */
function told() {
  const found = now().sheet?.dimensions;
  const general = "The share of variance knows nothing of noise. Parallel analysis counts dimensions of the correlation matrix above those of surrogates whose channels are shifted in time against each other, each keeping its own rhythm. Noise edge and hard threshold take the median eigenvalue for noise alike in all channels. All of these are blind to the labels; the two held-out rules are not.";
  if (!found) return general;
  const withheld = found.noise_edge === null ? " There are fewer effective samples than dimensions, so noise edge and hard threshold are withheld." : "";
  return `${general} Here ${count(found.samples)} samples in windows are worth ${count(found.effective_samples)} independent ones (by the channels’ autocorrelation); ${found.surrogates} surrogates of ${count(found.surrogate_samples)} samples.${withheld}`;
}

/** C as chosen, or as it came out where a rule chooses. */
function kept() {
  const { recipe, sheet } = now();
  return typeof recipe?.keep === "number" ? Math.min(recipe.keep, sheet?.compression?.rank ?? recipe.keep) : (sheet?.compression?.kept ?? 2);
}

/**
 * The line at C where the dial is.
 * @param {any} figure the core's figures `Eigenvalues` and `Keep`
 */
function adjust(figure) {
  const share = Array.isArray(figure.variance) ? { share: sum(figure.variance.slice(0, kept())) / sum(figure.variance) } : {};
  return { ...figure, kept: kept(), ...share };
}

/** @param {number[]} list */
function sum(list) {
  return list.reduce((all, one) => all + one, 0);
}

/** Lays the range so that its thumb stands under the plot's line. @param {HTMLInputElement} keep @param {PlotBox} box */
function under(keep, box) {
  const x = (/** @type {number} */ c) => box.left + ((c - box.x0) / (box.x1 - box.x0)) * (box.right - box.left);
  const [low, high] = [x(Number(keep.min)), x(Number(keep.max))];
  keep.style.left = `${low - THUMB / 2}px`;
  keep.style.width = `${Math.max(THUMB, high - low + THUMB)}px`;
}

/** @param {App} app @param {HTMLElement} place */
function showGuides(app, place) {
  const { recipe, sheet } = now();
  const compression = sheet?.compression;
  if (!compression) return;
  const set = (/** @type {import("./types").Recipe["keep"]} */ value) => () => app.change((recipe) => void (recipe.keep = value));
  const button = (/** @type {string} */ label, /** @type {import("./types").Recipe["keep"]} */ value) =>
    make("button", { type: "button", class: "button slim", "aria-pressed": String(recipe?.keep === value), "data-guide": String(value), click: set(value) }, label);
  const most = Math.min(compression.rank, 150);
  const buttons = [
    button(`${most} · all, blind to the labels`, "auto"),
    ...agreeing(compression.guides).map(([keep, words]) => button(`${keep} · ${words.join(", ")}`, keep)),
    button("best · chosen anew in every fold and permutation", "best"),
  ];
  const focused = document.activeElement?.getAttribute("data-guide");
  place.replaceChildren(make("span", { class: "quiet" }, "Set to"), ...buttons, make("span", { class: "quiet small" }, "C = 1 is not on offer: one direction, chosen by size alone."));
  if (focused) /** @type {HTMLElement | null} */ (place.querySelector(`[data-guide="${focused}"]`))?.focus();
}

/** What the rules would keep, those that agree together, smallest first. @param {Record<string, number>} guides @returns {[number, string[]][]} */
function agreeing(guides) {
  /** @type {Map<number, string[]>} */
  const found = new Map();
  for (const [name, words] of Object.entries(GUIDES)) {
    const keep = Number(guides[name] ?? 0);
    if (keep > 1) found.set(keep, [...(found.get(keep) ?? []), words]);
  }
  return [...found].sort((a, b) => a[0] - b[0]);
}
