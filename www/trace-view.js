/** Which part of the recording is looked at: a span of time, some rows, how tall they are, before or after the preparation. */
import { now } from "./state.js";

/** @typedef {{ from: number, seconds: number, row: number, rows: number, gain: number, kind: "recorded" | "prepared" }} View */

/** A first look, in seconds. */
export const FIRST_SECONDS = 10;
const FIRST_ROWS = 16;
/** At the closest look a column of pixels is a fraction of a sample. */
const LEAST_SAMPLES = 16;

/** @type {View} */
let view = { from: 0, seconds: FIRST_SECONDS, row: 0, rows: FIRST_ROWS, gain: 1, kind: "recorded" };
/** @type {Set<(view: View, before: View) => void>} */
const listeners = new Set();

export function viewNow() {
  return view;
}

/** @param {(view: View, before: View) => void} listener */
export function followView(listener) {
  listeners.add(listener);
}

/** Seconds from the start of the clock to the end of the last stretch. */
export function span() {
  const recording = now().summary?.recording;
  const last = recording?.stretches.at(-1);
  return recording && last ? last.onset_s + last.count / recording.rate_hz : FIRST_SECONDS;
}

/** Where the first stretch begins, or 0. */
export function start() {
  return Math.min(0, now().summary?.recording.stretches[0]?.onset_s ?? 0);
}

/** Shortest and longest span of time that can be looked at. @returns {[number, number]} */
export function spanLimits() {
  const rate = now().summary?.recording.rate_hz ?? 1;
  const all = Math.max(span() - start(), 1 / rate);
  return [Math.min(all, LEAST_SAMPLES / rate), all];
}

/** @param {Partial<View>} patch */
export function look(patch) {
  const before = view;
  const next = { ...view, ...patch };
  const [least, most] = spanLimits();
  next.seconds = Math.max(least, Math.min(most, next.seconds));
  next.from = Math.max(start(), Math.min(span() - next.seconds, next.from));
  next.rows = Math.max(1, Math.round(next.rows));
  next.row = Math.max(0, Math.round(next.row));
  next.gain = Math.max(1e-3, Math.min(1e3, next.gain));
  if (Object.entries(next).every(([key, value]) => before[/** @type {keyof View} */ (key)] === value)) return;
  view = next;
  for (const listener of listeners) listener(view, before);
}

/** Another recording: the first ten seconds of it. */
export function lookAfresh() {
  look({ from: start(), seconds: FIRST_SECONDS, row: 0, rows: FIRST_ROWS, gain: 1, kind: "recorded" });
}

/** Closer or farther, while the time at `pivot` (0 left edge, 1 right edge) stays where it is. @param {number} times @param {number} pivot */
export function zoom(times, pivot = 0.5) {
  const { from, seconds } = view;
  const [least, most] = spanLimits();
  const next = Math.max(least, Math.min(most, seconds * times));
  look({ seconds: next, from: from + (seconds - next) * pivot });
}

/** Brings a time into the middle unless it is in sight. @param {number} from @param {number} to */
export function bringIn(from, to) {
  if (from >= view.from && to <= view.from + view.seconds) return;
  const seconds = Math.max(view.seconds, (to - from) * 1.2);
  look({ seconds, from: (from + to - seconds) / 2 });
}
