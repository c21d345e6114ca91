/** What stands behind and around the lines: windows, marks, gaps, events, names, the axis of time, and bars of real units. */
import { marksNow } from "./marks.js";
import { clock } from "./numbers.js";
import { now } from "./state.js";

/** @typedef {import("./types").Track} Track */
/** @typedef {{ left: number, right: number, top: number, bottom: number }} Box */
/** @typedef {{ name: string, y: number, faint: boolean }} Label */
/** @typedef {{ size: number, px: number, words: string, top: number }} Bar */
/** @typedef {Record<"paper" | "ink" | "slate" | "line" | "rule" | "signal" | "reference" | "signal-wash" | "reference-wash" | "wash", string>} Inks */

export const LEFT = 66;
export const RIGHT = 16;
export const TOP = 40;
export const FOOT = 28;
const FACE = "12px system-ui, -apple-system, 'Segoe UI', 'Noto Sans', sans-serif";
/** Height of the bars that say where windows lie. */
const STRIP = 5;
/** A window narrower than this is told by its bar alone. */
const NARROW = 3;

/** The page's colours as they are now. @returns {Inks} */
export function inks() {
  const style = getComputedStyle(document.documentElement);
  const names = /** @type {(keyof Inks)[]} */ (["paper", "ink", "slate", "line", "rule", "signal", "reference", "signal-wash", "reference-wash", "wash"]);
  return /** @type {Inks} */ (Object.fromEntries(names.map((name) => [name, style.getPropertyValue(`--${name}`).trim()])));
}

/**
 * @param {CanvasRenderingContext2D} pen in CSS px
 * @param {{ box: Box, wide: number, from: number, seconds: number, track: Track, labels: Label[], bars: Bar[], inks: Inks }} scene
 */
export function drawGround(pen, scene) {
  const { box, wide, inks: ink } = scene;
  pen.clearRect(0, 0, wide, box.bottom + FOOT);
  pen.font = FACE;
  pen.textBaseline = "middle";
  windows(pen, scene);
  marks(pen, scene);
  gaps(pen, scene);
  const room = bars(pen, scene);
  events(pen, scene, room);
  names(pen, scene);
  axis(pen, scene);
  pen.fillStyle = ink.ink;
}

/** @param {{ box: Box, from: number, seconds: number }} scene @param {number} t */
export function across({ box, from, seconds }, t) {
  return box.left + ((t - from) / seconds) * (box.right - box.left);
}

/** @typedef {Parameters<typeof drawGround>[1]} Scene */

/** A span of time as pixels inside the plot, or null where it is out of sight. @param {Scene} scene @param {number} from @param {number} to @returns {[number, number] | null} */
function inside(scene, from, to) {
  const [a, b] = [across(scene, from), across(scene, to)];
  return b < scene.box.left || a > scene.box.right ? null : [Math.max(scene.box.left, a), Math.min(scene.box.right, b)];
}

/** Windows of the events: kept ones as a wash with a full bar, dropped ones as a hollow bar. @param {CanvasRenderingContext2D} pen @param {Scene} scene */
function windows(pen, scene) {
  const { sheet, recipe } = now();
  if (!sheet?.windows || !recipe || recipe.contrast.kind !== "windows") return;
  const { box, inks: ink } = scene;
  const last = { signal: -Infinity, reference: -Infinity };
  for (const { onset_s, event, dropped } of sheet.windows.trials)
    for (const side of /** @type {const} */ (["reference", "signal"])) {
      const window = recipe.contrast[side];
      if (window.event !== event) continue;
      const at = inside(scene, onset_s + window.from_s, onset_s + window.to_s);
      // Where many windows fall on one pixel, the first stands for them.
      if (!at || at[1] < last[side] + 0.5) continue;
      last[side] = at[1];
      bar(pen, box, at, side, dropped !== null, ink, dropped === null && at[1] - at[0] >= NARROW);
    }
}

/** @param {CanvasRenderingContext2D} pen @param {Box} box @param {[number, number]} at @param {"signal" | "reference"} side @param {boolean} hollow @param {Inks} ink @param {boolean} wash */
function bar(pen, box, [a, b], side, hollow, ink, wash) {
  if (wash) {
    pen.fillStyle = ink[`${side}-wash`];
    pen.fillRect(a, box.top, b - a, box.bottom - box.top);
  }
  const [y, wide] = [box.bottom - STRIP - 1, Math.max(1, b - a)];
  if (hollow) {
    pen.strokeStyle = ink[side];
    pen.lineWidth = 1;
    pen.strokeRect(a + 0.5, y + 0.5, Math.max(1, wide - 1), STRIP - 1);
  } else {
    pen.fillStyle = ink[side];
    pen.fillRect(a, y, wide, STRIP);
  }
}

