/** What is compared: the five kinds of contrast, and what each begins with. */
import { select } from "./fields.js";
import { bandFields, repeatableFields, slowFields, spanFields } from "./kinds-fields.js";
import { make } from "./kit.js";
import { now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Contrast} Contrast */
/** @typedef {import("./types").Kind} Kind */
/** @typedef {import("./types").Recipe} Recipe */

/** A kind in two words. @type {Record<Kind, string>} */
export const KIND_WORDS = { windows: "windows around events", spans: "marked spans", band: "rhythm", repeatable: "repeating part", slow: "slow changes" };

/** @type {{ value: Kind, label: string }[]} */
const KINDS = [
  { value: "windows", label: "windows around events" },
  { value: "spans", label: "spans I mark, or annotations that last" },
  { value: "band", label: "a rhythm with its neighbours" },
  { value: "repeatable", label: "what repeats over trials with single trials" },
  { value: "slow", label: "what changes slowly with what changes fast" },
];

/** The last contrast of each kind, so that going back loses nothing. @type {Map<Kind, Contrast>} */
const kept = new Map();

/** @param {App} app */
export function kindChoice(app) {
  const choice = select("what is compared", (value) => take(app, /** @type {Kind} */ (value)));
  choice.root.id = "kind";
  const hint = make("p", { class: "refused", role: "status", hidden: true });
  /** @type {Record<Exclude<Kind, "windows">, { root: HTMLElement, show: () => void }>} */
  const blocks = { spans: spanFields(app), band: bandFields(app), repeatable: repeatableFields(app), slow: slowFields(app) };
  const fields = make("div", { class: "kinds" }, ...Object.values(blocks).map(({ root }) => root));
  const root = make("div", { class: "choice" }, make("label", { class: "together" }, make("b", {}, "Compare "), choice.root), hint);

  /** @param {App} to @param {Kind} kind */
  function take(to, kind) {
    const { recipe } = now();
    if (!recipe || recipe.contrast.kind === kind) return;
    const next = kept.get(kind) ?? beginning(kind, recipe);
    hint.hidden = next !== null;
    if (!next) {
      hint.textContent = "This comparison needs events, and the recording marks none.";
      return choice.show(KINDS, recipe.contrast.kind);
    }
    to.change((draft) => {
      kept.set(draft.contrast.kind, structuredClone(draft.contrast));
      draft.contrast = structuredClone(next);
      draft.measure = usual(kind);
      if (draft.measure === "typical" && (draft.shrink === "oas" || draft.shrink === "ledoit-wolf")) draft.shrink = "auto";
    });
  }
  return {
    root, fields,
    show() {
      const kind = now().recipe?.contrast.kind ?? "windows";
      choice.show(KINDS, kind);
      for (const [name, block] of Object.entries(blocks)) {
        block.root.hidden = name !== kind;
        if (name === kind) block.show();
      }
    },
  };
}

/** The measure that a kind is ordered and tested by: what repeats has no ratio in a single trial. @param {Kind} kind @returns {Recipe["measure"]} */
export function usual(kind) {
  return kind === "repeatable" ? "total" : "typical";
}

/** Where a kind begins: with the event in force, spans over the first third, the rhythm at 10 Hz. @param {Kind} kind @param {Recipe} recipe @returns {Contrast | null} */
function beginning(kind, { contrast }) {
  const { summary } = now();
  const events = Object.entries(summary?.recording.events ?? {}).sort((a, b) => b[1] - a[1]);
  const event = contrast.kind === "windows" ? contrast.signal : (/** @type {[string, number] | undefined} */ (events[0]) && { event: String(events[0]?.[0]), from_s: 0, to_s: 0.8 });
  const rate = summary?.recording.rate_hz ?? 250;
  const end = summary?.recording.duration_s ?? 60;
  switch (kind) {
    case "windows":
      return event ? { kind, signal: { ...event }, reference: { ...event, from_s: event.from_s - (event.to_s - event.from_s), to_s: event.from_s } } : null;
    case "repeatable":
      return event ? { kind, event: event.event, from_s: event.from_s, to_s: event.to_s } : null;
    case "spans":
      return { kind, signal: [[0, Math.round(end / 3)]], reference: "rest" };
    case "band":
      return { kind, centre_hz: Math.min(10, Math.floor(rate / 8)), half_width_hz: Math.min(2, Math.floor(rate / 8) / 5), reference: "flanks" };
    default:
      return { kind: "slow", lag_s: Math.max(0.02, Number((2 / rate).toFixed(4))) };
  }
}
