/**
 * Lines into pixels. Each column of pixels gets the smallest and largest value that falls into it, so that a spike of one sample is
 * seen at any scale; where samples are sparse, the straight line between them.
 */
import { BINS, STEP } from "./trace-tiles.js";

/** @typedef {import("./types").LineKind} LineKind */
/** @typedef {import("./types").Track} Track */
/** @typedef {import("./trace-tiles.js").Tiles} Tiles */
/** @typedef {{ from: number, seconds: number, columns: number }} Look the time that the columns of pixels stand for */

/** Half the thickness of a line in CSS px. */
const HALF = 0.55;

/** Samples a bin for a look: the largest power of four that still gives each column a bin. @param {Look} look @param {number} rate */
export function binSize({ seconds, columns }, rate) {
  const each = (seconds * rate) / Math.max(1, columns);
  let size = 1;
  while (size * STEP <= each) size *= STEP;
  return size;
}

/** The stretches that a look meets, with the samples it meets in each. @param {Track} track @param {Look} look */
export function pieces({ stretches, rate_hz }, { from, seconds }) {
  let [low, high] = [0, stretches.length];
  // The first stretch that ends after the left edge.
  while (low < high) {
    const middle = (low + high) >> 1;
    const stretch = stretches[middle];
    if (stretch && stretch.onset_s + stretch.count / rate_hz > from) high = middle;
    else low = middle + 1;
  }
  const met = [];
  for (let i = low; i < stretches.length; i += 1) {
    const stretch = stretches[i];
    if (!stretch || stretch.onset_s >= from + seconds) break;
    const at = (/** @type {number} */ t) => Math.max(0, Math.min(stretch.count, (t - stretch.onset_s) * rate_hz));
    met.push({ stretch, first: stretch.first + Math.floor(at(from)), end: stretch.first + Math.ceil(at(from + seconds)) });
  }
  return met;
}

/** The tiles that a look needs, those in sight first, then their neighbours. @param {Track} track @param {Look} look @param {number} size */
export function tilesFor(track, look, size) {
  const seen = new Set();
  for (const { first, end } of pieces(track, look))
    for (let tile = Math.floor(first / size / BINS); tile <= Math.floor(Math.max(first, end - 1) / size / BINS); tile += 1) seen.add(tile);
  return [...seen];
}

/** Room for one line's columns, used again and again. */
export class Columns {
  low = new Float32Array(0);
  high = new Float32Array(0);

  /** @param {number} columns */
  clear(columns) {
    if (this.low.length !== columns) [this.low, this.high] = [new Float32Array(columns), new Float32Array(columns)];
    this.low.fill(Infinity);
    this.high.fill(-Infinity);
  }

  /** The value in the middle of what is seen, or 0. */
  middle() {
    const { low, high } = this;
    const every = Math.max(1, Math.floor(low.length / 160));
    const mids = [];
    for (let c = 0; c < low.length; c += every) if (Number(low[c]) <= Number(high[c])) mids.push((Number(low[c]) + Number(high[c])) / 2);
    mids.sort((a, b) => a - b);
    return mids[mids.length >> 1] ?? 0;
  }
}

/**
 * Fills the columns with one line.
 * @param {Columns} out
 * @param {Tiles} tiles
 * @param {LineKind} kind
 * @param {number} line
 * @param {Track} track
 * @param {Look} look
 * @param {number} size samples a bin
 * @param {number} most samples a bin at the top of the pyramid
 */
export function fill(out, tiles, kind, line, track, look, size, most) {
  out.clear(look.columns);
  const source = new Found(tiles, kind, line, size, most);
  for (const { stretch, first, end } of pieces(track, look)) {
    const each = look.columns / look.seconds / track.rate_hz;
    const left = (stretch.onset_s - look.from) * (look.columns / look.seconds) - stretch.first * each;
    // Where a column has several samples, their ends tell all.
    if (size === 1 && each > 0.5) joined(out, source, Math.max(stretch.first, first - 1), Math.min(stretch.first + stretch.count, end + 1), left, each);
    else binned(out, source, first, end, left, each);
  }
}

/** The best tile that is there for a sample. */
class Found {
  /** @type {Float32Array | null} */
  data = null;
  size = 1;
  /** The samples that `data` is about. */
  from = 0;
  to = 0;
  #get;
  #finest;
  #most;

  /** @param {Tiles} tiles @param {LineKind} kind @param {number} line @param {number} finest @param {number} most */
  constructor(tiles, kind, line, finest, most) {
    this.#get = (/** @type {number} */ size, /** @type {number} */ tile) => tiles.get(kind, line, size, tile);
    this.#finest = finest;
    this.#most = most;
  }

  /** @param {number} sample */
  at(sample) {
    if (sample >= this.from && sample < this.to) return;
    for (let size = this.#finest; ; size *= STEP) {
      const tile = Math.floor(sample / (size * BINS));
      this.data = this.#get(size, tile);
      this.size = size;
      if (this.data || size >= this.#most) {
        // What stands in for a finer tile is asked again where the next finer one may begin.
        const span = this.#finest * BINS;
        this.from = Math.floor(sample / span) * span;
        this.to = this.from + span;
        return;
      }
    }
  }
}

