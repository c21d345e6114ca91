/** A table of events with columns of its own: which is the time, which the label, which the duration, and what would result. */
import { find, make } from "./kit.js";
import { picks, select } from "./fields.js";
import { asProblem, sentence, whereabouts } from "./notices.js";
import { clock, count } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").EventColumns} EventColumns */
/** @typedef {import("./types").EventsPreview} EventsPreview */
/** @typedef {import("./types").Given} Given */
/**
 * @typedef {object} Door
 * @property {(name: string) => File | null} file
 * @property {(told: Given) => Promise<void>} tell
 * @property {(name: string) => Promise<void>} without
 * @property {(thrown: unknown) => void} failed
 */

const UNITS = [
  { value: "s", label: "seconds" },
  { value: "ms", label: "milliseconds" },
  { value: "samples", label: "samples" },
];

/** @param {App} app @param {Door} door */
export function mountMapping(app, door) {
  const root = find("#mapping");
  /** @type {{ name: string, bytes: Uint8Array } | null} */
  let table = null;
  /** @type {EventColumns | null} */
  let chosen = null;

  const [title, wide, result] = [make("h3"), make("div", { class: "wide" }), make("p", { class: "outcome", role: "status" })];
  const change = (/** @type {Partial<EventColumns>} */ part) => {
    if (chosen) chosen = { ...chosen, ...part };
    show();
  };
  const onset = select("column of the times", (value) => change({ onset: value }));
  const unit = picks("unit of the times", "event-unit", (value) => change({ unit: /** @type {EventColumns["unit"]} */ (value) }));
  const label = select("column of the labels", (value) => change({ label: value || null }));
  const length = select("column of the durations", (value) => change({ duration: value || null }));
  const use = make("button", { type: "button", class: "button main", id: "use-events", click: () => chosen && void door.tell({ events: plain(chosen) }).catch(door.failed) }, "Use these events");
  const leave = make("button", { type: "button", class: "button", click: () => table && void door.without(table.name).catch(door.failed) }, "Leave the table out");
  find(".body", root).append(
    title,
    make("div", { class: "choice" },
      make("span", { class: "together" }, "Time is in ", onset.root), make("span", { class: "together" }, "counted in ", unit.root),
      make("span", { class: "together" }, "label in ", label.root), make("span", { class: "together" }, "duration in ", length.root)),
    wide, result, make("p", { class: "acts" }, use, leave),
  );

  const show = () => {
    const { summary } = now();
    if (!table || !summary) return;
    const { stretches, rate_hz } = summary.recording;
    const last = stretches.at(-1);
    const span = last ? last.onset_s + last.count / rate_hz - (stretches[0]?.onset_s ?? 0) : 0;
    try {
      const preview = app.bridge.eventsPreview(table.name, table.bytes, chosen, rate_hz, span);
      chosen = preview.mapping;
      lay(preview);
    } catch (thrown) {
      const { what, advice } = asProblem(thrown);
      result.textContent = `${sentence(what, null)}; ${advice}.`;
      use.disabled = true;
    }
  };
  const lay = (/** @type {EventsPreview} */ preview) => {
    const columns = preview.columns.map((name) => ({ value: name, label: name }));
    title.textContent = `Which columns of ${table?.name} hold what?`;
    onset.show(columns, preview.mapping.onset);
    unit.show(UNITS, preview.mapping.unit);
    label.show([{ value: "", label: "no column" }, ...columns], preview.mapping.label ?? "");
    length.show([{ value: "", label: "no column" }, ...columns], preview.mapping.duration ?? "");
    wide.replaceChildren(firstRows(preview));
    result.replaceChildren(...outcome(preview));
    use.disabled = preview.problem !== null || preview.labels.length === 0;
  };

  follow(async (state, before) => {
    if (state.summary === before.summary) return;
    const name = state.summary?.recording.about.untold ?? null;
    root.hidden = name === null;
    [table, chosen] = [null, null];
    const file = name === null ? null : door.file(name);
    if (!name || !file) return;
    table = { name, bytes: new Uint8Array(await file.arrayBuffer()) };
    show();
    root.scrollIntoView({ block: "nearest" });
  });
}

/** As a recipe holds it: what is not told is not there. @param {EventColumns} chosen @returns {EventColumns} */
function plain({ onset, unit, label, duration }) {
  return { onset, unit, ...(label ? { label } : {}), ...(duration ? { duration } : {}) };
}

/** The first rows, each used column marked with what it is used for. @param {EventsPreview} preview */
function firstRows({ columns, rows, mapping }) {
  const role = (/** @type {string} */ name) => [name === mapping.onset && "time", name === mapping.label && "label", name === mapping.duration && "duration"].filter(Boolean).join(", ");
  return make("table", { class: "rows" },
    make("caption", { class: "spoken" }, "The first rows of the table"),
    make("thead", {}, make("tr", {}, ...columns.map((name) => make("th", { scope: "col", class: role(name) ? "used" : "" }, name, make("span", {}, role(name)))))),
    make("tbody", {}, ...rows.map((row) => make("tr", {}, ...row.map((cell, i) => make("td", { class: role(columns[i] ?? "") ? "used" : "" }, cell))))),
  );
}

/** What would result, or why nothing would. @param {EventsPreview} preview @returns {(Node | string)[]} */
function outcome({ count: rows, labels, more_labels: more, span_s: span, late, problem }) {
  if (problem) return [make("b", {}, sentence(problem.what, null)), `: ${whereabouts(problem)}.`];
  const total = `${count(rows)} ${rows === 1 ? "row" : "rows"}`;
  if (!span) return [make("b", {}, `Of ${total} none gives an event.`)];
  const kinds = labels.map(([name, many]) => `${name} ${count(many)}×`).join(", ");
  const rest = more > 0 ? ` and ${count(more)} more kinds` : "";
  const beyond = late > 0 ? [" ", make("i", {}, "But"), ` ${count(late)} of them lie after the end of the recording: is the unit right?`] : [];
  return [make("b", {}, `${total} give ${kinds}${rest}`), `, from ${clock(span[0])} to ${clock(span[1])}.`, ...beyond];
}
