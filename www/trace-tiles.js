/**
 * Pieces of lines, fetched from the worker as they come into sight and kept as long as there is room.
 *
 * A tile holds the smallest and largest values of `BINS` bins of one line. Bins have 1, 4, 16, … samples. Until a fine tile is there, a
 * coarser one stands in for it, so that moving about never waits.
 */

/** @typedef {import("./types").LineKind} LineKind */

export const BINS = 1024;
export const STEP = 4;
/** Bytes of tiles that are kept. */
const ROOM = 128e6;
/** Lines asked for at once: the worker answers between two bites of its work. */
const LINES_AT_ONCE = 32;
/** Requests under way at once. */
const AT_ONCE = 2;

/** @typedef {{ kind: LineKind, size: number, tile: number, lines: number[] }} Wish */

export class Tiles {
  #fetch;
  #arrived;
  /** Oldest use first. @type {Map<string, Float32Array>} */
  #kept = new Map();
  #bytes = 0;
  /** @type {Wish[]} */
  #wishes = [];
  #running = 0;
  /** Under way. @type {Set<string>} */
  #asked = new Set();
  /** Counts what was forgotten of each kind: answers that were overtaken are dropped. @type {Record<LineKind, number>} */
  #version = { recorded: 0, prepared: 0, components: 0 };

  /**
   * @param {(kind: LineKind, lines: number[], size: number, first: number, count: number) => Promise<Float32Array>} fetch
   * @param {() => void} arrived
   */
  constructor(fetch, arrived) {
    this.#fetch = fetch;
    this.#arrived = arrived;
  }

  /** @param {LineKind} kind @param {number} line @param {number} size @param {number} tile @returns {Float32Array | null} */
  get(kind, line, size, tile) {
    return this.#kept.get(key(kind, line, size, tile)) ?? null;
  }

  /** What is wished for from now on, the most urgent first; wishes of before that are not under way are dropped. @param {Wish[]} wishes */
  want(wishes) {
    this.#wishes = wishes
      .map((wish) => ({ ...wish, lines: wish.lines.filter((line) => this.#lacks(wish, line)) }))
      .filter(({ lines }) => lines.length);
    this.#go();
  }

  /** Whether anything that was wished for is not there yet. */
  waiting() {
    return this.#running > 0 || this.#wishes.length > 0;
  }

  /** @param {LineKind} kind */
  forget(kind) {
    this.#version[kind] += 1;
    for (const [name, data] of this.#kept) if (name.startsWith(kind)) this.#drop(name, data);
  }

  /** @param {Wish} wish @param {number} line */
  #lacks({ kind, size, tile }, line) {
    const name = key(kind, line, size, tile);
    const kept = this.#kept.get(name);
    if (!kept) return !this.#asked.has(name);
    // Used again: the last to be dropped.
    this.#kept.delete(name);
    this.#kept.set(name, kept);
    return false;
  }

  #go() {
    while (this.#running < AT_ONCE) {
      const wish = this.#wishes[0];
      if (!wish) return;
      const lines = wish.lines.splice(0, LINES_AT_ONCE);
      if (!wish.lines.length) this.#wishes.shift();
      void this.#ask({ ...wish, lines });
    }
  }

  /** @param {Wish} wish */
  async #ask({ kind, size, tile, lines }) {
    const version = this.#version[kind];
    const names = lines.map((line) => key(kind, line, size, tile));
    for (const name of names) this.#asked.add(name);
    this.#running += 1;
    try {
      const all = await this.#fetch(kind, lines, size, tile * BINS, BINS);
      if (version === this.#version[kind]) names.forEach((name, i) => this.#keep(name, all.subarray(2 * BINS * i, 2 * BINS * (i + 1))));
    } catch {
      // Nothing is open any more, or the worker has ended: whoever looks next asks again.
    } finally {
      this.#running -= 1;
      for (const name of names) this.#asked.delete(name);
      this.#arrived();
      this.#go();
    }
  }

  /** @param {string} name @param {Float32Array} data */
  #keep(name, data) {
    this.#kept.set(name, data);
    this.#bytes += data.byteLength;
    for (const [oldest, old] of this.#kept) {
      if (this.#bytes <= ROOM) break;
      this.#drop(oldest, old);
    }
  }

  /** @param {string} name @param {Float32Array} data */
  #drop(name, data) {
    this.#kept.delete(name);
    this.#bytes -= data.byteLength;
  }
}

/** @param {LineKind} kind @param {number} line @param {number} size @param {number} tile */
function key(kind, line, size, tile) {
  return `${kind} ${line} ${size} ${tile}`;
}
