/** Honest counting: how often the result was looked at under other choices, and the share of the recording kept for the end. */
import { make } from "./kit.js";
import { count, factor } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */

/** Questions whose results were seen in this sitting, each as the choices that a result depends on. @type {Set<string>} */
const seen = new Set();

/** @param {Recipe} recipe */
function question({ contrast, keep, measure, shrink, filter, channels, not_used }) {
  return JSON.stringify([contrast, keep, measure, shrink, filter, channels, not_used ?? []]);
}

/** @param {App} app */
export function looksAndLock(app) {
  const looks = make("p", { class: "quiet small", id: "looks" });
  const said = make("p", { class: "small", id: "locked-result", role: "status" });
  const lock = make("button", { type: "button", class: "button slim", id: "lock", click: () => app.change((recipe) => void (recipe.hold_back = { last: 0.25, open: false })) }, "Lock away the last quarter");
  const release = make("button", { type: "button", class: "button slim bare", id: "release", click: () => app.change((recipe) => void delete recipe.hold_back) }, "Use it after all");
  const open = make("button", { type: "button", class: "button slim", id: "open-locked", click: () => app.change((recipe) => recipe.hold_back && void (recipe.hold_back.open = true)) }, "Open it, once");
  const root = make("div", { class: "looks" }, looks, make("div", { class: "choice" }, lock, open, release), said);
  follow((state, before) => {
    if (state.summary !== before.summary) seen.clear();
    if (state.finished && state.finished !== before.finished) seen.add(question(state.finished));
    if (state.finished !== before.finished || state.recipe !== before.recipe || state.sheet !== before.sheet) show();
  });

  function show() {
    const { recipe, sheet } = now();
    const held = recipe?.hold_back;
    lock.hidden = Boolean(held);
    open.hidden = release.hidden = !held || held.open;
    looks.textContent = seen.size > 1
      ? `${count(seen.size)} versions of the question were looked at. Windows, bands or dimensions chosen because of their result make p and held-out ratios flatter than they are; a share locked away beforehand tells how much.`
      : "A share of the recording can be locked away now and opened once, when all choices are made.";
    said.textContent = result(held, sheet);
    said.hidden = !said.textContent;
  }
  return root;
}

/** @param {Recipe["hold_back"]} held @param {import("./types").Sheet | null} sheet */
function result(held, sheet) {
  if (!held) return "";
  const share = `The last ${Math.round(100 * held.last)} % of the recording`;
  if (!held.open) return `${share} is locked away: no filter, ratio or p has seen it.`;
  const found = sheet?.held_back;
  if (!found) return `${share} is being opened.`;
  if (!found.signal) return `${share} holds too few windows to say anything.`;
  const told = (/** @type {{ typical: number | null, total: number }} */ r) => (r.typical === null ? `${factor(r.total)} over all power` : `${factor(r.typical)} in a typical trial and ${factor(r.total)} over all power`);
  const parts = [found.stronger[0] && `component 1 reaches ${told(found.stronger[0])}`, found.weaker[0] && `weaker component 1 ${told(found.weaker[0])}`].filter(Boolean);
  return `${share}, opened: on its ${count(found.signal)} signal and ${count(found.reference)} reference windows ${parts.join("; ")}. What is changed from here on is chosen with it in view.`;
}
