/** A movie's pixels: bins, a mask by threshold or painted on the mean frame, and change against a running baseline. */
import { make } from "./kit.js";
import { numberField, select } from "./fields.js";
import { written } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Movie} Movie */
/** @typedef {import("./types").MovieCard} MovieCard */

const BINS = [1, 2, 3, 4, 5, 8, 10];
/** The picture is drawn about so large, in CSS pixels. */
const LARGE = 320;

/** @param {App} app */
export function movie(app) {
  const change = (/** @type {(movie: Movie) => void} */ how) => app.change((recipe) => void how((recipe.movie ??= {})));
  const bin = select("pixels along a side of a bin", (value) => change((movie) => {
    if (value === "1") delete movie.bin;
    else movie.bin = Number(value);
  }));
  const which = select("which pixels are used", (value) => change((movie) => {
    if (value === "all") delete movie.mask;
    else movie.mask = value === "painted" ? runsOf(mask(), now().sheet?.movie ?? null) : { quantile: 0.5 };
  }));
  const share = /** @type {HTMLInputElement} */ (make("input", { type: "range", min: "0", max: "0.99", step: "0.01", "aria-label": "share of pixels, from the darkest, that are left out", change: () => change((movie) => void (movie.mask = { quantile: Number(share.value) })) }));
  const said = make("span", { class: "quiet small" });
  const dff = /** @type {HTMLInputElement} */ (make("input", { type: "checkbox", change: () => change((movie) => {
    if (dff.checked) movie.dff = { percentile: 10, window_s: 30 };
    else delete movie.dff;
  }) }));
  const of = (/** @type {"percentile" | "window_s"} */ key, /** @type {string} */ label, /** @type {[number, number]} */ range) =>
    numberField(label, { get: () => now().recipe?.movie?.dff?.[key], range: () => range, step: () => 1, set: (value) => change((movie) => void (movie.dff && value !== null && (movie.dff[key] = value))) });
  const [percentile, window] = [of("percentile", "percentile of the baseline", [0, 100]), of("window_s", "seconds that the baseline is taken over", [0.1, 1e6])];
  const baseline = make("span", { class: "together" }, "the ", percentile.field, "th percentile of ", window.field, " s");
  const paint = painter((runs) => change((movie) => void (movie.mask = runs)));
  const bright = make("span", { class: "together" }, "leave out the darkest ", share, said);
  const root = make("div", { class: "movie", hidden: true },
    make("div", { class: "choice" },
      make("span", { class: "together" }, "Average bins of ", bin.root),
      make("span", { class: "together" }, "use ", which.root), bright,
      make("label", { class: "together" }, dff, "as a share of a running baseline"), baseline),
    paint.root);
  follow((state, before) => {
    if (state.recipe === before.recipe && state.sheet === before.sheet) return;
    const card = state.sheet?.movie ?? null;
    root.hidden = !card || !state.recipe;
    if (!card || !state.recipe) return;
    const chosen = state.recipe.movie ?? {};
    const most = Math.min(card.height, card.width) / 2;
    const bins = [...new Set([...BINS.filter((b) => b <= most), chosen.bin ?? 1])].sort((a, b) => a - b);
    bin.show(bins.map((b) => ({ value: String(b), label: b === 1 ? "1 pixel (as recorded)" : `${b} × ${b} pixels` })), String(chosen.bin ?? 1));
    const kind = Array.isArray(chosen.mask) ? "painted" : chosen.mask ? "bright" : "all";
    which.show([{ value: "all", label: "all pixels" }, { value: "bright", label: "bright pixels" }, { value: "painted", label: "painted pixels" }], kind);
    bright.hidden = kind !== "bright";
    const quantile = chosen.mask && "quantile" in chosen.mask ? chosen.mask.quantile : null;
    if (quantile !== null) share.value = String(quantile);
    const above = card.threshold === null || card.threshold === undefined ? "" : `, up to a mean of ${written(Number(card.threshold.toPrecision(4)))}`;
    said.textContent = `${quantile === null ? "" : `${Math.round(quantile * 100)} %`}${above}; ${card.used.length} of ${card.rows * card.columns} are used`;
    dff.checked = Boolean(chosen.dff);
    baseline.hidden = !chosen.dff;
    percentile.show();
    window.show();
    paint.show(kind === "painted" ? card : null);
  });
  return root;
}

const mask = () => now().recipe?.movie?.mask ?? null;

/** The pixels in use, as painted runs of the movie as recorded. @param {Movie["mask"] | null} known @param {MovieCard | null} card @returns {[number, number, number][]} */
function runsOf(known, card) {
  if (Array.isArray(known)) return known;
  if (!card) return [];
  const used = new Set(card.used);
  return runs(card, (row, column) => used.has(row * card.columns + column));
}

/** Rows of bins as runs of pixels. @param {MovieCard} card @param {(row: number, column: number) => boolean} on */
function runs(card, on) {
  const side = Math.floor(card.width / card.columns);
  const found = /** @type {[number, number, number][]} */ ([]);
  for (let row = 0; row < card.rows; row += 1)
    for (let column = 0; column < card.columns; column += 1) {
      if (!on(row, column)) continue;
      const first = column;
      while (column + 1 < card.columns && on(row, column + 1)) column += 1;
      for (let i = 0; i < side; i += 1) found.push([row * side + i + 1, first * side + 1, (column + 1) * side]);
    }
  return found;
}

