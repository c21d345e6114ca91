/** Marks as a table with places to fill in, the two edges of the chosen mark over the traces, and what can be asked about them. */
import { make } from "./kit.js";
import { keyed } from "./edges.js";
import { numberField, select } from "./fields.js";
import { addMark, askAboutMarks, backToEvents, canGoBack, choose, chosenMark, followMarks, marksNow, moveMark, removeMark, turnMark, waitingMarks } from "./marks.js";
import { seconds } from "./numbers.js";
import { follow, now } from "./state.js";
import { KIND_WORDS, LEFT, RIGHT, TOP, FOOT, timeWords } from "./trace-ground.js";
import { bringIn, followView, span, start, viewNow } from "./trace-view.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./marks.js").Mark} Mark */
/** @typedef {import("./marks.js").MarkKind} MarkKind */

const KINDS = /** @type {MarkKind[]} */ (["signal", "reference", "not_used"]);
const WORDS = { ...KIND_WORDS, not_used: "not to be used" };

/** One sample of the recording. */
export function sample() {
  return 1 / (now().summary?.recording.rate_hz ?? 1);
}

/** @param {number} t */
export function onSample(t) {
  return Number((Math.round(t / sample()) * sample()).toFixed(6));
}

/** A mark of the middle of what is seen, of a fifth of its length. @param {App} app @param {MarkKind} kind */
export function markMiddle(app, kind) {
  const { from, seconds: long } = viewNow();
  addMark(app, kind, onSample(from + 0.4 * long), onSample(from + 0.6 * long));
}

/** @param {App} app @param {HTMLElement} place the traces */
export function mountMarks(app, place) {
  const edges = /** @type {const} */ (["from", "to"]).map((end) => edge(app, place, end));
  const rows = make("tbody");
  const table = make("table", { class: "marks" }, make("thead", {}, make("tr", {}, ...["Mark", "from, s", "to, s", "length", ""].map((head) => make("th", { scope: "col" }, head)))), rows);
  const add = KINDS.map((kind) => make("button", { type: "button", class: "button slim", "data-mark": kind, click: () => {
    markMiddle(app, kind);
    edges[0]?.focus({ preventScroll: true });
  } }, `Mark ${WORDS[kind]}`));
  const ask = make("button", { type: "button", class: "button main", click: () => askAboutMarks(app) }, "Contrast the marked spans");
  const back = make("button", { type: "button", class: "button slim", click: () => backToEvents(app) }, "Back to the windows around events");
  const why = make("span", { class: "quiet small" });
  const details = make("details", { class: "more marking" }, make("summary", {}, "Marked spans", make("span", { class: "how-many" })),
    table, make("p", { class: "acts" }, ...add), make("p", { class: "need" }, ask, back, why));
  /** @type {{ show: () => void }[]} */
  let fields = [];
  let shape = "";

  const show = () => {
    const marks = sorted(marksNow());
    const next = marks.map(({ kind, at }) => `${kind}${at}`).join();
    if (next !== shape) {
      if (marks.length > shape.split(",").filter(Boolean).length) details.open = true;
      shape = next;
      fields = [];
      rows.replaceChildren(...marks.map((mark) => row(app, mark, fields, () => edges[0]?.focus({ preventScroll: true }))));
    }
    for (const field of fields) field.show();
    const { signal, reference } = waitingMarks();
    const asked = /** @type {any} */ (now().recipe)?.contrast.kind === "spans";
    table.hidden = !marks.length;
    const many = details.querySelector(".how-many");
    if (many) many.textContent = marks.length ? `: ${marks.length}` : "";
    ask.hidden = asked || !signal.length || !now().recipe;
    back.hidden = !asked || !canGoBack();
    why.textContent = asked ? "The windows are now cut from the marked spans." : signal.length ? (reference.length ? "They wait until you ask about them." : "Without reference marks, everything else is the reference.") : reference.length ? "Mark at least one span as signal." : "";
    lay(edges, place);
  };
  follow((state, before) => (state.recipe !== before.recipe || state.summary !== before.summary) && show());
  followMarks(show);
  followView(() => lay(edges, place));
  new ResizeObserver(() => lay(edges, place)).observe(place);
  place.append(...edges);
  return details;
}

/** @param {Mark[]} marks */
function sorted(marks) {
  return [...marks].sort((a, b) => KINDS.indexOf(a.kind) - KINDS.indexOf(b.kind) || a.at - b.at);
}

/** The mark as it is now. @param {{ kind: MarkKind, at: number }} of */
const current = (of) => marksNow().find(({ kind, at }) => kind === of.kind && at === of.at) ?? null;

