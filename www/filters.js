/** The filters drawn, and what is seldom needed: trend, and mains by fitted sinusoids. */
import { make } from "./kit.js";
import { numberField, select } from "./fields.js";
import { figureSlot } from "./figure.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */

/** @param {App} app */
export function moreFilters(app) {
  const mains = () => now().recipe?.filter.mains ?? null;
  const trend = select("what is taken off each stretch first", (value) => app.change(({ filter }) => {
    if (value === "nothing") delete filter.detrend;
    else filter.detrend = value === "pieces" ? { linear_every_s: 20 } : value === "mean" ? "mean" : "linear";
  }));
  const how = select("how mains is removed", (value) => app.change(({ filter }) => {
    if (value === "no") delete filter.mains;
    else filter.mains = { hz: mains()?.hz ?? likely(), harmonics: mains()?.harmonics ?? 3, how: value === "fit" ? "fit" : "notch", window_s: mains()?.window_s ?? 4 };
  }));
  const edit = (/** @type {"hz" | "harmonics" | "window_s"} */ key, /** @type {string} */ label, /** @type {[number, number]} */ range) =>
    numberField(label, { get: () => mains()?.[key], range: () => range, step: () => 1, refuses: (value) => (key === "harmonics" && !Number.isInteger(value) ? "must be a whole number" : ""), set: (value) => app.change(({ filter }) => void (filter.mains && value !== null && (filter.mains[key] = value))) });
  const [hz, harmonics, window] = [edit("hz", "mains frequency in hertz", [1, 1000]), edit("harmonics", "multiples of the mains frequency", [1, 20]), edit("window_s", "length of the fitted windows in seconds", [0.5, 60])];
  const only = make("span", { class: "together" }, "at ", hz.field, " Hz and up to multiple ", harmonics.field);
  const fitted = make("span", { class: "together" }, "in windows of ", window.field, " s");
  const figure = figureSlot(app, "filters", { section: "channels", title: "What the filters let pass", hint: "−6 dB at the rings", label: "Gain of all filters in a row against frequency" });
  const none = make("p", { class: "quiet small" }, "No filter is set.");
  const warned = make("p", { class: "small" });
  const root = make("details", { class: "more", id: "more-filters" }, make("summary", {}, "Filters drawn, trend, mains by fit"),
    make("div", { class: "choice" }, make("span", { class: "together" }, "Take off first ", trend.root), make("span", { class: "together" }, "remove mains ", how.root), only, fitted),
    make("p", { class: "quiet small" }, "A fit subtracts sinusoids and leaves the rest of the spectrum as it is; it follows mains that changes over several windows. A notch takes everything 1 Hz to either side."),
    none, figure.root, warned);
  follow((state, before) => {
    if (state.recipe === before.recipe && state.sheet === before.sheet) return;
    const filter = state.recipe?.filter;
    const pieces = typeof filter?.detrend === "object" && filter.detrend ? filter.detrend.linear_every_s : null;
    trend.show([{ value: "nothing", label: "nothing" }, { value: "mean", label: "the mean" }, { value: "linear", label: "a straight line" }, { value: "pieces", label: `a line every ${pieces ?? 20} s` }], pieces ? "pieces" : typeof filter?.detrend === "string" ? filter.detrend : "nothing");
    how.show([{ value: "no", label: "not here" }, { value: "fit", label: "by fitted sinusoids" }, { value: "notch", label: "by notches" }], filter?.mains?.how ?? "no");
    only.hidden = !filter?.mains;
    fitted.hidden = filter?.mains?.how !== "fit";
    for (const field of [hz, harmonics, window]) field.show();
    none.hidden = Boolean(state.sheet?.preparation?.response) || !state.sheet?.preparation;
    warned.textContent = (state.sheet?.warnings ?? []).filter((one) => /filter/i.test(one) && /window/i.test(one)).join(" ");
  });
  return root;
}

/** The mains frequency that stands out most in this recording, or 50 Hz. */
function likely() {
  const cards = (now().sheet ?? now().summary)?.channels ?? [];
  const sixty = cards.filter(({ mains_hz }) => mains_hz === 60).length;
  return sixty * 2 > cards.length ? 60 : 50;
}
