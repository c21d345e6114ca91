/** Recording: the whole of it with a frame over what is looked at, the traces under the frame, and marks. */
import { find, make, makeSvg } from "./kit.js";
import { keyed } from "./edges.js";
import { figureSlot } from "./figure.js";
import { addMark, choose, chosenMark, followMarks, forgetMarks, marksNow, removeMark } from "./marks.js";
import { markMiddle, mountMarks, onSample, sample } from "./marks-table.js";
import { clock } from "./numbers.js";
import { follow } from "./state.js";
import { markingNow, traceChoices } from "./trace-choices.js";
import { LEFT, RIGHT } from "./trace-ground.js";
import { mountMoves } from "./trace-moves.js";
import { followView, look, span, start, viewNow } from "./trace-view.js";
import { above, mountTraces } from "./traces.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").PlotBox} PlotBox */

/** What can be done by keys and fingers, as it is said beside the traces. */
const KEYS = [
  ["← →", "a tenth of the view (with Shift: all of it); Home and End: first and last"],
  ["↑ ↓", "one channel up or down (with Shift: taller or flatter lines); Page Up and Page Down: a screen of channels"],
  ["+ −", "closer, farther"],
  ["S, R, N", "mark the middle as signal, reference, not to be used; then the arrow keys move its edge (with Alt by one sample), Tab goes to the other edge, Delete removes the mark"],
  ["Ctrl Z", "undo; with Shift: redo"],
  ["Mouse", "drag to move; Ctrl and wheel: closer, farther; Shift and wheel: to the side"],
  ["Touch", "one finger moves, two fingers zoom; up and down scrolls the page"],
];

/** @type {PlotBox | null} */
let overviewBox = null;

/** @param {App} app */
export function mountRecording(app) {
  const body = find("#recording.step .body");
  const frame = make("div", { class: "frame", role: "slider", tabindex: 0, "aria-label": "Start of what the traces show", "aria-orientation": "horizontal" });
  const leads = makeSvg("svg", { class: "leads", preserveAspectRatio: "none", width: "100%", height: 22, "aria-hidden": "true" });
  const strip = makeSvg("svg", { class: "strip", width: "100%", height: "100%", "aria-hidden": "true" });
  const overview = figureSlot(app, "overview", {
    section: "recording", title: "The whole recording", hint: "drag the frame to look elsewhere", label: "The whole recording as mean size over time, with its events",
    placed: (box) => {
      overviewBox = box;
      redraw();
    },
  });
  overview.place.append(strip, frame);
  overview.root.append(leads);
  const traces = mountTraces(app);
  const marks = mountMarks(app, traces.place);
  const keys = make("details", { class: "more keys", id: "traces-keys" }, make("summary", {}, "Keys and gestures"), make("dl", {}, ...KEYS.flatMap(([key, what]) => [make("dt", {}, key ?? ""), make("dd", {}, what ?? "")])));
  traces.root.querySelector(".caption")?.after(traceChoices(traces.draw));
  body.append(overview.root, traces.root, marks, keys);

  const redraw = () => {
    lay(frame, leads, traces.place);
    layStrip(strip);
  };
  followView(redraw);
  followMarks(redraw);
  new ResizeObserver(redraw).observe(traces.place);
  frame.addEventListener("keydown", (event) => {
    const { from, seconds } = viewNow();
    const next = keyed(event, from, seconds / 10, [start(), span() - seconds]);
    if (next === null) return;
    event.preventDefault();
    look({ from: next });
  });
  dragged(frame, overview.place);
  mountMoves(traces.place, {
    plot: () => ({ left: LEFT, right: traces.place.clientWidth - RIGHT }),
    lines: () => above()?.track.lines.length ?? 0,
    marking: markingNow,
    drag: (a, b, done) => band(app, traces.place, a, b, done),
    tap: (t) => choose(marksNow().reverse().find(({ from, to }) => t >= from && t <= to) ?? null),
    mark: (kind) => {
      markMiddle(app, kind);
      /** @type {HTMLElement | null} */ (traces.place.querySelector('.edge[data-end="from"]'))?.focus({ preventScroll: true });
    },
    remove: () => {
      const mark = chosenMark();
      if (mark) removeMark(app, mark);
    },
  });
  follow((state, before) => {
    if (state.summary !== before.summary) forgetMarks();
    if (state.recipe !== before.recipe) layStrip(strip);
  });
}

