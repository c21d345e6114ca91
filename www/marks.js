/**
 * Marked spans of time: signal, reference, not to be used. Spans not to be used belong to every question; signal and reference spans are
 * part of the recipe once the question is about marks, and wait beside it until then.
 */
import { now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {"signal" | "reference" | "not_used"} MarkKind */
/** @typedef {[number, number]} Span */
/** @typedef {{ kind: MarkKind, at: number, from: number, to: number }} Mark `at` is its place among those of its kind */
/** @typedef {{ signal: Span[], reference: Span[] }} Drafts */

/** @type {Drafts} */
let drafts = { signal: [], reference: [] };
/** @type {{ kind: MarkKind, at: number } | null} */
let chosen = null;
/** The question before it was about marks, to go back to. @type {any} */
let eventsBefore = null;
/** @type {Set<() => void>} */
const listeners = new Set();

/** Calls `listener` when a mark that waits, or the chosen one, changes; marks in the recipe change with the state. @param {() => void} listener */
export function followMarks(listener) {
  listeners.add(listener);
}

const tell = () => listeners.forEach((listener) => listener());

/** @param {any} recipe @param {MarkKind} kind @returns {Span[]} */
function spansIn(recipe, kind) {
  if (kind === "not_used") return recipe?.not_used ?? [];
  const { contrast } = recipe ?? {};
  if (contrast?.kind !== "spans") return drafts[kind];
  return Array.isArray(contrast[kind]) ? contrast[kind] : [];
}

/** @returns {Mark[]} */
export function marksNow() {
  const { recipe } = now();
  return /** @type {MarkKind[]} */ (["not_used", "reference", "signal"]).flatMap((kind) => spansIn(recipe, kind).map(([from, to], at) => ({ kind, at, from, to })));
}

export function chosenMark() {
  return marksNow().find(({ kind, at }) => kind === chosen?.kind && at === chosen.at) ?? null;
}

/** @param {{ kind: MarkKind, at: number } | null} mark */
export function choose(mark) {
  if (mark?.kind === chosen?.kind && mark?.at === chosen?.at) return;
  chosen = mark && { kind: mark.kind, at: mark.at };
  tell();
}

/** Signal and reference spans that are not part of the question yet. */
export function waitingMarks() {
  return now().recipe && /** @type {any} */ (now().recipe).contrast.kind === "spans" ? { signal: [], reference: [] } : drafts;
}

/** @param {Drafts} next */
export function putDrafts(next) {
  drafts = next;
  tell();
}

/** Another recording: nothing is marked. */
export function forgetMarks() {
  chosen = null;
  eventsBefore = null;
  putDrafts({ signal: [], reference: [] });
}

/** Changes the spans of one kind, wherever they are kept. @param {App} app @param {MarkKind} kind @param {(spans: Span[]) => Span[]} edit */
function change(app, kind, edit) {
  const { recipe } = now();
  const next = edit(structuredClone(spansIn(recipe, kind)));
  const asked = /** @type {any} */ (recipe)?.contrast.kind === "spans";
  if (kind !== "not_used" && !asked) return putDrafts({ ...drafts, [kind]: next });
  if (kind === "signal" && asked && !next.length && eventsBefore) return backToEvents(app);
  app.change((/** @type {any} */ all) => {
    if (kind === "not_used") all.not_used = next;
    else all.contrast[kind] = kind === "reference" && !next.length ? "rest" : next;
  });
  tell();
}

/** @param {App} app @param {MarkKind} kind @param {number} from @param {number} to */
export function addMark(app, kind, from, to) {
  chosen = { kind, at: spansIn(now().recipe, kind).length };
  change(app, kind, (spans) => [...spans, [from, to]]);
}

/** @param {App} app @param {Mark} mark @param {number} from @param {number} to */
export function moveMark(app, { kind, at }, from, to) {
  change(app, kind, (spans) => spans.map((span, i) => (i === at ? [from, to] : span)));
}

/** @param {App} app @param {Mark} mark */
export function removeMark(app, { kind, at }) {
  chosen = null;
  change(app, kind, (spans) => spans.filter((_, i) => i !== at));
}

/** @param {App} app @param {Mark} mark @param {MarkKind} kind */
export function turnMark(app, mark, kind) {
  if (kind === mark.kind) return;
  removeMark(app, mark);
  addMark(app, kind, mark.from, mark.to);
}

/** The question becomes: the marked signal spans against the marked reference spans, or against all the rest. @param {App} app */
export function askAboutMarks(app) {
  const { signal, reference } = drafts;
  app.change((/** @type {any} */ all) => {
    eventsBefore = all.contrast;
    all.contrast = { kind: "spans", signal, reference: reference.length ? reference : "rest" };
  });
  putDrafts({ signal: [], reference: [] });
}

/** The question of before; the marks wait again. @param {App} app */
export function backToEvents(app) {
  const contrast = /** @type {any} */ (now().recipe)?.contrast;
  const spans = (/** @type {unknown} */ given) => /** @type {Span[]} */ (Array.isArray(given) ? given : []);
  const kept = { signal: spans(contrast?.signal), reference: spans(contrast?.reference) };
  const before = eventsBefore;
  if (!before) return;
  app.change((/** @type {any} */ all) => void (all.contrast = before));
  putDrafts(kept);
}

/** Whether there is a question about events to go back to. */
export function canGoBack() {
  return eventsBefore !== null;
}
