/** Places to fill in: number fields, picks and selects that show the recipe and change it. */
import { make } from "./kit.js";
import { typed, written } from "./numbers.js";

/**
 * A number field. It speaks up (aria-invalid) where the text is no number in range; it never changes what the user is typing.
 * @param {string} label
 * @param {object} plan
 * @param {() => number | null | undefined} plan.get
 * @param {(value: number | null) => void} plan.set
 * @param {boolean} [plan.optional] an empty field is an answer
 * @param {[number, number]} [plan.range]
 * @param {(value: number) => string} [plan.refuse] why a number cannot be taken, in words; "" where it can
 * @param {() => number} [plan.step] what an arrow key adds
 * @param {(value: number) => string} [plan.write] how a value stands in the field
 * @param {string} [plan.empty] shown where nothing is set
 */
export function numberField(label, plan) {
  const write = (/** @type {number | null} */ value) => (value === null ? "" : (plan.write ?? written)(value));
  const accepts = (/** @type {number | null} */ value, /** @type {string} */ text) =>
    value === null ? Boolean(plan.optional && text.trim() === "") : !plan.range || (value >= plan.range[0] && value <= plan.range[1]);
  const field = make("input", { class: "field", type: "text", inputmode: "decimal", autocomplete: "off", spellcheck: "false", "aria-label": label, placeholder: plan.empty });
  /** What is being typed belongs to the user until it is entered or taken back. */
  let edited = false;
  const fault = (/** @type {string} */ words) => {
    field.setAttribute("aria-invalid", String(words !== ""));
    field.setCustomValidity(words);
    if (words && document.activeElement === field) field.reportValidity();
    return words !== "";
  };
  const commit = () => {
    edited = false;
    const value = typed(field.value);
    if (!accepts(value, field.value)) return fault(plan.range ? `A number from ${written(plan.range[0])} to ${written(plan.range[1])} goes here${plan.optional ? ", or nothing" : ""}.` : "A number goes here.");
    if (fault(value === null ? "" : (plan.refuse?.(value) ?? ""))) return true;
    if (value !== (plan.get() ?? null)) plan.set(value);
    return false;
  };
  field.addEventListener("change", commit);
  field.addEventListener("input", () => (edited = true));
  field.addEventListener("keydown", (event) => {
    if (event.key === "Escape") {
      edited = false;
      fault("");
      field.value = write(plan.get() ?? null);
    }
    const way = { ArrowUp: 1, ArrowDown: -1 }[event.key];
    const value = typed(field.value);
    if (!way || !plan.step || value === null) return;
    event.preventDefault();
    field.value = write(value + way * plan.step() * (event.shiftKey ? 10 : 1));
    commit();
  });
  return {
    field,
    show() {
      const value = plan.get() ?? null;
      if (document.activeElement === field && (edited || field.getAttribute("aria-invalid") === "true")) return;
      if (document.activeElement === field && typed(field.value) === value) return void field.setAttribute("aria-invalid", "false");
      field.value = write(value);
      fault("");
    },
  };
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
