/** Readings to the page: every piece of text becomes a text node. */
import { make } from "./kit.js";

/** @typedef {import("./types").Span} Span */

const CLASS = { plain: "", strong: "", signal: "of-signal", reference: "of-reference" };

/**
 * @param {Element} place
 * @param {Span[]} spans
 */
export function writeSpans(place, spans) {
  place.replaceChildren(...spans.map(({ text, tone }) => (tone === "plain" ? bound(text) : make("b", { class: CLASS[tone] || null }, bound(text)))));
}

/** Keeps a number with its unit, and a comparison, on one line. @param {string} text */
function bound(text) {
  return text.replace(/(\d) (s|ms|min|Hz|kHz|%|µV|dB)(?![\p{L}\d])/gu, "$1\u00a0$2").replace(/(\d\u00a0min) (?=\d)/g, "$1\u00a0").replace(/(\S) ([=≤≥<>]) (?=\S)/g, "$1\u00a0$2\u00a0");
}

/** @param {Span[]} spans */
export function plainText(spans) {
  return spans.map(({ text }) => text).join("");
}
