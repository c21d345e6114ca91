/** The fields of each kind of contrast but windows around events. */
import { numberField, picks, select, textField } from "./fields.js";
import { make } from "./kit.js";
import { seconds } from "./numbers.js";
import { now } from "./state.js";
import { windowTools } from "./window-tools.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Contrast} Contrast */
/** @typedef {import("./types").EventWindow} EventWindow */
/** @typedef {import("./types").Kind} Kind */
/** @typedef {import("./types").Spans} Spans */

const together = (/** @type {(Node | string)[]} */ ...parts) => make("span", { class: "together" }, ...parts);
const row = (/** @type {(Node | string)[]} */ ...parts) => make("div", { class: "choice" }, ...parts);

/**
 * The contrast in force, where it is of this kind.
 * @template {Kind} K
 * @param {K} kind
 * @param {import("./types").Recipe | null} recipe
 * @returns {Extract<Contrast, { kind: K }> | undefined}
 */
function own(kind, recipe = now().recipe) {
  return recipe?.contrast.kind === kind ? /** @type {Extract<Contrast, { kind: K }>} */ (recipe.contrast) : undefined;
}

/**
 * Changes the contrast, if it still is of this kind.
 * @template {Kind} K
 * @param {App} app
 * @param {K} kind
 * @param {(contrast: Extract<Contrast, { kind: K }>) => void} edit
 */
function edit(app, kind, edit) {
  app.change((recipe) => {
    const contrast = own(kind, recipe);
    if (contrast) edit(contrast);
  });
}

/** "12 to 30, 45 to 60" @param {Spans | undefined} spans */
function written(spans) {
  return Array.isArray(spans) ? spans.map(([from, to]) => `${trimmed(from)} to ${trimmed(to)}`).join(", ") : "";
}

/** @param {number} value */
function trimmed(value) {
  return String(Number(value.toFixed(3)));
}

/** @param {string} text @returns {[number, number][] | null} */
function read(text) {
  const parts = text.split(/[,;]/).map((part) => part.trim()).filter(Boolean);
  const spans = parts.map((part) => /^(\d+(?:\.\d+)?)\s*(?:to|-|–)\s*(\d+(?:\.\d+)?)\s*s?$/.exec(part));
  const times = spans.map((found) => /** @type {[number, number]} */ ([Number(found?.[1]), Number(found?.[2])]));
  return parts.length && spans.every(Boolean) && times.every(([from, to]) => from < to) ? times : null;
}

/** Times of spans as text: `12 to 30, 45 to 60`. @param {string} label @param {() => Spans | undefined} get @param {(spans: [number, number][]) => void} set */
function timesField(label, get, set) {
  return textField({ "aria-label": label, class: "field times", placeholder: "12 to 30, 45 to 60" }, {
    text: () => written(get()),
    refuses: (text) => (read(text) ? "" : "must read like 12 to 30, 45 to 60"),
    take: (text) => {
      const times = read(text);
      if (times) set(times);
    },
  });
}

/** Labels that may name spans. */
function labels() {
  return Object.entries(now().summary?.recording.events ?? {}).map(([name, n]) => ({ value: `label:${name}`, label: `the spans of ${name} (${n})` }));
}

/** One side of a contrast of spans: times, a label, or (reference) the rest. @param {App} app @param {"signal" | "reference"} side */
function spanSide(app, side) {
  const get = () => own("spans")?.[side];
  const times = timesField(`${side} spans, in seconds`, get, (spans) => edit(app, "spans", (contrast) => void (contrast[side] = spans)));
  const what = select(`${side} spans`, (value) => {
    const before = get();
    const next = value === "rest" ? "rest" : value.startsWith("label:") ? value.slice(6) : Array.isArray(before) ? before : /** @type {[number, number][]} */ ([[0, 10]]);
    edit(app, "spans", (contrast) => void (contrast[side] = next));
  });
  return {
    root: together(make("span", { class: side === "signal" ? "of-signal" : "of-reference" }, side, " "), what.root, " ", times.field),
    show() {
      const value = get();
      what.show([...(side === "reference" ? [{ value: "rest", label: "everything else" }] : []), { value: "times", label: "these times, in seconds" }, ...labels()],
        value === undefined ? undefined : Array.isArray(value) ? "times" : value === "rest" && side === "reference" ? "rest" : `label:${value}`);
      times.field.hidden = !Array.isArray(value);
      times.show();
    },
  };
}

