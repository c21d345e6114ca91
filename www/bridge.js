/**
 * The bridge between the page and the worker: one queue of calls, events back, and the drawing of the page's own instance.
 *
 * The module is compiled once; the page and the worker each run an instance of it. Nothing is fetched: module and worker are parts of
 * the page.
 */
import init, * as module from "teasel-module";
import { sorted } from "./files.js";

/** @typedef {import("./types").Problem} Problem */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {import("./types").Given} Given */
/** @typedef {import("./types").Summary} Summary */
/** @typedef {import("./types").SheetNews} SheetNews */
/** @typedef {import("./types").Figure} Figure */
/** @typedef {import("./types").PlotBox} PlotBox */
/** @typedef {import("./types").Table} Table */
/** @typedef {{ name: string, bytes: Uint8Array<ArrayBuffer> }} NamedBytes */
/** @typedef {{ done: (value: any) => void, failed: (problem: Problem) => void }} Waiting */
/**
 * @typedef {object} Events
 * @property {{ stage: string, done: number, of: number, generation: number }} progress at most every 60 ms
 * @property {SheetNews & { drawn: Record<string, Figure>, finished: boolean }} sheet something new is worth drawing; `drawn` holds the watched figures
 * @property {{ generation: number }} finished nothing is left to compute
 * @property {Problem} problem the work at hand failed; what was known before still stands
 * @property {{ words: string, memory: number }} died the worker ended; `revive` starts another
 */

/** A side file is a table of events or channels: none is this large. */
const SIDE_BYTES = 64 * 1024 * 1024;

/**
 * @param {string} kind
 * @param {string} what
 * @param {string} advice
 * @returns {Problem}
 */
export function problem(kind, what, advice) {
  return { kind, file: null, what, place: null, expected: null, found: null, advice, salvage: null, asks: [] };
}

/** Starts the worker and the page's instance. Throws a Problem where the browser cannot run them. */
export async function start() {
  try {
    const compiled = await compile();
    const bridge = new Bridge(compiled);
    await Promise.all([init({ module_or_path: compiled }), bridge.started]);
    bridge.version = module.version();
    performance.mark("teasel:started");
    return bridge;
  } catch (error) {
    if (typeof error === "object" && error !== null && "advice" in error) throw error;
    throw problem("unsupported", `this browser cannot start Teasel: ${error}`, "Use a browser from 2023 or later.");
  }
}

/** @param {string} id */
function part(id) {
  const text = document.getElementById(id)?.textContent;
  if (!text) throw problem("damaged", `the page lacks its part "${id}"`, "Copy teasel.html again.");
  return text;
}

async function compile() {
  const packed = atob(part("teasel-module"));
  const bytes = new Uint8Array(packed.length);
  for (let i = 0; i < packed.length; i += 1) bytes[i] = packed.charCodeAt(i);
  const unpacked = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("gzip"));
  return WebAssembly.compile(await new Response(unpacked).arrayBuffer());
}

export class Bridge {
  /** The program's version. */
  version = "";
  /** @type {Worker | null} */
  #worker = null;
  #compiled;
  #last = 0;
  /** @type {Map<number, Waiting>} */
  #waiting = new Map();
  /** @type {Map<string, Set<(news: any) => void>>} */
  #listeners = new Map();
  /** How to come back after a death. @type {{ open: (() => Promise<Summary>) | null, recipe: Recipe | null, watched: string[] }} */
  #kept = { open: null, recipe: null, watched: [] };
  /** Resolves when the worker listens. @type {Promise<void>} */
  started;

  /** @param {WebAssembly.Module} compiled */
  constructor(compiled) {
    this.#compiled = compiled;
    this.started = this.#hire();
  }

  /**
   * Listens to an event; the function given back ends that.
   * @template {keyof Events} K
   * @param {K} name
   * @param {(news: Events[K]) => void} listener
   */
  on(name, listener) {
    const all = this.#listeners.get(name) ?? new Set();
    this.#listeners.set(name, all.add(listener));
    return () => void all.delete(listener);
  }

  /**
   * Opens a recording, of one file or several, with its side files, in place of what is open. Rejects with a Problem; where the header already fails, what was open
   * stays open, and otherwise `holds` says that it did not.
   * @param {File[]} files
   * @param {{ salvage?: boolean, given?: Given }} [options] `given` is what the file does not carry
   * @returns {Promise<Summary>}
   */
  async open(files, { salvage = false, given = {} } = {}) {
    const { recordings, sides } = await sorted(files);
    if (!recordings.length) throw problem("empty", "no recording was given", "Choose a recording, with the side files that lie beside it.");
    const small = await Promise.all(sides.map(whole));
    return this.#opened(() => this.open(files, { salvage, given }), this.#ask("open", recordings, small, salvage, given));
  }

