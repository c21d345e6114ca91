/** Moving about in the traces: mouse, wheel, touch and keyboard. */
import { look, span, start, viewNow, zoom } from "./trace-view.js";

/**
 * @typedef {object} Hands
 * @property {() => { left: number, right: number }} plot edges of the plot in CSS px from the left of the place
 * @property {() => number} lines how many lines there are
 * @property {() => import("./marks.js").MarkKind | null} marking what a drag marks, or null where it moves the view
 * @property {(from: number, to: number, done: boolean) => void} drag a span that is being marked
 * @property {(t: number) => void} tap a press without a drag
 * @property {(kind: import("./marks.js").MarkKind) => void} mark a mark by the keyboard
 * @property {() => void} remove removes the chosen mark
 */

/** A press that moves less than this is no drag. */
const STILL_PX = 4;
const NOTCH = 1.0015;

/** @param {HTMLElement} place @param {Hands} hands */
export function mountMoves(place, hands) {
  place.addEventListener("wheel", (event) => wheel(event, place, hands), { passive: false });
  place.addEventListener("keydown", (event) => event.target === place && keys(event, hands));
  pointers(place, hands);
}

/** @param {HTMLElement} place @param {Hands} hands @param {number} clientX @returns {number} 0 at the left edge of the plot, 1 at the right */
function share(place, hands, clientX) {
  const { left, right } = hands.plot();
  return (clientX - place.getBoundingClientRect().left - left) / (right - left);
}

/** Without a modifier the page scrolls, but for a sideways wheel. @param {WheelEvent} event @param {HTMLElement} place @param {Hands} hands */
function wheel(event, place, hands) {
  const unit = event.deltaMode === 1 ? 16 : event.deltaMode === 2 ? 400 : 1;
  const { from, seconds } = viewNow();
  const { left, right } = hands.plot();
  const sideways = event.shiftKey && !event.deltaX ? event.deltaY : event.deltaX;
  if (event.ctrlKey || event.metaKey) zoom(NOTCH ** (event.deltaY * unit), Math.max(0, Math.min(1, share(place, hands, event.clientX))));
  else if (event.shiftKey || Math.abs(event.deltaX) > Math.abs(event.deltaY)) look({ from: from + (sideways * unit * seconds) / (right - left) });
  else return;
  event.preventDefault();
}

/** @param {KeyboardEvent} event @param {Hands} hands */
function keys(event, hands) {
  if (event.ctrlKey || event.metaKey || event.altKey) return;
  const { from, seconds, row, rows, gain } = viewNow();
  const [far, last] = [event.shiftKey ? seconds : seconds / 10, Math.max(0, hands.lines() - rows)];
  const rowAt = (/** @type {number} */ to) => look({ row: Math.max(0, Math.min(last, to)) });
  /** @type {Record<string, () => void>} */
  const acts = {
    ArrowLeft: () => look({ from: from - far }),
    ArrowRight: () => look({ from: from + far }),
    ArrowUp: () => (event.shiftKey ? look({ gain: gain * 1.25 }) : rowAt(row - 1)),
    ArrowDown: () => (event.shiftKey ? look({ gain: gain / 1.25 }) : rowAt(row + 1)),
    PageUp: () => rowAt(row - rows),
    PageDown: () => rowAt(row + rows),
    Home: () => look({ from: start() }),
    End: () => look({ from: span() - seconds }),
    "+": () => zoom(1 / 1.5),
    "=": () => zoom(1 / 1.5),
    "-": () => zoom(1.5),
    "−": () => zoom(1.5),
    s: () => hands.mark("signal"),
    r: () => hands.mark("reference"),
    n: () => hands.mark("not_used"),
    Delete: () => hands.remove(),
    Backspace: () => hands.remove(),
  };
  const act = acts[event.key.length === 1 ? event.key.toLowerCase() : event.key];
  if (!act) return;
  event.preventDefault();
  act();
}

/** One pointer pans or marks, two zoom. @param {HTMLElement} place @param {Hands} hands */
function pointers(place, hands) {
  /** @type {Map<number, number>} */
  const held = new Map();
  /** What was true when the gesture began. @type {{ x: number, from: number, seconds: number, apart: number, kind: import("./marks.js").MarkKind | null, moved: boolean } | null} */
  let began = null;
  const begin = () => {
    const xs = [...held.values()];
    const x = xs.reduce((sum, one) => sum + one, 0) / xs.length;
    const { from, seconds } = viewNow();
    began = { x, from, seconds, apart: Math.abs(Number(xs[0]) - Number(xs[1] ?? xs[0])), kind: held.size === 1 ? hands.marking() : null, moved: held.size > 1 };
  };
  const timeAt = (/** @type {number} */ x) => {
    const { from, seconds } = viewNow();
    return Math.max(from, Math.min(from + seconds, from + share(place, hands, x) * seconds));
  };
  place.addEventListener("pointerdown", (event) => {
    if (event.button !== 0 || !(event.target instanceof HTMLElement) || event.target.closest(".edge")) return;
    const at = share(place, hands, event.clientX);
    if (at < 0 || at > 1 || held.size > 1) return;
    if (event.pointerType === "mouse") event.preventDefault();
    place.focus({ preventScroll: true });
    place.setPointerCapture(event.pointerId);
    held.set(event.pointerId, event.clientX);
    begin();
  });
  place.addEventListener("pointermove", (event) => {
    if (!held.has(event.pointerId) || !began) return;
    held.set(event.pointerId, event.clientX);
    const xs = [...held.values()];
    const x = xs.reduce((sum, one) => sum + one, 0) / xs.length;
    if (!began.moved && Math.abs(x - began.x) < STILL_PX) return;
    began.moved = true;
    if (began.kind) return hands.drag(timeAt(began.x), timeAt(x), false);
    const { left, right } = hands.plot();
    const apart = Math.abs(Number(xs[0]) - Number(xs[1] ?? xs[0]));
    const seconds = held.size > 1 && began.apart > 10 && apart > 10 ? (began.seconds * began.apart) / apart : began.seconds;
    // The time under the fingers stays under them.
    const under = began.from + share(place, hands, began.x) * began.seconds;
    look({ seconds, from: under - ((x - place.getBoundingClientRect().left - left) / (right - left)) * seconds });
  });
  const end = (/** @type {PointerEvent} */ event) => {
    if (!held.has(event.pointerId)) return;
    const x = Number(held.get(event.pointerId));
    held.delete(event.pointerId);
    const gesture = began;
    began = null;
    if (held.size) return begin();
    if (!gesture) return;
    const left = event.type === "pointercancel";
    if (gesture.kind && gesture.moved) hands.drag(timeAt(gesture.x), left ? timeAt(gesture.x) : timeAt(x), true);
    else if (!gesture.moved && !left) hands.tap(timeAt(x));
  };
  place.addEventListener("pointerup", end);
  place.addEventListener("pointercancel", end);
}