/** Length of the pieces. @param {App} app @param {"spans" | "band" | "slow"} kind @param {string} rule */
function pieceField(app, kind, rule) {
  return numberField("length of the pieces, in seconds", {
    get: () => own(kind)?.piece_s ?? null, optional: true, empty: rule, range: () => [0.02, 3600], step: () => 0.5,
    set: (value) => edit(app, kind, (contrast) => {
      if (value === null) delete contrast.piece_s;
      else contrast.piece_s = value;
    }),
  });
}

/** @param {App} app */
export function spanFields(app) {
  const sides = [spanSide(app, "signal"), spanSide(app, "reference")];
  const piece = pieceField(app, "spans", "1");
  const root = make("div", { class: "kind", hidden: true },
    row(...sides.map((side) => side.root)),
    row(together("cut into pieces of ", piece.field, " s"), make("span", { class: "quiet small" }, "so that a typical piece can be spoken of; times can also be marked on the traces")));
  return { root, show: () => [...sides, piece].forEach((part) => part.show()) };
}

/** Where in time a rhythm or slow changes are looked for. @param {App} app @param {"band" | "slow"} kind */
function withinFields(app, kind) {
  const get = () => own(kind)?.within;
  const inWindow = () => {
    const within = get();
    return within && typeof within === "object" && !Array.isArray(within) ? within : undefined;
  };
  /** @param {EventWindow | Spans | undefined} within */
  const set = (within) => edit(app, kind, (contrast) => {
    if (within === undefined) delete contrast.within;
    else contrast.within = within;
  });
  const what = select("where in time", (value) => {
    if (value === "all") return set(undefined);
    if (value === "times") return set([[0, Math.max(1, Math.floor(now().summary?.recording.duration_s ?? 60))]]);
    if (value.startsWith("label:")) return set(value.slice(6));
    set({ event: value.slice(6), from_s: 0, to_s: 1 });
  });
  const times = timesField("spans looked into, in seconds", () => {
    const within = get();
    return Array.isArray(within) ? within : undefined;
  }, set);
  const ends = /** @type {("from_s" | "to_s")[]} */ (["from_s", "to_s"]).map((end) =>
    numberField(`window ${end === "from_s" ? "from" : "to"}, in seconds from the event`, {
      get: () => inWindow()?.[end], step: () => 0.05, write: seconds,
      set: (value) => {
        const window = inWindow();
        if (window && value !== null) set({ ...window, [end]: value });
      },
    }));
  const window = together(ends[0]?.field ?? "", " to ", ends[1]?.field ?? "", " s");
  return {
    root: together("in ", what.root, " ", times.field, window),
    show() {
      const [within, around] = [get(), inWindow()];
      const events = Object.keys(now().summary?.recording.events ?? {});
      what.show([{ value: "all", label: "the whole recording" }, ...events.map((name) => ({ value: `event:${name}`, label: `windows around ${name}` })), { value: "times", label: "these times, in seconds" }, ...labels()],
        within === undefined ? "all" : around ? `event:${around.event}` : Array.isArray(within) ? "times" : `label:${within}`);
      times.field.hidden = !Array.isArray(within);
      window.hidden = !around;
      [times, ...ends].forEach((field) => field.show());
    },
  };
}