  /** @param {string} which @returns {Promise<Summary>} */
  async openDemo(which) {
    return this.#opened(() => this.openDemo(which), this.#ask("openDemo", which));
  }

  /**
   * What comes back after a death: the recording that was opened, or the one that the worker died of.
   * @param {() => Promise<Summary>} open
   * @param {Promise<Summary>} asked
   */
  async #opened(open, asked) {
    const keep = () => void (this.#kept = { ...this.#kept, open, recipe: null });
    try {
      const summary = await asked;
      keep();
      return summary;
    } catch (thrown) {
      if (/** @type {Problem} */ (thrown).kind === "died") keep();
      throw thrown;
    }
  }

  /** Whether the worker holds a whole recording. @returns {Promise<boolean>} */
  holds() {
    return this.#ask("holds");
  }

  /** The contrast that the recording suggests, or null. @returns {Promise<{ recipe: Recipe, why: string } | null>} */
  propose() {
    return this.#ask("propose");
  }

  /**
   * Takes the choices and computes what they make stale. Resolves with the generation that sheets of these choices carry, or
   * with null when newer choices overtook them; rejects with a Problem, and then the choices before still hold.
   * @param {Recipe} recipe
   * @returns {Promise<number | null>}
   */
  async setRecipe(recipe) {
    const generation = await this.#ask("setRecipe", recipe);
    if (generation !== null) this.#kept.recipe = recipe;
    return generation;
  }

  /** Stops the work at hand; what is known stays, a recording half read is dropped. */
  stop() {
    return this.#ask("stop");
  }

  /** Goes on after a stop. */
  resume() {
    return this.#ask("resume");
  }

  /** These figures come along with every sheet from now on. @param {string[]} names */
  watch(names) {
    this.#kept.watched = names;
    return this.#ask("watch", names);
  }

  /** @param {string} name @returns {Promise<Figure | null>} */
  figure(name) {
    return this.#ask("figure", name);
  }

  /** @param {number} fromS @param {number} seconds @param {number[]} channels indexes @returns {Promise<Figure>} */
  traces(fromS, seconds, channels) {
    return this.#ask("traces", fromS, seconds, channels);
  }

  /** The lines that can be drawn now. @returns {Promise<import("./types").Tracks>} */
  tracks() {
    return this.#ask("tracks");
  }

  /**
   * For each of some lines the smallest and the largest value of `count` bins of `size` samples from bin `first` on.
   * @param {import("./types").LineKind} kind @param {number[]} lines indexes @param {number} size a power of four @param {number} first @param {number} count
   * @returns {Promise<Float32Array>}
   */
  bins(kind, lines, size, first, count) {
    return this.#ask("bins", kind, lines, size, first, count);
  }

  /**
   * The bytes of one of the files to take away.
   * @param {string} kind
   * @param {NamedBytes[]} [extras]
   * @returns {Promise<Uint8Array<ArrayBuffer>>}
   */
  takeaway(kind, extras = []) {
    return this.#ask("takeaway", kind, extras);
  }

  /** Bytes that the worker's module has taken; they are never given back. @returns {Promise<number>} */
  memory() {
    return this.#ask("memory");
  }

  /** After a death: another worker, the same recording, the choices that held. @returns {Promise<Summary | null>} */
  async revive() {
    const { open, recipe, watched } = this.#kept;
    this.started = this.#hire();
    await this.started;
    await this.watch(watched);
    const summary = open ? await open() : null;
    if (summary && recipe) await this.setRecipe(recipe);
    return summary;
  }

