/**
 * The worker: owns the recording, computes in bites, and listens between them.
 *
 * In:  `{module}` once, then `{id, call, with}`. Out: `{id, value}` or `{id, problem}` for each call, and `{event, …}`.
 * Work is cut into bites of at most 40 ms; after each the worker turns to its messages, so a newer recipe, another recording or a
 * stop is heard before the next bite.
 */
import init, { Session } from "teasel-module";

/** @typedef {{ stage: string, done: number, of: number, news: boolean, finished: boolean }} Told */
/** @typedef {{ id: number, call: string, with: any[] }} Call */

const BITE_MS = 40;
/** While the page talks to us, and just after it was shown something, it should not wait long for an answer. */
const SHORT_BITE_MS = 8;
const TALKING_MS = 150;
/** At most so often is the page told how far a stage is. */
const TELL_MS = 60;

/** @type {WebAssembly.Memory} */
let memory;
/** @type {Session | null} */
let session = null;
/** @type {"idle" | "reading" | "computing"} */
let phase = "idle";
/** The call that waits for the end of reading. @type {number | null} */
let opening = null;
/** The newest recipe that is not in force yet. @type {{ id: number, recipe: unknown } | null} */
let waiting = null;
/** Counts the recipes that came into force. */
let generation = 0;
/** Figures that go along with each sheet. @type {string[]} */
let watched = [];
let scheduled = false;
let untold = false;
let [heardAt, toldAt, shownAt] = [-Infinity, -Infinity, -Infinity];
let shownStage = "";
let toldStage = "";

const turn = new MessageChannel();
turn.port1.onmessage = bite;

onmessage = async ({ data }) => {
  try {
    if (!data.module) return hear(data);
    memory = (await init({ module_or_path: data.module })).memory;
    postMessage({ event: "started" });
  } catch (error) {
    die(error);
  }
};

/** @param {Call} call */
function hear({ id, call, with: args }) {
  heardAt = performance.now();
  const act = calls[call];
  try {
    const value = act ? act(id, ...args) : unknown(call);
    if (value !== LATER) answer(id, value);
  } catch (error) {
    refuse(id, error);
  }
}

/** Marks a call that is answered when its work is done. */
const LATER = Symbol("later");

/** @type {Record<string, (id: number, ...args: any[]) => unknown>} */
const calls = {
  open(id, /** @type {File[]} */ files, /** @type {{ name: string, bytes: Uint8Array }[]} */ sides, /** @type {boolean} */ salvage, /** @type {object} */ given) {
    const next = new Session();
    try {
      next.begin(files.map((file) => ({ name: file.name, bytes: file.size, read: reader(file) })), sides, salvage, given);
    } catch (error) {
      // What was open stays open.
      next.free();
      throw error;
    }
    forget();
    session = next;
    opening = id;
    work("reading");
    return LATER;
  },
  openDemo(_id, /** @type {string} */ which) {
    forget();
    session = new Session();
    session.beginDemo(which);
    return session.summary();
  },
  setRecipe(id, /** @type {unknown} */ recipe) {
    if (phase === "reading") throw notYet();
    if (waiting) answer(waiting.id, null);
    waiting = { id, recipe };
    work("computing");
    return LATER;
  },
  stop() {
    if (phase === "reading") forget();
    overtake();
    phase = "idle";
    return true;
  },
  resume() {
    if (session?.sheet()) work("computing");
    return true;
  },
  holds: () => session !== null && phase !== "reading",
  watch(_id, /** @type {string[]} */ names) {
    watched = names;
    return true;
  },
  propose: () => open().propose(),
  sheet: () => news(),
  figure: (_id, /** @type {string} */ name) => open().figure(name),
  traces: (_id, /** @type {number} */ from, /** @type {number} */ seconds, /** @type {number[]} */ channels) =>
    open().traces(from, seconds, new Uint32Array(channels)),
  tracks: () => open().tracks(),
  bins: (_id, /** @type {string} */ kind, /** @type {number[]} */ lines, /** @type {number} */ size, /** @type {number} */ first, /** @type {number} */ count) =>
    open().bins(kind, new Uint32Array(lines), size, first, count),
  takeaway: (_id, /** @type {string} */ kind, /** @type {unknown} */ extras) => open().takeaway(kind, extras),
  memory: () => memory.buffer.byteLength,
};

function open() {
  return session ?? (session = new Session());
}

/** @param {string} call @returns {never} */
function unknown(call) {
  throw new Error(`the worker knows no call ${call}`);
}

