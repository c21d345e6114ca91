/** Recording: the whole of it, and ten seconds under a frame that can be moved. */
import { find, make, makeSvg } from "./kit.js";
import { keyed } from "./edges.js";
import { figureSlot } from "./figure.js";
import { clock } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").PlotBox} PlotBox */

const SECONDS = 10;
const FEW = 8;

let from = 0;
let every = false;
/** @type {PlotBox | null} */
let above = null;
/** @type {PlotBox | null} */
let below = null;

/** @param {App} app */
export function mountRecording(app) {
  const body = find("#recording.step .body");
  const frame = make("div", { class: "frame", role: "slider", tabindex: 0, "aria-label": "Start of the ten seconds shown", "aria-orientation": "horizontal" });
  const leads = makeSvg("svg", { class: "leads", preserveAspectRatio: "none", width: "100%", height: 22, "aria-hidden": "true" });
  const overview = figureSlot(app, "overview", {
    section: "recording", title: "The whole recording, and ten seconds of it", hint: "drag the frame to look elsewhere", label: "The whole recording as mean size over time, with its events",
    placed: (box) => ((above = box), lay(frame, leads)),
  });
  const traces = figureSlot(app, "traces", {
    section: "recording", label: "Ten seconds of the recording, one line a channel",
    load: () => app.bridge.traces(from, Math.min(SECONDS, span()), chosen()),
    placed: (box) => ((below = box), lay(frame, leads)),
  });
  overview.place.append(frame);
  overview.root.append(leads);
  const all = make("input", { type: "checkbox", change: () => ((every = all.checked), traces.refresh()) });
  const which = make("div", { class: "choice" }, make("label", { class: "tick" }, all, make("span", { class: "all-word" })));
  body.append(overview.root, traces.root, which);

  const move = (/** @type {number} */ to) => {
    const next = Math.round(Math.max(0, Math.min(span() - SECONDS, to)) * 100) / 100;
    if (next === from) return;
    from = Math.max(0, next);
    lay(frame, leads);
    traces.refresh();
  };
  frame.addEventListener("keydown", (event) => {
    const next = keyed(event, from, 1, [0, Math.max(0, span() - SECONDS)]);
    if (next === null) return;
    event.preventDefault();
    move(next);
  });
  dragged(frame, overview.place, move);
  follow((state, before) => {
    if (state.summary === before.summary || !state.summary) return;
    from = 0;
    const many = state.summary.channels.length;
    which.hidden = many <= FEW * 2;
    find(".all-word", which).textContent = `show all ${many} channels, not only ${FEW}`;
  });
}

/** Seconds from the start of the clock to the end of the last stretch. */
function span() {
  const recording = now().summary?.recording;
  const last = recording?.stretches.at(-1);
  return recording && last ? last.onset_s + last.count / recording.rate_hz : SECONDS;
}

/** Channels to draw: all, or a few spread over the list. @returns {number[]} */
function chosen() {
  const many = now().summary?.channels.length ?? 0;
  const all = Array.from({ length: many }, (_, i) => i);
  if (every || many <= FEW * 2) return all;
  return Array.from({ length: FEW }, (_, i) => Math.round((i * (many - 1)) / (FEW - 1)));
}

/** Seconds to pixels in the overview. @param {number} t */
function across(t) {
  return above ? above.left + ((t - above.x0) / (above.x1 - above.x0)) * (above.right - above.left) : 0;
}

/** @param {HTMLElement} frame @param {SVGSVGElement} leads */
function lay(frame, leads) {
  const end = Math.min(span(), from + SECONDS);
  frame.hidden = !above;
  frame.setAttribute("aria-valuemin", "0");
  frame.setAttribute("aria-valuemax", String(Math.max(0, span() - SECONDS)));
  frame.setAttribute("aria-valuenow", String(from));
  frame.setAttribute("aria-valuetext", `${clock(from)} to ${clock(end)}`);
  if (!above) return;
  const [left, right] = [across(from), across(end)];
  frame.style.left = `${left}px`;
  frame.style.width = `${Math.max(6, right - left)}px`;
  frame.style.top = `${above.top - 2}px`;
  frame.style.bottom = "0";
  if (below) leads.replaceChildren(makeSvg("path", { d: `M${left} 0L${below.left} 22M${right} 0L${below.right} 22` }));
}

/**
 * A drag on the frame moves it; a press beside it brings it there.
 * @param {HTMLElement} frame
 * @param {HTMLElement} place
 * @param {(to: number) => void} move
 */
function dragged(frame, place, move) {
  place.addEventListener("pointerdown", (down) => {
    const box = above;
    if (!box || down.button !== 0) return;
    const toSeconds = (/** @type {PointerEvent} */ at) => box.x0 + ((at.clientX - place.getBoundingClientRect().left - box.left) / (box.right - box.left)) * (box.x1 - box.x0);
    const hold = down.target === frame ? toSeconds(down) - from : SECONDS / 2;
    if (down.target !== frame && down.target !== place.querySelector("canvas")) return;
    down.preventDefault();
    frame.focus({ preventScroll: true });
    frame.setPointerCapture(down.pointerId);
    const drag = (/** @type {PointerEvent} */ at) => move(toSeconds(at) - hold);
    drag(down);
    const done = () => {
      frame.removeEventListener("pointermove", drag);
      frame.removeEventListener("lostpointercapture", done);
    };
    frame.addEventListener("pointermove", drag);
    frame.addEventListener("lostpointercapture", done);
  });
}