  /** @param {HTMLCanvasElement} canvas @param {Figure} figure @param {{ width: number, height: number, scale: number, dark: boolean }} how */
  draw(canvas, figure, { width, height, scale, dark }) {
    module.drawFigure(canvas, figure, width, height, scale, dark);
  }
  /** @param {Figure} figure @param {number} width @returns {number} */
  figureHeight(figure, width) {
    return module.figureHeight(figure, width);
  }
  /** @param {Figure} figure @param {number} width @param {number} height @returns {PlotBox | null} */
  plotBox(figure, width, height) {
    return module.plotBox(figure, width, height);
  }
  /** @param {Figure} figure @param {number} width @param {number} height @returns {string} */
  svg(figure, width, height) {
    return module.figureSvg(figure, width, height);
  }
  /** @param {Figure} figure @returns {Table} */
  table(figure) {
    return module.figureTable(figure);
  }
  /** Places of the names in the order in which files of one recording are joined. @param {string[]} names @returns {number[]} */
  naturalOrder(names) {
    return [...module.naturalOrder(names)];
  }
  /**
   * What a table of events would give; throws a Problem where it cannot be read.
   * @param {string} name @param {Uint8Array} bytes @param {import("./types").EventColumns | null} columns
   * @param {number} rateHz @param {number} spanS @returns {import("./types").EventsPreview}
   */
  eventsPreview(name, bytes, columns, rateHz, spanS) {
    return module.eventsPreview(name, bytes, columns, rateHz, spanS);
  }
  /** Whether a table is about the recording rather than one itself. @param {string} name @param {Uint8Array} bytes @param {string[]} channels @returns {boolean} */
  isSideTable(name, bytes, channels) {
    return module.isSideTable(name, bytes, channels);
  }
  /** @param {string} text @returns {Recipe} */
  parseRecipe(text) {
    return module.parseRecipe(text);
  }
  /** @param {Recipe} recipe @returns {string} */
  recipeText(recipe) {
    return module.recipeText(recipe);
  }
  /** @param {Recipe} recipe @param {boolean} withNames @returns {string} */
  linkEncode(recipe, withNames) {
    return module.linkEncode(recipe, withNames);
  }
  /** @param {string} text @returns {{ recipe: Recipe, events: [number, number] | null, without: string[] }} */
  linkDecode(text) {
    return module.linkDecode(text);
  }
  /** Fills a link's events in from a recording. @param {string} text @param {Record<string, number>} events label → count @returns {{ recipe: Recipe, notes: string[] }} */
  linkComplete(text, events) {
    return module.linkComplete(text, events);
  }

  /** Starts a worker and waits until it listens. @returns {Promise<void>} */
  #hire() {
    const address = URL.createObjectURL(new Blob([part("teasel-worker")], { type: "text/javascript" }));
    const worker = new Worker(address);
    this.#worker = worker;
    return new Promise((done, failed) => {
      worker.onmessage = ({ data }) => {
        if (data.event !== "started") return this.#heard(data, failed);
        URL.revokeObjectURL(address);
        done();
      };
      worker.onerror = (event) => {
        event.preventDefault();
        failed(this.#died({ words: event.message || "the worker could not start", memory: 0 }));
      };
      worker.postMessage({ module: this.#compiled });
    });
  }

  /** @param {string} call @param {any[]} args @returns {Promise<any>} */
  #ask(call, ...args) {
    const worker = this.#worker;
    if (!worker) return Promise.reject(problem("died", "the part that computes has ended", "Start it again."));
    this.#last += 1;
    const id = this.#last;
    return new Promise((done, failed) => {
      this.#waiting.set(id, { done, failed });
      worker.postMessage({ id, call, with: args });
    });
  }

  /** @param {any} data @param {(problem: Problem) => void} failed */
  #heard(data, failed) {
    if (data.event === "died") return failed(this.#died(data));
    if (data.event === "progress" && data.stage === "reading" && data.done === data.of) performance.mark("teasel:read");
    if (data.event) return this.#say(data.event, data.problem ?? data);
    const waiting = this.#waiting.get(data.id);
    this.#waiting.delete(data.id);
    if (data.problem) waiting?.failed(data.problem);
    else waiting?.done(data.value);
  }

  /** @param {{ words: string, memory: number }} news */
  #died({ words, memory }) {
    const why = problem("died", `the part that computes ended: ${words}`, "Start it again; the recording and the choices are kept.");
    this.#worker?.terminate();
    this.#worker = null;
    for (const { failed } of this.#waiting.values()) failed(why);
    this.#waiting.clear();
    this.#say("died", { words, memory });
    return why;
  }

  /** @param {string} name @param {unknown} news */
  #say(name, news) {
    for (const listener of this.#listeners.get(name) ?? []) listener(news);
  }
}

/** @param {File} file @returns {Promise<NamedBytes>} */
async function whole(file) {
  if (file.size > SIDE_BYTES) {
    throw {
      ...problem("too-large", "this side file is too large", "Choose the recording and its small side files."),
      file: file.name, expected: `at most ${SIDE_BYTES} bytes`, found: `${file.size} bytes`,
    };
  }
  return { name: file.name, bytes: new Uint8Array(await file.arrayBuffer()) };
}