export const KIND_WORDS = { signal: "signal", reference: "reference", not_used: "not used" };

/** @param {CanvasRenderingContext2D} pen @param {Scene} scene */
function marks(pen, scene) {
  const { box, inks: ink } = scene;
  let used = -Infinity;
  // What is not used lies over everything else.
  for (const { kind, from, to } of marksNow().reverse().sort((a, b) => Number(a.kind === "not_used") - Number(b.kind === "not_used"))) {
    const at = inside(scene, from, to);
    if (!at) continue;
    const [a, b] = at;
    const color = kind === "not_used" ? ink.slate : ink[kind];
    if (kind === "not_used") hatch(pen, a, b, box, ink.line, 7);
    else {
      pen.fillStyle = ink[`${kind}-wash`];
      pen.fillRect(a, box.top, Math.max(1, b - a), box.bottom - box.top);
    }
    pen.strokeStyle = color;
    pen.lineWidth = 1.5;
    pen.setLineDash(kind === "reference" ? [5, 3] : []);
    for (const [t, x] of /** @type {[number, number][]} */ ([[from, a], [to, b]])) if (Math.abs(across(scene, t) - x) < 0.5) rule(pen, x, box.top - 14, box.bottom);
    pen.setLineDash([]);
    const words = KIND_WORDS[kind];
    const wide = pen.measureText(words).width;
    if (a < used + 6 || a + wide > box.right) continue;
    pen.fillStyle = color;
    pen.textAlign = "left";
    pen.fillText(words, a + 4, box.top - 11);
    used = a + 4 + wide;
  }
}

/** @param {CanvasRenderingContext2D} pen @param {Scene} scene */
function gaps(pen, scene) {
  const { stretches, rate_hz } = now().summary?.recording ?? scene.track;
  for (let i = 1; i < stretches.length; i += 1) {
    const [before, after] = [stretches[i - 1], stretches[i]];
    if (!before || !after) continue;
    const at = inside(scene, before.onset_s + before.count / rate_hz, after.onset_s);
    if (!at || at[1] - at[0] < 0.5) continue;
    hatch(pen, at[0], at[1], scene.box, scene.inks.rule, 5);
    if (at[1] - at[0] > 34) {
      pen.fillStyle = scene.inks.slate;
      pen.textAlign = "center";
      pen.fillText("gap", (at[0] + at[1]) / 2, (scene.box.top + scene.box.bottom) / 2);
    }
  }
}

/** @param {CanvasRenderingContext2D} pen @param {number} a @param {number} b @param {Box} box @param {string} color @param {number} step */
function hatch(pen, a, b, { top, bottom }, color, step) {
  pen.save();
  pen.beginPath();
  pen.rect(a, top, Math.max(1, b - a), bottom - top);
  pen.clip();
  pen.beginPath();
  const tall = bottom - top;
  for (let x = a - tall - ((a - tall) % step); x < b; x += step) {
    pen.moveTo(x, bottom);
    pen.lineTo(x + tall, top);
  }
  pen.strokeStyle = color;
  pen.lineWidth = 1;
  pen.stroke();
  pen.restore();
}

/** @param {CanvasRenderingContext2D} pen @param {Scene} scene @param {number} end right end of the room for labels */
function events(pen, scene, end) {
  const recording = now().summary?.recording;
  if (!recording) return;
  const { box, inks: ink, from, seconds } = scene;
  /** @type {[number, string][]} */
  const seen = [];
  for (const [label, onsets] of Object.entries(recording.event_onsets_s)) for (let i = firstFrom(onsets, from); i < onsets.length && Number(onsets[i]) <= from + seconds; i += 1) seen.push([Number(onsets[i]), label]);
  seen.sort((a, b) => a[0] - b[0]);
  pen.strokeStyle = ink.line;
  pen.lineWidth = 1;
  pen.setLineDash([3, 3]);
  pen.beginPath();
  let drawn = -Infinity;
  for (const [t] of seen) {
    const x = across(scene, t);
    if (x < drawn + 1) continue;
    pen.moveTo(Math.round(x) + 0.5, box.top - 32);
    pen.lineTo(Math.round(x) + 0.5, box.bottom);
    drawn = x;
  }
  pen.stroke();
  pen.setLineDash([]);
  pen.fillStyle = ink.slate;
  pen.textAlign = "left";
  let used = -Infinity;
  for (const [t, label] of seen) {
    const x = across(scene, t) + 4;
    if (x < used + 8) continue;
    const said = fitted(pen, label, Math.min(120, end - x));
    if (!said) continue;
    pen.fillText(said, x, box.top - 31);
    used = x + pen.measureText(said).width;
  }
}