/** The span that a drag is marking. @param {App} app @param {HTMLElement} place @param {number} a @param {number} b @param {boolean} done */
function band(app, place, a, b, done) {
  const kind = markingNow();
  const [from, to] = [onSample(Math.min(a, b)), onSample(Math.max(a, b))];
  let shade = place.querySelector(".shade");
  if (!shade) place.append((shade = make("div", { class: "shade" })));
  const { from: left, seconds } = viewNow();
  const plot = place.clientWidth - LEFT - RIGHT;
  Object.assign(/** @type {HTMLElement} */ (shade).style, { left: `${LEFT + ((from - left) / seconds) * plot}px`, width: `${((to - from) / seconds) * plot}px` });
  if (!done) return;
  shade.remove();
  if (kind && to - from >= 2 * sample()) addMark(app, kind, from, to);
}

/** Seconds to pixels in the overview. @param {number} t */
function across(t) {
  const box = overviewBox;
  return box ? box.left + ((t - box.x0) / (box.x1 - box.x0)) * (box.right - box.left) : 0;
}

/** @param {HTMLElement} frame @param {SVGSVGElement} leads @param {HTMLElement} place */
function lay(frame, leads, place) {
  const { from, seconds } = viewNow();
  const end = from + seconds;
  frame.hidden = !overviewBox;
  frame.setAttribute("aria-valuemin", String(start()));
  frame.setAttribute("aria-valuemax", String(Math.max(0, span() - seconds)));
  frame.setAttribute("aria-valuenow", String(from));
  frame.setAttribute("aria-valuetext", `${clock(from)} to ${clock(end)}`);
  if (!overviewBox) return;
  const [left, right] = [across(from), across(end)];
  frame.style.left = `${left}px`;
  frame.style.width = `${Math.max(6, right - left)}px`;
  frame.style.top = `${overviewBox.top - 2}px`;
  frame.style.bottom = "0";
  leads.replaceChildren(makeSvg("path", { d: `M${left} 0L${LEFT} 22M${Math.max(left + 6, right)} 0L${place.clientWidth - RIGHT} 22` }));
}

/** The marks over the whole recording. @param {SVGSVGElement} strip */
function layStrip(strip) {
  const box = overviewBox;
  if (!box) return;
  strip.replaceChildren(...marksNow().map(({ kind, from, to }) => makeSvg("rect", { class: kind, x: across(from), width: Math.max(1.5, across(to) - across(from)), y: box.top, height: box.bottom - box.top })));
}

/** A drag on the frame moves it; a press beside it brings it there. @param {HTMLElement} frame @param {HTMLElement} place */
function dragged(frame, place) {
  place.addEventListener("pointerdown", (down) => {
    const box = overviewBox;
    if (!box || down.button !== 0) return;
    const toSeconds = (/** @type {PointerEvent} */ at) => box.x0 + ((at.clientX - place.getBoundingClientRect().left - box.left) / (box.right - box.left)) * (box.x1 - box.x0);
    const { from, seconds } = viewNow();
    const hold = down.target === frame ? toSeconds(down) - from : seconds / 2;
    if (down.target !== frame && down.target !== place.querySelector("canvas")) return;
    down.preventDefault();
    frame.focus({ preventScroll: true });
    frame.setPointerCapture(down.pointerId);
    const drag = (/** @type {PointerEvent} */ at) => look({ from: toSeconds(at) - hold });
    drag(down);
    const done = () => {
      frame.removeEventListener("pointermove", drag);
      frame.removeEventListener("lostpointercapture", done);
    };
    frame.addEventListener("pointermove", drag);
    frame.addEventListener("lostpointercapture", done);
  });
}
