/** Undo and redo of choices and marks: every recipe that was in force, with the marks that waited beside it. */
import { find, make } from "./kit.js";
import { followMarks, putDrafts, waitingMarks } from "./marks.js";
import { speak } from "./readings.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {{ recipe: Recipe, drafts: import("./marks.js").Drafts }} Moment */

/** Changes that follow each other this closely are one: a drag is undone as a whole. */
const ONE_MS = 700;
const MOST = 200;

/** @type {Moment[]} */
let past = [];
/** @type {Moment[]} */
let future = [];
/** @type {Moment | null} */
let present = null;
let changedAt = -Infinity;
let changedWhat = "";
/** Set while a moment is being put back. */
let restoring = false;

/** @param {App} app */
export function mountHistory(app) {
  const button = (/** @type {string} */ word, /** @type {() => void} */ act) =>
    make("button", { type: "button", class: "button slim bare", hidden: true, click: act }, word, make("span", { class: "aside" }));
  const [undo, redo] = [button("Undo", () => step(app, -1)), button("Redo", () => step(app, 1))];
  find(".tools").prepend(make("span", { class: "steps-back", role: "group", "aria-label": "Steps back and forth" }, undo, redo));
  const show = () => {
    const [back, forth] = [past.at(-1), future.at(-1)];
    undo.hidden = redo.hidden = !back && !forth;
    undo.disabled = !back;
    redo.disabled = !forth;
    find(".aside", undo).textContent = back && present ? `: ${changed(back, present)}` : "";
    find(".aside", redo).textContent = forth && present ? `: ${changed(present, forth)}` : "";
  };
  follow((state, before) => {
    if (state.summary !== before.summary) {
      [past, future, present] = [[], [], null];
      show();
    }
    if (state.recipe !== before.recipe || state.phase !== before.phase) note(show);
  });
  followMarks(() => note(show));
  addEventListener("keydown", (event) => {
    if (!(event.ctrlKey || event.metaKey) || event.altKey || typing(event.target)) return;
    const key = event.key.toLowerCase();
    const way = key === "z" ? (event.shiftKey ? 1 : -1) : key === "y" && event.ctrlKey ? 1 : 0;
    if (!way) return;
    event.preventDefault();
    step(app, way);
  });
}

/** A text field undoes its own typing. @param {EventTarget | null} target */
function typing(target) {
  return target instanceof HTMLInputElement && !["radio", "checkbox", "range", "file"].includes(target.type);
}

/** @param {() => void} show */
function note(show) {
  const { recipe, phase } = now();
  if (!recipe || phase === "reading") return;
  const moment = { recipe, drafts: waitingMarks() };
  // What is proposed before the first computation is where history begins.
  if (!present || restoring) {
    present = moment;
    return show();
  }
  const what = changed(present, moment);
  if (!what) return;
  const at = performance.now();
  if (at - changedAt > ONE_MS || what !== changedWhat) past = [...past, present].slice(-MOST);
  [changedAt, changedWhat, present, future] = [at, what, moment, []];
  show();
}

/** @param {App} app @param {number} way */
function step(app, way) {
  const [from, to] = way < 0 ? [past, future] : [future, past];
  const moment = from.pop();
  if (!moment || !present) return;
  to.push(present);
  const what = changed(present, moment);
  restoring = true;
  const { recipe, drafts } = structuredClone(moment);
  if (JSON.stringify(recipe) !== JSON.stringify(now().recipe))
    app.change((all) => {
      for (const key of Object.keys(all)) delete (/** @type {any} */ (all)[key]);
      Object.assign(all, recipe);
    });
  putDrafts(drafts);
  restoring = false;
  changedAt = -Infinity;
  // The last word on what can be undone now.
  putDrafts(waitingMarks());
  speak(`${way < 0 ? "Undone" : "Done again"}: ${what}.`);
}

/** @type {Record<string, string>} */
const WORDS = { channels: "channels", filter: "filters", keep: "C", measure: "measure", contrast: "windows", shrink: "shrinkage", components: "number of components", evidence: "evidence", not_used: "spans not used", drop_windows: "windows dropped", recording: "recording" };

/** What differs between two moments, in words; empty where nothing does. @param {Moment} a @param {Moment} b */
function changed(a, b) {
  const [old, next] = /** @type {[any, any]} */ ([a.recipe, b.recipe]);
  const keys = [...new Set([...Object.keys(old), ...Object.keys(next)])].filter((key) => JSON.stringify(old[key]) !== JSON.stringify(next[key]));
  const words = keys.map((key) => WORDS[key] ?? key);
  if (JSON.stringify(a.drafts) !== JSON.stringify(b.drafts)) words.push("marks");
  return words.join(" and ");
}
