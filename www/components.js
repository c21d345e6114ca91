/** Components: one row each, on one shared axis of ratios; one row can be opened. */
import { find, make } from "./kit.js";
import { picks } from "./fields.js";
import { figureSlot } from "./figure.js";
import { factor, interval, probability } from "./numbers.js";
import { openedRow } from "./opened-row.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Component} Component */
/** @typedef {"stronger" | "weaker"} End */
/** @typedef {{ id: string, row: HTMLTableRowElement, cells: Record<string, HTMLElement>, button: HTMLButtonElement, slots: ReturnType<typeof figureSlot>[] }} Row */

const ENDS = /** @type {const} */ (["stronger", "weaker"]);
const COLUMNS = 9;

/** Which component is open: "stronger-1". */
let open = "";
/** @type {Map<string, Row>} */
const rows = new Map();

/** @param {App} app */
export function mountComponents(app) {
  const body = find("#components .body");
  const measure = picks("Measure", "measure", (value) => app.change((recipe) => order(recipe, value === "total" ? "total" : "typical")));
  const only = make("span", { class: "quiet small", hidden: true }, "What repeats has no ratio in a single trial: the average over trials is one for all of them.");
  const table = make("tbody");
  const axis = figureSlot(app, "ratio-axis", { section: "components", label: "Axis of ratios, from one quarter to four times", width: 210, height: 26 });
  body.append(
    make("div", { class: "choice" }, "Order and test by ", measure.root, only),
    make("figure", { class: "figure" },
      make("div", { class: "caption" }, make("b", {}, "What differs"), make("span", { class: "quiet" }, make("span", { class: "of-signal" }, "—"), " signal   ", make("span", { class: "of-reference" }, "- -"), " reference")),
      make("div", { class: "scroll", tabindex: -1 }, make("table", { class: "comps" }, headings(axis.root), table))),
  );
  follow((state, before) => {
    if (state.recipe !== before.recipe || state.sheet !== before.sheet) {
      const recipe = state.recipe ?? state.sheet?.recipe;
      const repeats = recipe?.contrast.kind === "repeatable";
      measure.show([...(repeats ? [] : [{ value: "typical", label: "typical trial" }]), { value: "total", label: "total power" }], recipe?.measure);
      only.hidden = !repeats;
    }
    if (state.sheet !== before.sheet) show(app, table);
  });
}

/** Two rules of shrinkage belong to the total measure alone. @param {import("./types").Recipe} recipe @param {"typical" | "total"} measure */
function order(recipe, measure) {
  recipe.measure = measure;
  if (measure === "typical" && (recipe.shrink === "oas" || recipe.shrink === "ledoit-wolf")) recipe.shrink = "auto";
}

/** @param {HTMLElement} axis */
function headings(axis) {
  const cell = (/** @type {string} */ kind, /** @type {(Node | string)[]} */ ...text) => make("th", { scope: "col", class: kind }, ...text);
  return make("thead", {}, make("tr", {}, cell("", make("span", { class: "aside" }, "Component")), cell("", "Pattern"), cell("", "Spectrum"), cell("axis-cell", make("span", { class: "aside" }, "Ratio"), axis),
    cell("number", "Typical,", make("br"), "held-out"), cell("number right", "Total,", make("br"), "held-out"), cell("right", "p"), cell("right spare", "Stability"), cell("act", make("span", { class: "aside" }, "Open or close"))));
}

/** @param {App} app @param {HTMLTableSectionElement} table */
function show(app, table) {
  const { sheet } = now();
  const wanted = sheet ? ENDS.flatMap((end) => sheet[end].map((_, i) => `${end}-${i + 1}`)) : [];
  const same = wanted.length === rows.size && wanted.every((id) => rows.has(id));
  if (!same) build(app, table, wanted);
  for (const end of ENDS) (sheet?.[end] ?? []).forEach((component, i) => fill(rows.get(`${end}-${i + 1}`), component));
}

/** @param {App} app @param {HTMLTableSectionElement} table @param {string[]} wanted */
function build(app, table, wanted) {
  for (const { slots } of rows.values()) slots.forEach((slot) => slot.drop());
  openedRow.close();
  rows.clear();
  for (const id of wanted) rows.set(id, makeRow(app, id, table));
  const group = (/** @type {End} */ end) => {
    const own = wanted.filter((id) => id.startsWith(end)).flatMap((id) => rows.get(id)?.row ?? []);
    const words = end === "stronger" ? make("span", { class: "of-signal" }, "Stronger in signal") : make("span", { class: "of-reference" }, "Weaker in signal");
    return own.length ? [make("tr", { class: "end" }, make("td", { colspan: COLUMNS }, words)), ...own] : [];
  };
  table.replaceChildren(...ENDS.flatMap(group));
  if (!wanted.includes(open)) open = "";
  const row = rows.get(open) ?? rows.get(`${now().sheet?.leading}-1`) ?? rows.get(wanted[0] ?? "");
  if (row) turn(app, row, true);
}