/** @param {App} app */
export function bandFields(app) {
  const nyquist = () => (now().summary?.recording.rate_hz ?? 1000) / 2;
  /** Flanks reach three and a half half widths, a band alone one and a half. */
  const reach = () => (own("band")?.reference === "broadband" ? 1.5 : 3.5);
  const centre = numberField("centre of the band, in Hz", {
    get: () => own("band")?.centre_hz, step: () => 0.5,
    refuses: (hz) => fits(hz, own("band")?.half_width_hz ?? 0, reach(), nyquist()),
    set: (hz) => hz !== null && edit(app, "band", (contrast) => void (contrast.centre_hz = hz)),
  });
  const half = numberField("half width of the band, in Hz", {
    get: () => own("band")?.half_width_hz, step: () => 0.25,
    refuses: (hz) => (hz > 0 ? fits(own("band")?.centre_hz ?? 0, hz, reach(), nyquist()) : "must be above 0"),
    set: (hz) => hz !== null && edit(app, "band", (contrast) => void (contrast.half_width_hz = hz)),
  });
  const against = picks("What the rhythm is compared with", "band-reference", (value) => edit(app, "band", (contrast) => void (contrast.reference = value === "broadband" ? "broadband" : "flanks")));
  const within = withinFields(app, "band");
  const piece = pieceField(app, "band", "rule");
  const note = make("span", { class: "quiet small" });
  const root = make("div", { class: "kind", hidden: true },
    row(together(make("span", { class: "of-signal" }, "signal "), centre.field, " ± ", half.field, " Hz"), together(make("span", { class: "of-reference" }, "reference "), against.root), note),
    row(within.root, together("pieces of ", piece.field, " s")));
  return {
    root,
    show() {
      against.show([{ value: "flanks", label: "bands on either side" }, { value: "broadband", label: "all frequencies" }], own("band")?.reference ?? "flanks");
      [centre, half, within, piece].forEach((part) => part.show());
      note.textContent = beside();
    },
  };
}

/** The bands on either side, with their edges. */
function beside() {
  const contrast = own("band");
  if (!contrast || contrast.reference === "broadband") return "";
  const [c, h] = [contrast.centre_hz, contrast.half_width_hz];
  return `${trimmed(c - 3 * h)} to ${trimmed(c - 2 * h)} and ${trimmed(c + 2 * h)} to ${trimmed(c + 3 * h)} Hz`;
}

/** @param {number} centre @param {number} half @param {number} reach @param {number} nyquist */
function fits(centre, half, reach, nyquist) {
  if (centre - reach * half <= 0) return `must leave room below: more than ${trimmed(reach * half)} Hz`;
  return centre + reach * half < nyquist ? "" : `must stay below ${trimmed(nyquist - reach * half)} Hz`;
}

/** @param {App} app */
export function repeatableFields(app) {
  const event = select("event of the trials", (value) => edit(app, "repeatable", (contrast) => void (contrast.event = value)));
  const ends = /** @type {("from_s" | "to_s")[]} */ (["from_s", "to_s"]).map((end) =>
    numberField(`trial ${end === "from_s" ? "from" : "to"}, in seconds from the event`, {
      get: () => own("repeatable")?.[end], step: () => 0.05, write: seconds,
      refuses: (value) => {
        const contrast = own("repeatable");
        if (!contrast) return "";
        return (end === "from_s" ? value < contrast.to_s : value > contrast.from_s) ? "" : "must end after it begins";
      },
      set: (value) => value !== null && edit(app, "repeatable", (contrast) => void (contrast[end] = value)),
    }));
  const tools = windowTools(app, "trials");
  const root = make("div", { class: "kind", hidden: true },
    row(together("trials around ", event.root), together(ends[0]?.field ?? "", " to ", ends[1]?.field ?? "", " s"),
      make("span", { class: "quiet small" }, "what is the same in every trial (signal) against the single trials (reference)")),
    tools.root);
  return {
    root,
    show() {
      event.show(Object.entries(now().summary?.recording.events ?? {}).map(([name, n]) => ({ value: name, label: `${name} (${n})` })), own("repeatable")?.event);
      [...ends, tools].forEach((part) => part.show());
    },
  };
}

/** @param {App} app */
export function slowFields(app) {
  const lag = numberField("lag, in milliseconds", {
    get: () => (own("slow")?.lag_s ?? 0) * 1000, range: () => [Math.min(1, 1000 / (now().summary?.recording.rate_hz ?? 1000)), 3.6e6], step: () => 1000 / (now().summary?.recording.rate_hz ?? 1000), write: trimmed,
    set: (value) => value !== null && edit(app, "slow", (contrast) => void (contrast.lag_s = value / 1000)),
  });
  const within = withinFields(app, "slow");
  const piece = pieceField(app, "slow", "rule");
  const root = make("div", { class: "kind", hidden: true },
    row(together(make("span", { class: "of-signal" }, "signal "), "what stays the same over ", lag.field, " ms"), together(make("span", { class: "of-reference" }, "reference "), "what changes within it")),
    row(within.root, together("pieces of ", piece.field, " s")));
  return { root, show: () => [lag, within, piece].forEach((part) => part.show()) };
}

