/** Windows around events, both sides: which event, from when to when, by typing, dragging or arrows. */
import { find, make } from "./kit.js";
import { edgesOver } from "./edges.js";
import { numberField, picks, select } from "./fields.js";
import { figureSlot } from "./figure.js";
import { kindChoice } from "./kinds.js";
import { windowTools } from "./window-tools.js";
import { seconds } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").PlotBox} PlotBox */
/** @typedef {"signal" | "reference"} Side */
/** @typedef {"from_s" | "to_s"} End */

const PICKS = 4;
/** The core asks for three samples: the least whose variance says anything. */
const LEAST = 3;
/** @type {PlotBox | null} */
let plot = null;
/** Ends of the time axis while an edge is dragged. @type {[number, number] | null} */
let held = null;

/** The contrast of a recipe that is to be changed, where it is made of event windows. @param {import("./types").Recipe} recipe */
function sides({ contrast }) {
  return contrast.kind === "windows" ? contrast : null;
}

/** @param {App} app */
export function mountWindows(app) {
  const body = find("#windows .body");
  const kinds = kindChoice(app);
  const event = picks("Event of the signal windows", "signal-event", (value) => takeEvent(app, value));
  const events = select("event of the signal windows", (value) => takeEvent(app, value));
  const against = select("event of the reference windows", (value) => app.change((recipe) => {
    const both = sides(recipe);
    if (both) both.reference.event = value;
  }));
  /** @type {ReturnType<typeof numberField>[]} */
  const fields = /** @type {[Side, End][]} */ ([["signal", "from_s"], ["signal", "to_s"], ["reference", "from_s"], ["reference", "to_s"]]).map(([side, end]) =>
    numberField(`${side} ${end === "from_s" ? "from" : "to"}, in seconds from the event`, {
      get: () => window(side)?.[end], step: sample, write: seconds,
      refuses: (value) => unordered(side, end, value, partner(side, end)),
      set: (value) => value !== null && fix(app, side, end, value, partner(side, end)),
    }));
  /** What is typed into the field of a window's other end, in force or not. @param {Side} side @param {End} end @returns {number} */
  const partner = (side, end) => {
    const other = fields[(side === "signal" ? 0 : 2) + (end === "from_s" ? 1 : 0)];
    return other?.pending() ?? window(side)?.[end === "from_s" ? "to_s" : "from_s"] ?? 0;
  };
  // An end that was mended lets the other in, if that was refused only because of it.
  fields.forEach(({ field, pending }, i) => field.addEventListener("change", () => {
    const other = fields[i ^ 1];
    if (pending() === null && other && other.pending() !== null) other.commit();
  }));
  const why = make("p", { class: "quiet small why" });
  const tools = windowTools(app, "signal");
  const own = make("div", { class: "kind" },
    make("div", { class: "choice" }, event.root, events.root,
      make("span", { class: "together" }, make("span", { class: "of-signal" }, "signal"), fields[0]?.field, " to ", fields[1]?.field, " s"),
      make("span", { class: "together" }, make("span", { class: "of-reference" }, "reference"), fields[2]?.field, " to ", fields[3]?.field, " s")),
    make("div", { class: "choice" }, make("span", { class: "together" }, "reference windows around ", against.root)),
    tools.root);
  body.append(kinds.root, why, own, kinds.fields);
  const figure = figureSlot(app, "windows", {
    section: "windows", title: "Average time course", hint: "drag an edge, or move it with the arrow keys", label: "Power of the leading component around the event, with the two windows",
    wanted: () => aroundEvents(),
    bare: (course) => !course.t_s.length,
    adjust,
    placed: (box) => ((plot = box), edges.over(box)),
  });
  const edges = edgesOver(figure.place, /** @type {[Side, End][]} */ ([["reference", "from_s"], ["reference", "to_s"], ["signal", "from_s"], ["signal", "to_s"]]).map(([side, end]) => ({
    kind: side,
    label: `${side} ${end === "from_s" ? "from" : "to"}`,
    value: () => window(side)?.[end] ?? 0,
    limits: () => limits(side, end),
    step: sample,
    text: (value) => `${seconds(value)} seconds from ${window(side)?.event ?? "the event"}`,
    set: (value) => move(app, side, end, value),
    held: (yes) => {
      held = yes && plot ? [plot.x0, plot.x1] : null;
      if (!yes) figure.draw();
    },
  })));
  body.append(figure.root);
  figure.root.classList.add("around-events");
  follow((state, before) => {
    if (state.recipe === before.recipe && state.summary === before.summary && state.sheet === before.sheet) return;
    why.textContent = state.why;
    why.hidden = !state.why;
    own.hidden = !aroundEvents();
    figure.root.hidden = own.hidden;
    kinds.show();
    tools.show();
    showEvents(event, events, against);
    for (const field of fields) field.show();
    edges.lay();
  });
}