/** @param {App} app @param {string} id @param {HTMLTableSectionElement} table @returns {Row} */
function makeRow(app, id, table) {
  const words = id.replace("stronger-", "component ").replace("weaker-", "weaker component ");
  const small = (/** @type {string} */ kind, /** @type {string} */ label, /** @type {number} */ width, /** @type {number} */ height) =>
    figureSlot(app, `${id}-${kind}`, { section: "components", label: `${label} of ${words}`, width, height });
  const slots = [small("map-small", "Pattern", 48, 48), small("spectrum-small", "Spectrum", 120, 40), small("ratio", "Held-out ratio with its interval", 210, 40)];
  const cell = (/** @type {string} */ kind) => make("td", { class: kind });
  /** @type {Record<string, HTMLElement>} */
  const cells = { typical: cell("number"), total: cell("number right"), p: cell("number right"), stability: cell("number right spare") };
  const button = make("button", { type: "button", class: "button slim", "aria-expanded": "false" }, "Open");
  const [map, spectrum, ratio] = slots.map(({ root }) => root);
  const row = make("tr", { "data-component": id }, make("th", { scope: "row" }, id.replace(/\D+/, "")), make("td", {}, map), make("td", {}, spectrum), make("td", { class: "axis-cell" }, ratio),
    cells.typical, cells.total, cells.p, cells.stability, make("td", { class: "right act" }, button));
  const made = { id, row, cells, button, slots };
  button.addEventListener("click", () => still(button, () => turn(app, made, button.getAttribute("aria-expanded") !== "true")));
  button.setAttribute("aria-label", `Open ${words}`);
  return made;
}

/** Keeps what was pressed where it is in the window while rows above it come or go. @param {HTMLElement} pressed @param {() => void} change */
function still(pressed, change) {
  const before = pressed.getBoundingClientRect().top;
  change();
  const back = () => scrollBy({ top: pressed.getBoundingClientRect().top - before, behavior: "instant" });
  back();
  requestAnimationFrame(back);
}

/** One row open at a time; the focus stays on its button. @param {App} app @param {Row} row @param {boolean} to */
function turn(app, row, to) {
  open = to ? row.id : "";
  openedRow.close();
  for (const each of rows.values()) {
    const isOpen = each.id === open;
    each.row.classList.toggle("opened", isOpen);
    each.button.setAttribute("aria-expanded", String(isOpen));
    each.button.textContent = isOpen ? "Close" : "Open";
    each.button.setAttribute("aria-label", (each.button.getAttribute("aria-label") ?? "").replace(/^\w+/, isOpen ? "Close" : "Open"));
  }
  if (to) row.row.after(openedRow.open(app, row.id, COLUMNS));
}

/** @param {Row | undefined} row @param {Component} component */
function fill(row, component) {
  if (!row) return;
  const { typical, total, p, stability, places_changed } = component;
  const untested = typical.held_out === null && total.held_out === null;
  row.row.classList.toggle("half", untested && now().phase === "working");
  // A held-out ratio on its way leaves the one before in place, in grey.
  if (row.row.classList.contains("half") && row.cells.typical?.textContent) return;
  const value = typical.held_out ?? typical.fitted;
  const held = value === null ? "–" : make("b", {}, factor(value));
  const span = value === null ? "" : typical.held_out === null ? "fitted only" : interval(typical.interval);
  row.cells.typical?.replaceChildren(held, make("br"), make("span", { class: "span" }, span));
  row.cells.total?.replaceChildren(total.held_out === null ? `${factor(total.fitted)} fitted` : factor(total.held_out));
  row.cells.p?.replaceChildren(probability(p));
  row.cells.stability?.replaceChildren(stability === null ? "–" : stability > 0.995 ? ">0.99" : stability.toFixed(2));
  row.cells.stability?.setAttribute("title", places_changed ? `changed places in ${places_changed} folds` : "");
  row.row.classList.toggle("faint", p !== null && p > 0.05);
}