/**
 * The mean frame, to be painted by pointer or keyboard: the first pixel touched says whether paint is put on or taken off.
 * @param {(runs: [number, number, number][]) => void} take
 */
function painter(take) {
  const canvas = /** @type {HTMLCanvasElement} */ (make("canvas", { class: "paint", tabindex: "0", role: "application", "aria-label": "The mean frame. Arrow keys move, space paints or erases, plus and minus change the brush." }));
  const told = make("p", { class: "quiet small", role: "status" });
  const root = make("div", { class: "painting", hidden: true }, make("p", { class: "quiet small" }, "Draw on the mean frame to choose pixels; draw from a chosen one to take them back. By keyboard: arrows move, space paints, + and − change the brush."), canvas, told);
  let card = /** @type {MovieCard | null} */ (null);
  let painted = new Set(/** @type {number[]} */ ([]));
  let [row, column, brush, putting] = [0, 0, 2, /** @type {boolean | null} */ (null)];

  const draw = () => {
    const context = canvas.getContext("2d");
    if (!card || !context) return;
    const step = Math.max(1, Math.floor(LARGE / Math.max(card.rows, card.columns)));
    [canvas.width, canvas.height] = [card.columns * step, card.rows * step];
    const known = card.mean.filter((value) => value !== null && Number.isFinite(value)).map(Number);
    const low = known.reduce((a, b) => Math.min(a, b), Infinity);
    const high = known.reduce((a, b) => Math.max(a, b), -Infinity);
    const style = getComputedStyle(canvas);
    card.mean.forEach((value, i) => {
      const [r, c] = [Math.floor(i / /** @type {MovieCard} */ (card).columns), i % /** @type {MovieCard} */ (card).columns];
      const light = high > low ? (Number(value) - low) / (high - low) : 0.5;
      context.fillStyle = `rgb(${[0, 1, 2].map(() => Math.round(60 + 190 * light)).join(" ")})`;
      context.fillRect(c * step, r * step, step, step);
      if (painted.has(i)) return;
      context.fillStyle = style.getPropertyValue("--plate") || "white";
      context.globalAlpha = 0.65;
      context.fillRect(c * step, r * step, step, step);
      context.globalAlpha = 1;
    });
    context.strokeStyle = style.color;
    context.lineWidth = 2;
    context.strokeRect((column - brush) * step, (row - brush) * step, (2 * brush + 1) * step, (2 * brush + 1) * step);
    told.textContent = `${painted.size} of ${card.rows * card.columns} chosen; brush ${2 * brush + 1} wide at row ${row + 1}, column ${column + 1}`;
  };
  const dab = () => {
    if (!card) return;
    putting ??= !painted.has(row * card.columns + column);
    for (let r = Math.max(0, row - brush); r <= Math.min(card.rows - 1, row + brush); r += 1)
      for (let c = Math.max(0, column - brush); c <= Math.min(card.columns - 1, column + brush); c += 1)
        if (putting) painted.add(r * card.columns + c);
        else painted.delete(r * card.columns + c);
    draw();
  };
  const lift = () => {
    if (putting === null || !card) return;
    putting = null;
    const { columns } = card;
    if (painted.size >= 2) take(runs(card, (r, c) => painted.has(r * columns + c)));
    else told.textContent = "At least two pixels are needed.";
  };
  const at = (/** @type {PointerEvent} */ event) => {
    if (!card) return;
    const box = canvas.getBoundingClientRect();
    column = Math.min(card.columns - 1, Math.max(0, Math.floor((event.clientX - box.left) / box.width * card.columns)));
    row = Math.min(card.rows - 1, Math.max(0, Math.floor((event.clientY - box.top) / box.height * card.rows)));
  };
  canvas.addEventListener("pointerdown", (event) => {
    canvas.setPointerCapture(event.pointerId);
    at(event);
    dab();
  });
  canvas.addEventListener("pointermove", (event) => {
    if (putting === null) return;
    at(event);
    dab();
  });
  for (const end of ["pointerup", "pointercancel"]) canvas.addEventListener(end, lift);
  canvas.addEventListener("keydown", (event) => {
    if (!card) return;
    const moves = /** @type {Record<string, [number, number]>} */ ({ ArrowUp: [-1, 0], ArrowDown: [1, 0], ArrowLeft: [0, -1], ArrowRight: [0, 1] });
    const move = moves[event.key];
    if (move) [row, column] = [Math.min(card.rows - 1, Math.max(0, row + move[0])), Math.min(card.columns - 1, Math.max(0, column + move[1]))];
    else if (event.key === "+") brush = Math.min(20, brush + 1);
    else if (event.key === "-" || event.key === "−") brush = Math.max(0, brush - 1);
    else if (event.key === " ") {
      dab();
      lift();
    } else return;
    event.preventDefault();
    draw();
  });
  return {
    root,
    /** @param {MovieCard | null} shown */
    show(shown) {
      root.hidden = !shown;
      if (!shown || putting !== null) return;
      if (shown.used !== card?.used) painted = new Set(shown.used);
      card = shown;
      [row, column] = [Math.min(row, card.rows - 1), Math.min(column, card.columns - 1)];
      draw();
    },
  };
}
