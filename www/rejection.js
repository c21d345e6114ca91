/** Windows dropped for what is in them: limits, counts, and what that does to the ratio. Off by default, and the page says why. */
import { find, make } from "./kit.js";
import { numberField } from "./fields.js";
import { factor } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {"amplitude" | "step" | "flat" | "covariance"} Criterion */

/** @type {[Criterion, string][]} */
const CRITERIA = [["amplitude", "amplitude, largest channel"], ["step", "largest step between two samples"], ["flat", "amplitude, smallest channel (below)"], ["covariance", "variance of the whole window"]];

/** @param {App} app */
export function mountRejection(app) {
  const fields = CRITERIA.map(([key, label]) => ({ key, label, field: numberField(`${label}: robust standard deviations from the median`, {
    get: () => zOf(key), optional: true, empty: "off", range: () => [1, 1000], step: () => 1,
    set: (value) => app.change((recipe) => {
      const drop = { ...recipe.drop_windows, [key]: value === null ? undefined : { z: value } };
      if (value === null) delete drop[key];
      recipe.drop_windows = drop;
    }),
  }), counted: make("td", { class: "quiet" }) }));
  const effect = make("p", { class: "small", role: "status" });
  const summary = make("summary", {}, "Drop windows for what is in them: off");
  find("#windows .body").append(make("details", { class: "more", id: "drop-windows" }, summary,
    make("p", { class: "quiet small" }, "Off by default: a spatial filter has to see an artefact to learn to cancel it, and windows dropped for being large took the held-out ratio down where this was tried. Limits are robust standard deviations of the logarithm from the median over all windows, both sides together and blind to the labels."),
    make("table", { class: "limits" }, make("tbody", {}, ...fields.map(({ label, field, counted }) => make("tr", {}, make("th", { scope: "row" }, label), make("td", {}, field.field, " z"), counted)))),
    effect));
  follow((state, before) => {
    if (state.recipe === before.recipe && state.sheet === before.sheet) return;
    const card = state.sheet?.rejection;
    const on = CRITERIA.filter(([key]) => state.recipe?.drop_windows?.[key]).length;
    summary.textContent = `Drop windows for what is in them: ${on ? `${on} of 4 criteria` : "off"}`;
    for (const { key, field, counted } of fields) {
      field.show();
      const found = card?.criteria.find(({ name }) => name === key);
      counted.textContent = found ? `${found.beyond[0] + found.beyond[1]} beyond ${short(found.limit)}${found.unit ? ` ${found.unit}` : ""} (median ${short(found.median)}): ${found.beyond[0]} signal, ${found.beyond[1]} reference` : "";
    }
    effect.textContent = card ? told(card) : "";
  });
}

/** @param {Criterion} key */
function zOf(key) {
  const limit = now().recipe?.drop_windows?.[key];
  return limit && "z" in limit ? limit.z : null;
}

/** @param {number} value */
function short(value) {
  return String(Number(value.toPrecision(3)));
}

/** @param {NonNullable<import("./types").Sheet["rejection"]>} card */
function told({ windows: [all, kept], effect }) {
  const counts = `${all - kept} of ${all} windows dropped. `;
  if (!effect) return counts;
  const [typical, total] = [effect.typical, effect.total];
  return `${counts}Fitted ratio of the leading component with every window, then without them: ${factor(typical[0])}, ${factor(typical[1])} in a typical trial; ${factor(total[0])}, ${factor(total[1])} over all power. Only a held-out ratio says which is better.`;
}
