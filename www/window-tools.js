/** Which of the events are used: more labels, the first or last of them, some left out, as many as on the other side, until an answer. */
import { numberField, textField } from "./fields.js";
import { make } from "./kit.js";
import { now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").EventWindow} EventWindow */
/** @typedef {import("./types").Recipe} Recipe */

const together = (/** @type {(Node | string)[]} */ ...parts) => make("span", { class: "together" }, ...parts);

/**
 * The windows that the choices are about: both of a pair, so that they stay one; else the first.
 * @param {Recipe} recipe
 * @returns {EventWindow[]}
 */
function chosen({ contrast }) {
  if (contrast.kind === "repeatable") return [contrast];
  if (contrast.kind !== "windows") return [];
  const { signal, reference } = contrast;
  return signal.event === reference.event ? [signal, reference] : [signal];
}

/** @param {App} app @param {string} of what the choices are about, in words */
export function windowTools(app, of) {
  const get = () => {
    const { recipe } = now();
    return recipe ? chosen(recipe)[0] : undefined;
  };
  /** @param {(window: EventWindow) => void} edit */
  const set = (edit) => app.change((recipe) => chosen(recipe).forEach(edit));
  const list = (/** @type {string} */ text) => text.split(/[,;]/).map((part) => part.trim()).filter(Boolean);
  const also = textField({ "aria-label": `further events that count as ${of}`, class: "field times", placeholder: "gull, fog*" }, {
    text: () => (get()?.also ?? []).join(", "), refuses: () => "",
    take: (text) => set((window) => put(window, "also", list(text))),
  });
  const out = textField({ "aria-label": `numbers of ${of} left out`, class: "field times", placeholder: "3, 17" }, {
    text: () => (get()?.leave_out ?? []).join(", "),
    refuses: (text) => (list(text).every((part) => /^[1-9]\d*$/.test(part)) ? "" : "must be numbers of trials, from 1"),
    take: (text) => set((window) => put(window, "leave_out", list(text).map(Number))),
  });
  const many = (/** @type {"first" | "last"} */ key) => numberField(`only the ${key}`, {
    get: () => get()?.[key] ?? null, optional: true, empty: "all", range: () => [1, 1e5], step: () => 1,
    set: (value) => set((window) => put(window, key, value === null ? undefined : Math.round(value))),
  });
  const [first, last] = [many("first"), many("last")];
  const equal = make("input", { type: "checkbox", change: () => app.change(({ contrast }) => {
    if (contrast.kind === "windows") for (const window of [contrast.signal, contrast.reference]) put(window, "equal", equal.checked || undefined);
  }) });
  const until = textField({ "aria-label": "signal windows last until the next", class: "field times", placeholder: "an event, such as press" }, {
    text: () => get()?.until ?? "", refuses: (text) => (!text.trim() || known(text.trim()) ? "" : "no event has this label"),
    take: (text) => app.change(({ contrast }) => void (contrast.kind === "windows" && put(contrast.signal, "until", text.trim() || undefined))),
  });
  const pairwise = make("div", { class: "choice" }, together("signal windows last until the next ", until.field), make("label", { class: "tick" }, equal, "as many windows on the larger side as on the smaller, drawn by the seed"));
  const root = make("details", { class: "more" }, make("summary", {}, "Which events"),
    make("div", { class: "choice" }, together("count also ", also.field), together("only the first ", first.field), together("only the last ", last.field), together("leave out number ", out.field)),
    ...(of === "trials" ? [] : [pairwise]));
  return {
    root,
    show() {
      [also, out, first, last, until].forEach((field) => field.show());
      const contrast = now().recipe?.contrast;
      equal.checked = contrast?.kind === "windows" && Boolean(contrast.signal.equal || contrast.reference.equal);
    },
  };
}

/** Whether an event has this label, or fits this pattern. @param {string} label */
function known(label) {
  const pattern = new RegExp(`^${label.split("*").map((part) => part.replace(/[.*+?^${}()|[\]\\]/g, "\\$&")).join(".*")}$`);
  return Object.keys(now().summary?.recording.events ?? {}).some((name) => name === label || pattern.test(name));
}

/**
 * Sets a key, or takes it out where it says nothing.
 * @template {keyof EventWindow} K
 * @param {EventWindow} window
 * @param {K} key
 * @param {EventWindow[K] | undefined} value
 */
function put(window, key, value) {
  if (value === undefined || (Array.isArray(value) && !value.length)) delete window[key];
  else window[key] = /** @type {EventWindow[K]} */ (value);
}