/** @param {App} app @param {Mark} of @param {{ show: () => void }[]} fields @param {() => void} toEdge */
function row(app, of, fields, toEdge) {
  const name = `${WORDS[of.kind]} ${of.at + 1}`;
  const kind = select(`kind of ${name}`, (value) => { const mark = current(of); if (mark) turnMark(app, mark, /** @type {MarkKind} */ (value)); });
  kind.show(KINDS.map((value) => ({ value, label: WORDS[value] })), of.kind);
  const end = (/** @type {"from" | "to"} */ which) => numberField(`${name} ${which}, in seconds`, {
    get: () => current(of)?.[which], step: sample, write: seconds, range: () => [start(), span()],
    refuses: (value) => { const mark = current(of); return mark && (which === "from" ? value >= mark.to : value <= mark.from) ? "must end after it begins" : ""; },
    set: (value) => { const mark = current(of); if (mark && value !== null) moveMark(app, mark, which === "from" ? value : mark.from, which === "to" ? value : mark.to); },
  });
  const [from, to] = [end("from"), end("to")];
  const long = make("td", { class: "number" });
  fields.push(from, to, { show: () => { const mark = current(of); long.textContent = mark ? `${seconds(mark.to - mark.from)} s` : ""; } });
  const showIt = make("button", { type: "button", class: "button slim", click: () => {
    const mark = current(of);
    if (!mark) return;
    choose(mark);
    bringIn(mark.from, mark.to);
    toEdge();
  } }, "Show", make("span", { class: "aside" }, ` ${name}`));
  const remove = make("button", { type: "button", class: "button slim bare", click: () => { const mark = current(of); if (mark) removeMark(app, mark); } }, "Remove", make("span", { class: "aside" }, ` ${name}`));
  return make("tr", { "data-kind": of.kind }, make("td", {}, kind.root), make("td", {}, from.field), make("td", {}, to.field), long, make("td", { class: "acts" }, showIt, remove));
}

/** An edge of the chosen mark: dragged, or moved by the arrow keys. @param {App} app @param {HTMLElement} place @param {"from" | "to"} end */
function edge(app, place, end) {
  const node = make("div", { class: "edge", role: "slider", tabindex: 0, hidden: true, "data-end": end, "aria-orientation": "horizontal" }, make("span", { class: "grip" }));
  const move = (/** @type {number} */ to) => {
    const mark = chosenMark();
    if (!mark) return;
    const [low, high] = limits(mark, end);
    const value = Math.max(low, Math.min(high, onSample(to)));
    if (value !== mark[end]) moveMark(app, mark, end === "from" ? value : mark.from, end === "to" ? value : mark.to);
  };
  node.addEventListener("keydown", (event) => {
    const mark = chosenMark();
    if (!mark) return;
    if (event.key === "Delete" || event.key === "Backspace") {
      event.preventDefault();
      removeMark(app, mark);
      return place.focus({ preventScroll: true });
    }
    if (event.key === "Escape") return choose(null), place.focus({ preventScroll: true });
    // A step that can be seen, and with Alt the finest there is.
    const fine = event.altKey ? sample() : Math.max(sample(), onSample(viewNow().seconds / 200));
    const next = keyed(/** @type {any} */ ({ key: event.key, shiftKey: event.shiftKey }), mark[end], fine, limits(mark, end));
    if (next === null) return;
    event.preventDefault();
    move(next);
    bringIn(next, next);
  });
  node.addEventListener("pointerdown", (down) => {
    if (down.button !== 0) return;
    down.preventDefault();
    down.stopPropagation();
    node.focus({ preventScroll: true });
    node.setPointerCapture(down.pointerId);
    const at = (/** @type {PointerEvent} */ event) => {
      const { from, seconds: long } = viewNow();
      const box = place.getBoundingClientRect();
      move(from + ((event.clientX - box.left - LEFT) / (box.width - LEFT - RIGHT)) * long);
    };
    const done = () => {
      node.removeEventListener("pointermove", at);
      node.removeEventListener("lostpointercapture", done);
    };
    node.addEventListener("pointermove", at);
    node.addEventListener("lostpointercapture", done);
  });
  return node;
}

/** @param {Mark} mark @param {"from" | "to"} end @returns {[number, number]} */
function limits(mark, end) {
  return end === "from" ? [start(), onSample(mark.to - sample())] : [onSample(mark.from + sample()), onSample(span())];
}

/** @param {HTMLElement[]} edges @param {HTMLElement} place */
function lay(edges, place) {
  const mark = chosenMark();
  const { from, seconds: long } = viewNow();
  for (const node of edges) {
    const end = /** @type {"from" | "to"} */ (node.dataset.end);
    const at = mark ? (mark[end] - from) / long : NaN;
    node.hidden = !mark || !(at >= 0 && at <= 1);
    if (!mark || node.hidden) continue;
    node.className = `edge ${mark.kind}`;
    node.style.left = `${LEFT + at * (place.clientWidth - LEFT - RIGHT)}px`;
    node.style.top = `${TOP}px`;
    node.style.height = `${place.clientHeight - TOP - FOOT + 22}px`;
    const [low, high] = limits(mark, end);
    node.setAttribute("aria-label", `${WORDS[mark.kind]} ${mark.at + 1} ${end}`);
    node.setAttribute("aria-valuenow", String(mark[end]));
    node.setAttribute("aria-valuemin", String(low));
    node.setAttribute("aria-valuemax", String(high));
    node.setAttribute("aria-valuetext", timeWords(mark[end], 0.01));
  }
}
