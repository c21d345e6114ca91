/** One question before a long computation: which event holds the activity of interest. */
import { find, make, makeSvg } from "./kit.js";
import { count, seconds, size } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */

/** Samples times channels below which everything is computed at once. */
const SMALL = 60e6;
/** Bytes a value while computing: the recording, its filtered copy, and one pass of work. */
const BYTES_A_VALUE = 4 * 3;

/** @param {import("./types").Summary} summary */
export function isSmall(summary) {
  return values(summary) < SMALL;
}

/** @param {import("./types").Summary} summary */
function values({ recording, channels }) {
  return recording.duration_s * recording.rate_hz * channels.length;
}

/** What computing takes. @param {import("./types").Summary} summary */
function need(summary) {
  const many = `${count(values(summary) / 1e6)} million values`;
  if (summary.part_bytes) return `${many}, more than the memory holds: they stay in the file, and only what the windows need is read again, up to ${size(summary.part_bytes)}. It can be stopped at any time.`;
  return `${many}: needs about ${size(values(summary) * BYTES_A_VALUE)} of memory. It can be stopped at any time.`;
}

/** @param {App} app @param {() => void} compute */
export function mountChoosing(app, compute) {
  const place = find("#choosing .body");
  follow((state, before) => {
    find("#choosing").hidden = state.phase !== "choosing" || !state.recipe;
    if (state.phase !== "choosing" || (state.recipe === before.recipe && state.phase === before.phase)) return;
    const { summary, recipe } = state;
    if (!summary || !recipe) return;
    const events = Object.entries(summary.recording.events).sort((a, b) => b[1] - a[1]).slice(0, 8);
    const windows = recipe.contrast.kind === "windows";
    const focused = document.activeElement?.getAttribute("data-event");
    place.replaceChildren(
      ...(windows ? [
        make("h3", {}, "Which event holds the activity of interest?"),
        make("div", { class: "events" }, ...events.map(([name, many]) => card(app, name, many, isSmall(summary) ? compute : null))),
      ] : []),
      make("p", { class: "need" },
        make("button", { type: "button", class: "button main", id: "compute", click: compute }, "Compute"),
        make("span", { class: "quiet" }, need(summary))),
    );
    for (const each of place.querySelectorAll("[data-event]")) if (each.getAttribute("data-event") === focused) /** @type {HTMLElement} */ (each).focus();
  });
}

/** @param {App} app @param {string} name @param {number} many @param {(() => void) | null} then what follows the choice, where it costs little */
function card(app, name, many, then) {
  const { recipe, summary } = now();
  const contrast = recipe?.contrast.kind === "windows" ? recipe.contrast : undefined;
  const onsets = summary?.recording.event_onsets_s[name] ?? [];
  const last = Math.max(1, ...Object.values(summary?.recording.event_onsets_s ?? {}).flatMap((list) => list.slice(-1)));
  const ticks = onsets.slice(0, 2000).map((t) => `M${(2 + (396 * t) / last).toFixed(1)} 6V19`).join("");
  const when = (/** @type {import("./types").EventWindow | undefined} */ w) => (w ? `${seconds(w.from_s)} to ${seconds(w.to_s)} s` : "");
  return make("button", {
    type: "button", class: "event", "data-event": name, "aria-pressed": String(contrast?.signal.event === name),
    click: () => {
      app.change((next) => {
        if (next.contrast.kind !== "windows") return;
        next.contrast.signal.event = name;
        next.contrast.reference.event = name;
      });
      then?.();
    },
  }, make("b", {}, name), make("span", { class: "many" }, String(many)), make("span", { class: "quiet" }, `signal ${when(contrast?.signal)}, reference ${when(contrast?.reference)} from it`),
  makeSvg("svg", { viewBox: "0 0 400 24", preserveAspectRatio: "none", "aria-hidden": "true" }, makeSvg("path", { class: "base", d: "M2 20H398" }), makeSvg("path", { d: ticks })));
}