/**
 * A file as bytes that can be read anywhere, without waiting.
 * @param {File} file
 */
function reader(file) {
  const slices = new FileReaderSync();
  return (/** @type {number} */ offset, /** @type {number} */ length) =>
    new Uint8Array(slices.readAsArrayBuffer(file.slice(offset, offset + length)));
}

/** Drops the recording; who still waits for it is told that it was stopped. */
function forget() {
  const left = opening;
  opening = null;
  overtake();
  phase = "idle";
  session?.free();
  session = null;
  if (left !== null) postMessage({ id: left, problem: stopped() });
}

/** Answers a recipe that will not come into force. */
function overtake() {
  if (waiting) answer(waiting.id, null);
  waiting = null;
}

/** @param {"reading" | "computing"} kind */
function work(kind) {
  phase = kind;
  if (scheduled) return;
  scheduled = true;
  turn.port2.postMessage(null);
}

function bite() {
  scheduled = false;
  const kind = phase;
  if (kind === "idle") return;
  try {
    if (waiting) adopt(waiting);
    if (phase === "idle") return;
    const told = steps();
    tell(told);
    if (!told.finished) return work(kind);
    phase = "idle";
    if (kind === "reading") readingDone();
    else postMessage({ event: "finished", generation });
  } catch (error) {
    failed(kind, error);
  }
}

/** @param {{ id: number, recipe: unknown }} newest */
function adopt({ id, recipe }) {
  waiting = null;
  try {
    open().setRecipe(recipe);
  } catch (error) {
    phase = "idle";
    return refuse(id, error);
  }
  generation += 1;
  shownStage = "";
  shownAt = -Infinity;
  answer(id, generation);
}

/** @returns {Told} */
function steps() {
  const started = performance.now();
  const limit = started - Math.max(heardAt, shownAt) < TALKING_MS ? SHORT_BITE_MS : BITE_MS;
  let /** @type {Told} */ told;
  do {
    told = open().step();
    untold ||= told.news;
  } while (!told.finished && !told.news && performance.now() - started < limit);
  return told;
}

/** @param {Told} told */
function tell({ stage, done, of, finished }) {
  const at = performance.now();
  if (untold && (finished || stage !== shownStage || at - shownAt >= TELL_MS)) {
    untold = false;
    shownStage = stage;
    postMessage({ event: "sheet", finished, ...news() });
    shownAt = performance.now();
  }
  if (finished || stage !== toldStage || at - toldAt >= TELL_MS) {
    toldAt = at;
    toldStage = stage;
    postMessage({ event: "progress", stage, done, of, generation });
  }
}

function news() {
  const now = open();
  const figures = now.figureNames();
  const drawn = Object.fromEntries(watched.filter((name) => figures.includes(name)).map((name) => [name, now.figure(name)]));
  return { sheet: now.sheet(), readings: now.readings(), figures, drawn, generation };
}

function readingDone() {
  const id = /** @type {number} */ (opening);
  opening = null;
  answer(id, open().summary());
}

/** @param {"reading" | "computing"} kind @param {unknown} error */
function failed(kind, error) {
  phase = "idle";
  if (kind === "reading" && opening !== null) {
    const id = opening;
    opening = null;
    refuse(id, error);
    if (isProblem(error)) forget();
    return;
  }
  if (isProblem(error)) postMessage({ event: "problem", problem: error, generation });
  else die(error);
}

/** @param {number} id @param {unknown} value */
function answer(id, value) {
  postMessage({ id, value }, ArrayBuffer.isView(value) ? [value.buffer] : []);
}

/** @param {number} id @param {unknown} error */
function refuse(id, error) {
  if (isProblem(error)) postMessage({ id, problem: error });
  else die(error);
}

/** @param {unknown} error */
function isProblem(error) {
  return typeof error === "object" && error !== null && "kind" in error && "advice" in error;
}

/** @param {string} kind @param {string} what @param {string} advice */
function problem(kind, what, advice) {
  return { kind, file: null, what, place: null, expected: null, found: null, advice, salvage: null, asks: [] };
}
const stopped = () => problem("stopped", "reading was stopped", "Open the recording again to go on.");
const notYet = () => problem("contrast", "the recording is still being read", "Wait until it is read.");

/** What is left after a fault cannot be trusted: says so and ends. @param {unknown} error */
function die(error) {
  const words = /** @type {any} */ (globalThis).teaselLastWords ?? String(error);
  postMessage({ event: "died", words, memory: memory?.buffer.byteLength ?? 0 });
  close();
}
