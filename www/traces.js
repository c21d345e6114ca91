/** The trace view: channels over time, components under them, drawn straight from the worker's bins on two canvases of its own. */
import { eachFrame, afterRest, make } from "./kit.js";
import { figureSlot } from "./figure.js";
import { followMarks } from "./marks.js";
import { count, duration } from "./numbers.js";
import { saving } from "./save-figure.js";
import { follow, now } from "./state.js";
import { FOOT, LEFT, RIGHT, TOP, drawGround, inks, timeWords } from "./trace-ground.js";
import { Columns, binSize, fill, paint, tilesFor } from "./trace-lines.js";
import { BINS, STEP, Tiles } from "./trace-tiles.js";
import { followView, lookAfresh, span, viewNow } from "./trace-view.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").LineKind} LineKind */
/** @typedef {import("./types").Track} Track */
/** @typedef {import("./trace-ground.js").Box} Box */
/** @typedef {{ kind: LineKind, line: number, track: Track, name: string, unit: string, y: number, color: string, faint: boolean }} Row */

/** Rows of room above the first line: frontal channels stand first in most montages, and blinks are tall. */
const HEADROOM = 1;
/** Between channels and components. */
const BETWEEN = 26;
/** Components of one end that are drawn. */
const COMPONENTS = 4;
/** From so many samples a column on a line is an area, and shows what lies under it. */
const DENSE = 16;
/** A usual swing takes this much of the room between two lines, the other way about. */
const ROOM = 1.2;

/** What the worker can draw now. @type {import("./types").Tracks | null} */
let tracks = null;
let withComponents = true;

/** @param {App} app */
export function mountTraces(app) {
  const [ground, lines] = [make("canvas", { "aria-hidden": "true" }), make("canvas", { class: "over", "aria-hidden": "true" })];
  const place = make("div", { class: "traces", tabindex: 0, role: "group", "aria-label": "Traces", "aria-describedby": "traces-keys" }, ground, lines);
  // On paper, and for saving, the figure comes from the core.
  const figure = figureSlot(app, "traces", {
    section: "recording", label: "Channels over time, one line a channel",
    load: () => app.bridge.traces(viewNow().from, viewNow().seconds, shownChannels()),
  });
  figure.root.classList.add("on-paper");
  const caption = make("div", { class: "caption" }, make("b", {}, "Channels over time"), make("span", { class: "quiet hint" }, "drag to move; two fingers, or Ctrl and the wheel, to look closer"),
    saving(app, { name: "traces", plan: { title: "Channels over time" }, figure: figure.figure }));
  const root = make("figure", { class: "figure", "data-figure": "traces-view" }, caption, place, figure.root);

  const draw = eachFrame(() => place.clientWidth > LEFT + 40 && now().summary && tracks && frame(place, ground, lines, tiles));
  const tiles = new Tiles((kind, which, size, first, many) => app.bridge.bins(kind, which, size, first, many), draw);
  const rested = afterRest(() => figure.refresh(), 900);
  const said = afterRest(() => place.setAttribute("aria-label", spoken()), 400);
  const changed = () => {
    draw();
    said();
    rested();
  };
  caption.querySelector(".save")?.addEventListener("toggle", () => figure.refresh());
  followView(changed);
  followMarks(draw);
  new ResizeObserver(draw).observe(place);
  matchMedia("(prefers-color-scheme: dark)").addEventListener("change", () => {
    colours = null;
    draw();
  });

  const reload = keyed(async () => {
    const asked = now().summary;
    const next = await app.bridge.tracks().catch(() => null);
    if (!next || now().summary !== asked) return;
    tracks = next;
    changed();
    listeners.forEach((listener) => listener());
  });
  let [preparation, components] = ["", ""];
  follow((state, before) => {
    if (state.summary !== before.summary) {
      for (const kind of /** @type {const} */ (["recorded", "prepared", "components"])) tiles.forget(kind);
      tracks = null;
      if (state.summary) lookAfresh(), reload();
    }
    const { sheet } = state;
    if (sheet === before.sheet) return void (state.recipe !== before.recipe && draw());
    const [nowPrepared, nowComponents] = [sheet?.preparation ? JSON.stringify([sheet.recipe.channels, sheet.recipe.filter]) : "", JSON.stringify([...(sheet?.stronger ?? []), ...(sheet?.weaker ?? [])].map(({ filter }) => filter[0]))];
    if (nowPrepared !== preparation) tiles.forget("prepared");
    if (nowPrepared !== preparation || nowComponents !== components) tiles.forget("components"), reload();
    [preparation, components] = [nowPrepared, nowComponents];
    draw();
  });
  return { root, place, draw };
}

/** Runs one at a time; what is asked for meanwhile is done once more at the end. @param {() => Promise<void>} work */
function keyed(work) {
  let [busy, again] = [false, false];
  const run = async () => {
    if (busy) return void (again = true);
    busy = true;
    do {
      again = false;
      await work();
    } while (again);
    busy = false;
  };
  return () => void run();
}