/** The first of ascending times that is not before `from`. @param {number[]} times @param {number} from */
function firstFrom(times, from) {
  let [low, high] = [0, times.length];
  while (low < high) {
    const middle = (low + high) >> 1;
    if (Number(times[middle]) < from) low = middle + 1;
    else high = middle;
  }
  return low;
}

/** @param {CanvasRenderingContext2D} pen @param {string} text @param {number} room */
function fitted(pen, text, room) {
  if (pen.measureText(text).width <= room) return text;
  for (let n = Math.min(text.length - 1, 24); n > 2; n -= 1) {
    const cut = `${text.slice(0, n)}…`;
    if (pen.measureText(cut).width <= room) return cut;
  }
  return "";
}

/** @param {CanvasRenderingContext2D} pen @param {Scene} scene */
function names(pen, { labels, inks: ink }) {
  pen.textAlign = "right";
  let used = -Infinity;
  for (const { name, y, faint } of labels) {
    if (y < used + 13) continue;
    pen.fillStyle = faint ? ink.line : ink.slate;
    pen.fillText(fitted(pen, name, LEFT - 12) || name.slice(0, 6), LEFT - 9, y);
    used = y;
  }
}

/** Bars right of the plot; what they stand for is said above, from the right. @param {CanvasRenderingContext2D} pen @param {Scene} scene @returns {number} */
function bars(pen, { bars: all, box, wide, inks: ink }) {
  let end = wide;
  pen.textAlign = "right";
  all.forEach(({ px, words, top }, i) => {
    const x = box.right + 7 + 5 * (i % 2);
    pen.fillStyle = ink.ink;
    pen.fillRect(x, top + 2, 2, px);
    pen.fillStyle = ink.slate;
    if (top > box.top) return void pen.fillText(words, wide, top - 8);
    pen.fillText(words, end, box.top - 31);
    end -= pen.measureText(words).width + 12;
  });
  return end;
}

/** @param {CanvasRenderingContext2D} pen @param {Scene} scene */
function axis(pen, scene) {
  const { box, wide, from, seconds, inks: ink } = scene;
  const step = tickStep(seconds, (box.right - box.left) / 90);
  pen.fillStyle = ink.line;
  pen.fillRect(box.left, box.bottom, box.right - box.left, 1);
  pen.textAlign = "center";
  let used = -Infinity;
  for (let i = Math.ceil(from / step - 1e-9); i * step <= from + seconds * (1 + 1e-9); i += 1) {
    const x = across(scene, i * step);
    const words = timeWords(i * step, step);
    const half = pen.measureText(words).width / 2;
    pen.fillStyle = ink.line;
    pen.fillRect(Math.round(x), box.bottom, 1, 4);
    const middle = Math.min(x, wide - half);
    if (middle - half < used + 6) continue;
    pen.fillStyle = ink.slate;
    pen.fillText(words, middle, box.bottom + 14);
    used = middle + half;
  }
}

const STEPS = [0.001, 0.002, 0.005, 0.01, 0.02, 0.05, 0.1, 0.2, 0.5, 1, 2, 5, 10, 15, 30, 60, 120, 300, 600, 900, 1800, 3600, 7200, 14400, 28800, 86400];

/** @param {number} seconds @param {number} most */
function tickStep(seconds, most) {
  return STEPS.find((step) => seconds / step <= most) ?? seconds;
}

/** `1:05`, or `1:05.20` where ticks are closer than a second. @param {number} t @param {number} step */
export function timeWords(t, step) {
  if (step >= 1) return clock(t);
  const digits = step >= 0.1 ? 1 : step >= 0.01 ? 2 : 3;
  const rounded = Number(Math.abs(t).toFixed(digits));
  const whole = Math.floor(rounded);
  const tail = (rounded - whole).toFixed(digits).slice(1);
  return `${t < 0 && rounded > 0 ? "−" : ""}${clock(whole)}${tail}`;
}

/** @param {CanvasRenderingContext2D} pen @param {number} x @param {number} top @param {number} bottom */
function rule(pen, x, top, bottom) {
  pen.beginPath();
  pen.moveTo(x, top);
  pen.lineTo(x, bottom);
  pen.stroke();
}
