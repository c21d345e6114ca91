/** Notices: what happened, where, and what to do, in words; the safest way on first. */
import { find, make } from "./kit.js";

/** @typedef {import("./types").Problem} Problem */
/** @typedef {{ label: string, act: () => void, main?: boolean, bare?: boolean }} Way */
/** @typedef {{ title: string, text: (Node | string)[], where?: string, ways: Way[] }} Notice */

/**
 * @param {"#problem" | "#hint"} place
 * @param {Notice} notice
 */
export function say(place, { title, text, where, ways }) {
  const box = find(place);
  const buttons = ways.map(({ label, act, main, bare }) =>
    make("button", { type: "button", class: `button${main ? " main" : ""}${bare ? " bare" : ""}`, click: act }, label));
  box.hidden = false;
  box.replaceChildren(
    make("span", { class: "sign", "aria-hidden": "true" }),
    make("h3", {}, title),
    make("p", {}, ...text),
    ...(where ? [make("p", { class: "where" }, where)] : []),
    ...(buttons.length ? [make("p", { class: "acts" }, ...buttons)] : []),
  );
}

/** @param {"#problem" | "#hint"} place */
export function unsay(place) {
  const box = find(place);
  box.hidden = true;
  box.replaceChildren();
}

/** Whatever was thrown, as a problem. @param {unknown} thrown @returns {Problem} */
export function asProblem(thrown) {
  if (thrown && typeof thrown === "object" && "what" in thrown) return /** @type {Problem} */ (thrown);
  const what = (thrown instanceof Error ? thrown.message : String(thrown)) || "Something failed that should not have";
  const advice = "Reload the page and try again; the choices are kept.";
  return { kind: "storage", file: null, what, place: null, expected: null, found: null, advice, salvage: null, asks: [] };
}

/** Place, expected and found in one line, as far as they are known. @param {Problem} problem */
export function whereabouts({ place, expected, found }) {
  const numbers = expected && found ? `expected ${expected}, found ${found}` : expected ? `expected ${expected}` : found ? `found ${found}` : "";
  return [place, numbers].filter(Boolean).join(": ");
}

/** A whole sentence, with its full stop. @param {string} text */
export function whole(text) {
  return sentence(text.replace(/[^.?!…]$/, "$&."), null);
}

/** A sentence's first letter, large, unless it is a file's. @param {string} text @param {string | null} file */
export function sentence(text, file) {
  return file && text.startsWith(file) ? text : text.charAt(0).toUpperCase() + text.slice(1);
}
