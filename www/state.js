/** The one store of the page: what was opened, the choices, and the newest sheet. */

/** @typedef {import("./types").State} State */
/** @typedef {(state: State, before: State) => void} Listener */

/** @type {State} */
const EMPTY = {
  phase: "empty", source: null, summary: null, recipe: null, why: "", sheet: null, readings: [], figures: [], drawn: {},
  generation: 0, stale: false, stopped: false, finished: null, progress: null, taken: 0,
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

/** Calls `listener` after every change. @param {Listener} listener */
export function follow(listener) {
  listeners.add(listener);
}
