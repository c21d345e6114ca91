/** Compression: how many dimensions to keep, on a dial under the plot's own axis. */
import { find, make } from "./kit.js";
import { figureSlot } from "./figure.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").PlotBox} PlotBox */

const THUMB = 24;
/** @type {Record<string, string>} */
const GUIDES = { share_95: "95 % of variance", one_standard_error: "one standard error", held_out_peak: "held-out peak" };

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
  body.append(eigenvalues.root, guides);

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
  });
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
    ...Object.entries(GUIDES).filter(([name]) => compression.guides[name] !== undefined && Number(compression.guides[name]) > 1)
      .map(([name, words]) => button(`${compression.guides[name]} · ${words}`, Number(compression.guides[name]))),
    button("best · chosen anew in every fold and permutation", "best"),
  ];
  const focused = document.activeElement?.getAttribute("data-guide");
  place.replaceChildren(make("span", { class: "quiet" }, "Set to"), ...buttons, make("span", { class: "quiet small" }, "C = 1 is not on offer: one direction, chosen by size alone."));
  if (focused) /** @type {HTMLElement | null} */ (place.querySelector(`[data-guide="${focused}"]`))?.focus();
}