/**
 * The edges as they are chosen, on a time axis that holds still while one of them is dragged.
 * @param {any} course the core's figure `Course`
 */
function adjust(course) {
  const [signal, reference] = [window("signal"), window("reference")];
  if (!signal || !reference || course.events?.[0] !== signal.event || course.events?.[1] !== reference.event) return course;
  const edges = { signal: [signal.from_s, signal.to_s], reference: [reference.from_s, reference.to_s] };
  if (!held || !course.t_s.length) return { ...course, ...edges };
  const [low, high] = held;
  /** @type {number[]} */
  const inside = [...course.t_s.keys()].filter((i) => course.t_s[i] > low && course.t_s[i] < high);
  const within = (/** @type {(number | null)[]} */ list) => [null, ...inside.map((/** @type {number} */ i) => list[i]), null];
  return { ...course, ...edges, t_s: [low, ...within(course.t_s).slice(1, -1), high], mean: within(course.mean), low: within(course.low), high: within(course.high) };
}

/** Whether windows around events are compared, or nothing is chosen yet. */
function aroundEvents() {
  return (now().recipe?.contrast.kind ?? "windows") === "windows";
}

/** @param {Side} side */
function window(side) {
  const contrast = now().recipe?.contrast;
  return contrast?.kind === "windows" ? contrast[side] : undefined;
}

/** Seconds a sample after the preparation. */
function sample() {
  return 1 / (now().sheet?.preparation?.rate_hz ?? now().summary?.recording.rate_hz ?? 1);
}

/** What the plot shows, less what keeps the two edges of a window apart. @param {Side} side @param {End} end @returns {[number, number]} */
function limits(side, end) {
  const least = LEAST * sample();
  const [low, high] = plot ? [plot.x0, plot.x1] : [-1, 1];
  const [grid, value] = [(/** @type {number} */ t) => onGrid(t), window(side)?.[end] ?? 0];
  const range = /** @type {[number, number]} */ (end === "from_s" ? [grid(low), grid(high - least)] : [grid(low + least), grid(high)]);
  return [Math.min(range[0], value), Math.max(range[1], value)];
}

/** @param {number} t */
function onGrid(t) {
  return Number((Math.round(t / sample()) * sample()).toFixed(6));
}

/** An edge that is dragged, or moved by the arrow keys, pushes the other along when they meet. @param {App} app @param {Side} side @param {End} end @param {number} to */
function move(app, side, end, to) {
  const value = onGrid(to);
  if (value === window(side)?.[end]) return;
  app.change((recipe) => {
    const own = sides(recipe)?.[side];
    if (!own) return;
    const least = LEAST * sample();
    own[end] = value;
    if (end === "from_s") own.to_s = Math.max(own.to_s, onGrid(value + least));
    else own.from_s = Math.min(own.from_s, onGrid(value - least));
  });
}

/** Why an end that was typed cannot be: a window that is typed is never pushed along. @param {Side} side @param {End} end @param {number} to @param {number} other */
function unordered(side, end, to, other) {
  const [from, until] = (end === "from_s" ? [to, other] : [other, to]).map(onGrid);
  if (Number(from) >= Number(until)) return "must end after it begins";
  return Number(until) - Number(from) < (LEAST - 0.5) * sample() ? `must last ${seconds(LEAST * sample())} s or longer` : "";
}

/** An end as it was typed, with the other end as it stands in its field. @param {App} app @param {Side} side @param {End} end @param {number} to @param {number} other */
function fix(app, side, end, to, other) {
  const next = end === "from_s" ? { from_s: onGrid(to), to_s: onGrid(other) } : { from_s: onGrid(other), to_s: onGrid(to) };
  app.change((recipe) => void Object.assign(sides(recipe)?.[side] ?? {}, next));
}

/** The reference stays with the event that the signal had, unless both had the same. @param {App} app @param {string} event */
function takeEvent(app, event) {
  app.change((recipe) => {
    const both = sides(recipe);
    if (!both) return;
    if (both.reference.event === both.signal.event) both.reference.event = event;
    both.signal.event = event;
  });
}

/** @param {ReturnType<typeof picks>} few @param {ReturnType<typeof select>} many @param {ReturnType<typeof select>} against */
function showEvents(few, many, against) {
  const events = Object.entries(now().summary?.recording.events ?? {}).sort((a, b) => b[1] - a[1]);
  const current = window("signal")?.event;
  const crowded = events.length > PICKS || events.some(([name]) => name.length > 18);
  few.root.hidden = crowded;
  many.root.hidden = !crowded;
  if (crowded) many.show(events.map(([name, n]) => ({ value: name, label: `${name} (${n})` })), current);
  else few.show(events.map(([name, n]) => ({ value: name, label: name, many: String(n) })), current);
  against.show(events.map(([name]) => ({ value: name, label: name === current ? `the same ${name}` : name })), window("reference")?.event);
}