/** @param {Columns} out @param {Found} source @param {number} first @param {number} end @param {number} left @param {number} each */
function binned({ low, high }, source, first, end, left, each) {
  const columns = low.length;
  for (let sample = first; sample < end; ) {
    source.at(sample);
    const { data, size } = source;
    const until = Math.min(end, source.to);
    if (!data) {
      sample = until;
      continue;
    }
    const from = Math.floor(sample / size);
    const stop = Math.ceil(until / size);
    const base = Math.floor(source.from / (size * BINS)) * BINS;
    for (let bin = from; bin < stop; bin += 1) {
      const [min, max] = [/** @type {number} */ (data[2 * (bin - base)]), /** @type {number} */ (data[2 * (bin - base) + 1])];
      // What is not a number fails every comparison.
      if (!(min <= max)) continue;
      let c = Math.max(0, Math.floor(left + Math.max(first, bin * size) * each));
      const last = Math.min(columns - 1, Math.floor(left + (Math.min(end, (bin + 1) * size) - 1e-9) * each));
      for (; c <= last; c += 1) {
        if (min < /** @type {number} */ (low[c])) low[c] = min;
        if (max > /** @type {number} */ (high[c])) high[c] = max;
      }
    }
    sample = until;
  }
  // Neighbours touch, as one line does.
  for (let c = 1; c < columns; c += 1) {
    const [l0, h0, l1, h1] = [/** @type {number} */ (low[c - 1]), /** @type {number} */ (high[c - 1]), /** @type {number} */ (low[c]), /** @type {number} */ (high[c])];
    if (!(l0 <= h0) || !(l1 <= h1)) continue;
    if (l1 > h0) low[c] = h0;
    else if (h1 < l0) high[c] = l0;
  }
}

/** @param {Columns} out @param {Found} source @param {number} first @param {number} end @param {number} left @param {number} each */
function joined({ low, high }, source, first, end, left, each) {
  const columns = low.length;
  let [x0, y0] = [NaN, NaN];
  for (let sample = first; sample < end; sample += 1) {
    if (sample >= source.to || sample < source.from) source.at(sample);
    const { data, size } = source;
    const bin = data ? 2 * (Math.floor(sample / size) - Math.floor(source.from / (size * BINS)) * BINS) : 0;
    const y1 = data ? (/** @type {number} */ (data[bin]) + /** @type {number} */ (data[bin + 1])) / 2 : NaN;
    const x1 = left + sample * each;
    if (y0 === y0 && y1 === y1) {
      const slope = (y1 - y0) / (x1 - x0);
      const last = Math.min(columns - 1, Math.floor(x1));
      for (let c = Math.max(0, Math.floor(x0)); c <= last; c += 1) {
        const [a, b] = [y0 + slope * (Math.max(x0, c) - x0), y0 + slope * (Math.min(x1, c + 1) - x0)];
        const [min, max] = a < b ? [a, b] : [b, a];
        if (min < /** @type {number} */ (low[c])) low[c] = min;
        if (max > /** @type {number} */ (high[c])) high[c] = max;
      }
    }
    [x0, y0] = [x1, y1];
  }
}

/**
 * Paints the columns of one line: full where it covers a pixel, in part where it covers a part of it.
 * @param {Uint32Array} pixels rows of `columns` pixels, alpha in the highest byte
 * @param {Columns} line
 * @param {number} top first row that may be painted
 * @param {number} bottom the row after the last
 * @param {number} centre row of the line's middle value
 * @param {number} middle the value there
 * @param {number} scale rows a unit
 * @param {number} color the three lower bytes
 * @param {number} density pixels a CSS px
 * @param {number} strength how much of what lies below a line covers: less than 1 where lines are so dense that they lie over each other
 */
export function paint(pixels, { low, high }, top, bottom, centre, middle, scale, color, density, strength) {
  const columns = low.length;
  const half = HALF * density;
  for (let c = 0; c < columns; c += 1) {
    const [l, h] = [/** @type {number} */ (low[c]), /** @type {number} */ (high[c])];
    if (!(l <= h)) continue;
    const [y0, y1] = [centre - (h - middle) * scale - half, centre - (l - middle) * scale + half];
    const stop = Math.min(bottom, Math.ceil(y1));
    for (let y = Math.max(top, Math.floor(y0)); y < stop; y += 1) {
      const covered = Math.min(y + 1, y1) - Math.max(y, y0);
      const at = y * columns + c;
      const below = /** @type {number} */ (pixels[at]) >>> 24;
      const alpha = below + (((255 - below) * strength * (covered >= 1 ? 1 : covered)) | 0);
      if (alpha > below) pixels[at] = (alpha << 24) | color;
    }
  }
}
