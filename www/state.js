/** The one store of the page: what was opened, the choices, and the newest sheet. */

/** @typedef {import("./types").State} State */
/** @typedef {(state: State, before: State) => void} Listener */

/** @type {State} */
const EMPTY = {
  phase: "empty", source: null, summary: null, recipe: null, why: "", sheet: null, readings: [], figures: [], drawn: {},
  generation: 0, stale: false, progress: null, taken: 0,
};

/** @type {State} */
let state = EMPTY;
/** @type {Set<Listener>} */
const listeners = new Set();

/** @returns {State} */
export function now() {
  return state;
}

/** @param {Partial<State>} patch */
export function put(patch) {
  const before = state;
  state = { ...state, ...patch };
  for (const listener of listeners) listener(state, before);
}

/** Whether a sheet holds a result: the fit brings the compression with it, whichever ends it found. @param {import("./types").Sheet | null | undefined} sheet */
export function fitted(sheet) {
  return Boolean(sheet?.compression);
}

/** The first component of the end that leads, or undefined. @param {import("./types").Sheet | null | undefined} sheet */
export function leadingComponent(sheet) {
  return sheet ? sheet[sheet.leading ?? "stronger"][0] : undefined;
}

/** Forgets the recording and everything made from it. */
export function forget() {
  put({ ...EMPTY });
}

/** Calls `listener` after every change. @param {Listener} listener */
export function follow(listener) {
  listeners.add(listener);
}
