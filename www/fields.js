/** Places to fill in: text and number fields, picks and selects that show the recipe and change it. */
import { make } from "./kit.js";
import { count, typed, written } from "./numbers.js";

/**
 * A text field that commits on Enter or when it is left, and goes back on Escape. What is being typed is never touched, and what was refused
 * stays as it was typed, marked and with a few words beside it, until it is mended or the value changes elsewhere.
 * @param {Record<string, string | undefined>} attributes
 * @param {object} plan
 * @param {() => string} plan.text the value in force
 * @param {(text: string) => string} plan.refuses why the text cannot be taken, in a few words; empty where it can
 * @param {(text: string) => void} plan.take
 */
export function textField(attributes, plan) {
  const note = make("span", { class: "refused", role: "status", hidden: true });
  const field = make("input", { class: "field", type: "text", autocomplete: "off", spellcheck: "false", ...attributes });
  let edited = false;
  /** The value in force when the text was refused. @type {string | null} */
  let refusedAt = null;
  const mark = (/** @type {string} */ why) => {
    field.setAttribute("aria-invalid", String(why !== ""));
    if (why && !note.isConnected) field.after(note);
    note.hidden = why === "";
    if (note.textContent !== why) note.textContent = why;
  };
  const restore = () => {
    [edited, refusedAt] = [false, null];
    mark("");
    field.value = plan.text();
  };
  const commit = () => {
    edited = false;
    const why = plan.refuses(field.value);
    mark(why);
    refusedAt = why ? plan.text() : null;
    if (!why && field.value !== plan.text()) plan.take(field.value);
  };
  field.addEventListener("input", () => (edited = true));
  field.addEventListener("change", commit);
  field.addEventListener("blur", () => edited && commit());
  field.addEventListener("keydown", ({ key }) => {
    if (key === "Escape") restore();
    if (key === "Enter" && edited) commit();
  });
  return {
    field, commit,
    /** Text that stands in the field without being in force, or null. */
    pending: () => (refusedAt === null ? null : field.value),
    show() {
      if (edited && document.activeElement === field) return;
      if (refusedAt === plan.text()) return;
      [edited, refusedAt] = [false, null];
      mark("");
      if (field.value !== plan.text()) field.value = plan.text();
    },
  };
}

/**
 * A number field.
 * @param {string} label
 * @param {object} plan
 * @param {() => number | null | undefined} plan.get
 * @param {(value: number | null) => void} plan.set
 * @param {boolean} [plan.optional] an empty field is an answer
 * @param {() => [number, number]} [plan.range]
 * @param {(value: number) => string} [plan.refuses] why a number in range cannot be taken; empty where it can
 * @param {() => number} [plan.step] what an arrow key adds
 * @param {(value: number) => string} [plan.write] how a value stands in the field
 * @param {string} [plan.empty] shown where nothing is set
 */
export function numberField(label, plan) {
  const write = (/** @type {number | null} */ value) => (value === null ? "" : (plan.write ?? written)(value));
  const refuses = (/** @type {string} */ text) => {
    const value = typed(text);
    if (value === null) return plan.optional && text.trim() === "" ? "" : "must be a number";
    const [low, high] = plan.range?.() ?? [-Infinity, Infinity];
    return value < low || value > high ? `must lie from ${spoken(low)} to ${spoken(high)}` : (plan.refuses?.(value) ?? "");
  };
  const current = () => write(plan.get() ?? null);
  const text = textField({ inputmode: "decimal", "aria-label": label, placeholder: plan.empty }, {
    text: current, refuses,
    take: (given) => void (typed(given) !== (plan.get() ?? null) && plan.set(typed(given))),
  });
  text.field.addEventListener("keydown", (event) => {
    const way = { ArrowUp: 1, ArrowDown: -1 }[event.key];
    const value = typed(text.field.value);
    if (!way || !plan.step || value === null) return;
    event.preventDefault();
    text.field.value = write(value + way * plan.step() * (event.shiftKey ? 10 : 1));
    text.commit();
  });
  return { ...text, pending: () => typed(text.pending() ?? "") };
}

/** A limit, in words of a field's note. @param {number} value */
function spoken(value) {
  return Math.abs(value) >= 1e4 ? count(value) : written(value);
}

/** @typedef {{ value: string, label: string, many?: string }} Option */

/**
 * A few answers side by side, one of them taken.
 * @param {string} label
 * @param {string} name
 * @param {(value: string) => void} set
 */
export function picks(label, name, set) {
  const root = make("span", { class: "picks", role: "radiogroup", "aria-label": label });
  return {
    root,
    /** @param {Option[]} options @param {string | undefined} value */
    show(options, value) {
      const same = root.children.length === options.length && options.every((o, i) => root.children[i]?.querySelector("input")?.value === o.value);
      if (!same) root.replaceChildren(...options.map((option) =>
        make("label", {}, make("input", { type: "radio", name, value: option.value, change: () => set(option.value) }), option.label, option.many ? make("span", { class: "many" }, option.many) : null)));
      for (const input of root.querySelectorAll("input")) input.checked = input.value === value;
    },
  };
}

/**
 * Many answers, one of them taken.
 * @param {string} label
 * @param {(value: string) => void} set
 */
export function select(label, set) {
  const root = make("select", { class: "field", "aria-label": label, change: () => set(root.value) });
  return {
    root,
    /** @param {Option[]} options @param {string | undefined} value */
    show(options, value) {
      const key = JSON.stringify(options);
      if (root.dataset.key !== key) {
        root.dataset.key = key;
        root.replaceChildren(...options.map((option) => make("option", { value: option.value }, option.label)));
      }
      if (value !== undefined) root.value = value;
    },
  };
}