/** @type {Set<() => void>} */
const listeners = new Set();
/** Calls `listener` when other lines can be drawn than before. @param {() => void} listener */
export function followTracks(listener) {
  listeners.add(listener);
}

export function tracksNow() {
  return tracks;
}

/** @param {boolean} yes */
export function showComponents(yes) {
  withComponents = yes;
}

/** The lines above: recorded channels, or prepared ones once there are any. @returns {{ kind: LineKind, track: Track } | null} */
export function above() {
  if (!tracks) return null;
  const { kind } = viewNow();
  return kind === "prepared" && tracks.prepared ? { kind, track: tracks.prepared } : { kind: "recorded", track: tracks.recorded };
}

/** Channels in sight as indexes of the recording, for the figure on paper. */
function shownChannels() {
  const shown = above();
  const { row, rows } = viewNow();
  const names = now().summary?.channels.map(({ name }) => name) ?? [];
  return (shown?.track.lines ?? []).slice(row, row + rows).flatMap(({ name }) => (names.includes(name) ? [names.indexOf(name)] : []));
}

/** Units of the lines above with how much of each lies between two of them. @param {Track} track @returns {Map<string, number>} */
export function rooms({ lines }) {
  /** @type {Map<string, number[]>} */
  const swings = new Map();
  for (const { unit, swing } of lines) swings.set(unit, [...(swings.get(unit) ?? []), ...(swing > 0 ? [swing] : [])]);
  return new Map([...swings].map(([unit, all]) => [unit, (all.sort((a, b) => a - b)[all.length >> 1] ?? 1) * ROOM]));
}

/** Which components stand under the channels. @returns {{ line: number, color: "signal" | "reference" }[]} */
function componentsShown() {
  const all = tracks?.components?.lines ?? [];
  if (!withComponents) return [];
  const of = (/** @type {string} */ end, /** @type {"signal" | "reference"} */ color) => all.flatMap(({ name }, line) => (name.startsWith(end) ? [{ line, color }] : [])).slice(0, COMPONENTS);
  return [...of("stronger", "signal"), ...of("weaker", "reference")];
}

/** Heights of the view: all of it, and of one row. @param {number} channels @param {number} components */
function heights(channels, components) {
  const row = Math.max(11, Math.min(30, 420 / Math.max(1, channels)));
  const below = Math.max(18, Math.min(row, 30));
  const upper = row * (channels + HEADROOM);
  return { row, below, upper, all: TOP + upper + (components ? BETWEEN + below * components : 0) + FOOT };
}

const columns = new Columns();
/** @type {ImageData | null} */
let image = null;
/** The page's colours, until the scheme changes. @type {import("./trace-ground.js").Inks | null} */
let colours = null;

/** @param {HTMLElement} place @param {HTMLCanvasElement} ground @param {HTMLCanvasElement} lines @param {Tiles} tiles */
function frame(place, ground, lines, tiles) {
  const shown = above();
  if (!shown) return;
  const { row: first, rows, from, seconds, gain } = viewNow();
  const channels = shown.track.lines.slice(first, first + rows);
  const below = componentsShown();
  const size = heights(channels.length, below.length);
  const wide = place.clientWidth;
  const density = Math.max(1, devicePixelRatio);
  const box = { left: LEFT, right: wide - RIGHT, top: TOP, bottom: Math.round(size.all - FOOT) };
  const high = Math.round(size.all);
  if (place.style.height !== `${high}px`) place.style.height = `${high}px`;
  const ink = (colours ??= inks());
  const leftOut = new Set(now().recipe?.channels.leave_out ?? []);
  const room = rooms(shown.track);
  /** @type {(Row & { room: number, rowHeight: number })[]} */
  const all = channels.map(({ name, unit }, i) => ({
    kind: shown.kind, line: first + i, track: shown.track, name, unit, room: (room.get(unit) ?? 1) / gain, rowHeight: size.row,
    y: box.top + size.row * (i + HEADROOM + 0.5), faint: leftOut.has(name), color: leftOut.has(name) ? ink.line : ink.ink,
  }));
  const { components } = tracks ?? {};
  const own = components ? (rooms(components).get("") ?? 1) / gain : 1;
  const under = box.top + size.upper + BETWEEN;
  if (components) below.forEach(({ line, color }, i) => all.push({
    kind: "components", line, track: components, name: (components.lines[line]?.name ?? "").replace("stronger", "up").replace("weaker", "down"), unit: "", room: own, rowHeight: size.below,
    y: under + size.below * (i + 0.5), faint: false, color: ink[color],
  }));

  const view = { from, seconds, columns: Math.round((box.right - box.left) * density) };
  const tall = Math.round((box.bottom - box.top) * density);
  if (image?.width !== view.columns || image.height !== tall) {
    image = new ImageData(view.columns, tall);
    [lines.width, lines.height] = [view.columns, tall];
    Object.assign(lines.style, { left: `${box.left}px`, top: `${box.top}px`, width: `${box.right - box.left}px`, height: `${box.bottom - box.top}px` });
  }
  const pixels = new Uint32Array(image.data.buffer);
  pixels.fill(0);
  for (const row of [...all].sort((a, b) => Number(b.faint) - Number(a.faint))) {
    const fine = binSize(view, row.track.rate_hz);
    fill(columns, tiles, row.kind, row.line, row.track, view, fine, top(row.track));
    paint(pixels, columns, 0, tall, (row.y - box.top) * density, columns.middle(), (row.rowHeight / row.room) * density, packed(row.color), density, fine >= DENSE ? 0.6 : 1);
  }
  lines.getContext("2d")?.putImageData(image, 0, 0);

  if (ground.width !== Math.round(wide * density) || ground.height !== Math.round(high * density)) {
    [ground.width, ground.height] = [Math.round(wide * density), Math.round(high * density)];
    Object.assign(ground.style, { width: `${wide}px`, height: `${high}px` });
  }
  const pen = ground.getContext("2d");
  if (!pen) return;
  pen.setTransform(density, 0, 0, density, 0, 0);
  const bars = [...room].slice(0, 2).map(([unit, each]) => scaleBar(each / gain, size.row, unit, box.top));
  if (below.length) bars.push(scaleBar(own, size.below, "× reference SD", under));
  drawGround(pen, { box, wide, from, seconds, track: shown.track, labels: all, bars, inks: ink });
  tiles.want(wishes(all, view));
  if (!tiles.waiting()) performance.mark("teasel:traces");
}

