/** What a file leaves open is asked in the place of an error: a small form whose answers go into the recipe. */
import { find, make } from "./kit.js";
import { say, sentence } from "./notices.js";
import { typed } from "./numbers.js";

/** @typedef {import("./types").Ask} Ask */
/** @typedef {import("./types").Given} Given */
/** @typedef {import("./types").Problem} Problem */
/** @typedef {import("./notices.js").Way} Way */

/** Marks the choice that leads to a field of its own. */
const OTHER = "\0other";
/** Answers as a person says them. @type {Record<string, string>} */
const SAID = {
  uV: "µV",
  "channels,samples": "channels × samples (a row for each channel)",
  "samples,channels": "samples × channels (a row for each sample)",
  "frames,height,width": "frames × height × width (a movie)",
};
/** What a field is called. @type {Record<string, string>} */
const NAMES = { rate_hz: "Sampling rate in Hz", unit: "Unit", axes: "Axes", variable: "Array" };

/**
 * @param {Problem} problem
 * @param {Given} given what is told already
 * @param {(told: Given) => void} open
 * @param {Way[]} ways
 */
export function sayAsks({ file, what, asks }, given, open, ways) {
  const fields = asks.map((ask) => field(ask, /** @type {Record<string, unknown>} */ (given)[ask.key]));
  const answer = () => {
    const wrong = fields.filter(({ check }) => !check());
    if (wrong[0]) return wrong[0].focus();
    open(Object.fromEntries(fields.map(({ key, value }) => [key, value()])));
  };
  const form = make("div", { class: "asks" }, ...fields.map(({ root }) => root));
  form.addEventListener("keydown", (event) => {
    if (event.key !== "Enter" || event.isComposing) return;
    event.preventDefault();
    answer();
  });
  // "a table does not say its unit" is said of the file by its name.
  const title = file ? what.replace(/^.*?(?= does not say )/, file) : what;
  say("#problem", {
    title: sentence(file && !title.includes(file) ? `${file}: ${title}` : title, file),
    text: ["Your answers are kept in the recipe."],
    ways: [{ label: "Open", main: true, act: answer }, ...ways],
  });
  find("#problem .acts").before(form);
  fields[0]?.focus();
}

/** One question with its place to answer. @param {Ask} ask @param {unknown} told */
function field({ key, question, options, guess }, told) {
  const name = NAMES[key] ?? key;
  const id = `ask-${key}`;
  const note = make("span", { class: "refused", role: "status", hidden: true });
  const text = make("input", { class: `field${options.length ? "" : " wide"}`, id: options.length ? `${id}-other` : id, type: "text", autocomplete: "off", spellcheck: "false", inputmode: key === "rate_hz" ? "decimal" : null, "aria-label": name });
  const first = told ?? guess;
  const choice = options.length ? make("select", { class: "field", id },
    ...(first === null || first === undefined ? [make("option", { value: "" }, "choose…")] : []),
    ...options.map((option) => make("option", { value: option }, SAID[option] ?? option)),
    ...(key === "unit" ? [make("option", { value: OTHER }, "another…")] : [])) : null;
  if (choice) {
    const known = options.includes(String(first));
    choice.value = known ? String(first) : first && key === "unit" ? OTHER : "";
    if (choice.value === OTHER) text.value = String(first);
    choice.addEventListener("change", () => {
      text.hidden = choice.value !== OTHER;
      if (!text.hidden) text.focus();
    });
    text.hidden = choice.value !== OTHER;
  } else if (first !== null && first !== undefined) {
    text.value = String(first);
  }
  const shown = () => (choice && choice.value !== OTHER ? choice : text);
  const raw = () => shown().value.trim();
  const refuses = () => {
    if (raw() === "") return key === "rate_hz" ? "type a number of Hz" : "choose one";
    if (key !== "rate_hz") return "";
    const value = typed(raw());
    return value !== null && value > 0 && value <= 1e7 ? "" : "must be a number of Hz above 0";
  };
  return {
    key,
    root: make("p", { class: "ask" }, make("label", { for: id }, question), make("span", {}, choice, choice && key !== "unit" ? null : text, key === "rate_hz" ? " Hz" : null, note)),
    value: () => (key === "rate_hz" ? typed(raw()) : raw()),
    focus: () => shown().focus({ preventScroll: true }),
    check() {
      const why = refuses();
      shown().setAttribute("aria-invalid", String(why !== ""));
      note.textContent = why;
      note.hidden = why === "";
      return why === "";
    },
  };
}

/**
 * Several recordings at once: one after the other they may be one recording, which only the user knows.
 * @param {string[]} names in order
 * @param {Way[]} ways
 */
export function sayParts(names, ways) {
  say("#problem", {
    title: `${names.length} recordings were given at once`,
    text: ["If they are the files of one recording, they are joined in this order; where their headers do not say that they touch, there is a gap."],
    ways,
  });
  find("#problem .acts").before(make("ol", { class: "parts" }, ...names.map((name) => make("li", {}, name))));
}
