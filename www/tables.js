/** The numbers behind the figures: real tables in the margin, and CSV that no spreadsheet can take for a formula. */
import { download, find, make } from "./kit.js";

/** @typedef {import("./types").Table} Table */
/** @typedef {{ name: string, plan: { title?: string, label: string }, figure: () => object | null, settle: () => Promise<void> }} Numbered */

const ROWS_SHOWN = 60;

/** @param {Table} table */
export function csv({ columns, rows }) {
  return [columns, ...rows].map((row) => row.map(cell).join(",")).join("\r\n") + "\r\n";
}

/** Text that a spreadsheet would compute gets a leading apostrophe; numbers stay numbers. @param {string} text */
function cell(text) {
  const risky = /^[=+\-@\t\0]/.test(text) && !Number.isFinite(Number(text));
  const safe = risky ? `'${text}` : text;
  return /[",\r\n]/.test(safe) ? `"${safe.replace(/"/g, '""')}"` : safe;
}

/**
 * Fills a section's list of numbers whenever it is open.
 * @param {import("./types").App} app
 * @param {HTMLElement} section
 * @param {() => Numbered[]} figures
 * @returns {() => void} to be called when the figures have changed
 */
export function numbersOf(app, section, figures) {
  const details = /** @type {HTMLDetailsElement} */ (find(".numbers", section));
  const fill = async () => {
    if (!details.open) return;
    const blocks = [];
    for (const slot of figures()) {
      await slot.settle();
      const figure = slot.figure();
      if (figure) blocks.push(...block(slot, app.bridge.table(figure)));
    }
    find(".tables", details).replaceChildren(...blocks);
  };
  details.addEventListener("toggle", () => void fill());
  return () => void fill();
}

/** @param {Numbered} slot @param {Table} table */
function block({ name, plan }, table) {
  const save = make("button", { type: "button", class: "button slim bare", click: () => download(`${name}.csv`, csv(table), "text/csv") }, "Save table");
  const row = (/** @type {"th" | "td"} */ tag, /** @type {string[]} */ cells) => make("tr", {}, ...cells.map((text) => make(tag, tag === "th" ? { scope: "col" } : { class: /[a-z]{3}/i.test(text) ? "words" : "number" }, short(text))));
  const more = table.rows.length - ROWS_SHOWN;
  return [
    make("h4", {}, make("span", {}, plan.title ?? plan.label), save),
    make("div", { class: "wide" }, make("table", {}, make("thead", {}, row("th", table.columns.map((name) => name.replace(/_/g, " ")))), make("tbody", {}, ...table.rows.slice(0, ROWS_SHOWN).map((cells) => row("td", cells))))),
    ...(more > 0 ? [make("p", { class: "quiet" }, `${more} more rows in the saved table.`)] : []),
  ];
}

/** Numbers in the margin with four digits; the saved table has them all. @param {string} text @returns {string} */
function short(text) {
  if (/^\S+([ ,;]+\S+)+$/.test(text) && text.split(/[ ,;]+/).every((part) => Number.isFinite(Number(part)))) return text.split(/[ ,;]+/).map(short).join(" ");
  const value = Number(text);
  if (text === "" || !Number.isFinite(value) || Number.isInteger(value)) return text.replace(/^-/, "−");
  return String(Number(value.toPrecision(4))).replace(/^-/, "−");
}