/** A bar of a round size, at most 24 px or 2/5 of a row tall. @param {number} room units between two lines @param {number} row @param {string} unit @param {number} top */
function scaleBar(room, row, unit, top) {
  const most = (Math.max(24, 0.4 * row) * room) / row;
  const power = 10 ** Math.floor(Math.log10(most));
  const size = [5, 2, 1].map((times) => times * power).find((value) => value <= most) ?? power;
  return { size, px: (size / room) * row, top, words: `${size >= 1e4 ? count(size) : Number(size.toPrecision(3))} ${unit}`.trim() };
}

/** @param {Track} track */
function top({ stretches }) {
  const last = stretches.at(-1);
  const all = last ? last.first + last.count : 1;
  let size = 1;
  while (size * BINS < all) size *= STEP;
  return size;
}

/** In sight at the right fineness, from afar, then what lies beside. @param {Row[]} rows @param {import("./trace-lines.js").Look} view */
function wishes(rows, view) {
  /** @type {import("./trace-tiles.js").Wish[]} */
  const out = [];
  for (const kind of /** @type {LineKind[]} */ (["recorded", "prepared", "components"])) {
    const [row] = rows.filter((one) => one.kind === kind);
    if (!row) continue;
    const { track } = row;
    const own = rows.filter((one) => one.kind === kind).map(({ line }) => line);
    const size = binSize(view, track.rate_hz);
    const highest = top(track);
    const beside = { ...view, from: view.from - view.seconds / 2, seconds: 2 * view.seconds };
    const wish = (/** @type {number} */ fine, /** @type {typeof view} */ seen) => tilesFor(track, seen, fine).map((tile) => ({ kind, size: fine, tile, lines: [...own] }));
    // The whole from afar stands in for everything else: it comes first.
    out.push(...wish(highest, view), ...(size < highest ? wish(size, view) : []));
    if (size < highest) out.push(...wish(Math.min(highest, size * STEP), beside), ...wish(size, beside));
  }
  return out;
}

/** `#22303c` as the three lower bytes of a pixel. @param {string} color */
function packed(color) {
  const rgb = parseInt(color.slice(1), 16);
  return ((rgb & 255) << 16) | (rgb & 0xff00) | (rgb >> 16);
}

/** What is seen, for those who cannot see it. */
function spoken() {
  const shown = above();
  const { from, seconds, row, rows } = viewNow();
  const names = shown?.track.lines.slice(row, row + rows) ?? [];
  const events = Object.entries(now().summary?.recording.event_onsets_s ?? {}).map(([label, onsets]) => [label, onsets.filter((t) => t >= from && t <= from + seconds).length]).filter(([, many]) => many);
  return `Traces: ${names.length} channels ${shown?.kind === "prepared" ? "as prepared" : "as recorded"}, ${names[0]?.name ?? ""} to ${names.at(-1)?.name ?? ""}, ${timeWords(from, 0.1)} to ${timeWords(from + seconds, 0.1)} of ${duration(span())}. ${events.length ? `Events in sight: ${events.map(([label, many]) => `${label} ${many}`).join(", ")}.` : "No event in sight."}`;
}
