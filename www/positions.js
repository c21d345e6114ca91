/** Channels: where they lie, when names and side files do not say it: a file, a typed grid, a typed probe. */
import { isMovie } from "./carriers.js";
import { find, make } from "./kit.js";
import { numberField, picks, select, textField } from "./fields.js";
import { count, written } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Positions} Positions */
/** @typedef {{ beside: (file: File) => Promise<void>, isFile: () => boolean, failed: (thrown: unknown) => void }} Door */

const WAYS = [
  { value: "grid", label: "a grid" },
  { value: "probe", label: "a probe" },
  { value: "file", label: "a file" },
];
const CORNERS = ["top-left", "top-right", "bottom-left", "bottom-right"].map((value) => ({ value, label: value.replace("-", " ") }));
const ALONG = [{ value: "rows", label: "row by row" }, { value: "columns", label: "column by column" }];
const ENDS = [{ value: "top-down", label: "at the top" }, { value: "bottom-up", label: "at the tip" }];

/** What is typed, before it is in force. */
const typed = { rows: 8, columns: 8, spacing_mm: 10, first: "top-left", along: "rows", prefix: "", spacing_um: 50, order: "top-down" };
/** @type {"grid" | "probe" | "file"} */
let way = "grid";

/** @param {App} app @param {Door} door */
export function mountPositions(app, door) {
  const said = make("summary");
  const lead = make("p", { class: "quiet small" });
  const refused = make("p", { class: "refused", role: "status", hidden: true });
  const forms = make("div", { class: "choice place-forms" });
  const ways = picks("how the channels lie", "place-by", (value) => ((way = /** @type {typeof way} */ (value)), show()));
  const root = make("details", { class: "more places" }, said, lead, make("div", { class: "choice" }, make("span", { class: "together" }, "Place them by ", ways.root)), forms, refused);
  find("#channels .body .leave-out").before(root);

  const take = (/** @type {Positions | undefined} */ positions) => app.change((recipe) => {
    if (positions) recipe.channels.positions = positions;
    else delete recipe.channels.positions;
  });
  const place = make("button", { type: "button", class: "button", id: "place", click: () => {
    const why = lacks();
    refused.hidden = why === "";
    refused.textContent = why;
    if (!why) take(asked());
  } }, "Place the channels");
  const back = make("button", { type: "button", class: "button bare", id: "unplace", click: () => take(undefined) }, "Take it back");
  const chooser = make("input", { type: "file", class: "aside", tabindex: -1, "aria-hidden": "true", accept: ".csv,.tsv,.txt", change: () => {
    const [file] = chooser.files ?? [];
    chooser.value = "";
    if (file) void door.beside(file).catch(door.failed);
  } });
  const choose = make("button", { type: "button", class: "button", id: "positions-file", click: () => chooser.click() }, "Choose a file of positions…");

  const [grid, probe] = [gridForm(), probeForm()];
  const show = () => {
    ways.show(WAYS, way);
    const { recipe } = now();
    const set = recipe?.channels.positions;
    back.hidden = !set;
    const parts = { grid: [...grid.parts, place, back], probe: [...probe.parts, place, back], file: [choose, chooser, make("span", { class: "quiet small" }, "A table with the columns name, x, y and, on a head, z."), back] };
    forms.replaceChildren(...parts[way]);
    for (const field of [...grid.fields, ...probe.fields]) field.show();
    for (const control of root.querySelectorAll("input, select, button")) if (control !== choose && control !== chooser) control.toggleAttribute("disabled", !recipe);
    choose.disabled = !door.isFile();
  };
  follow((state, before) => {
    if (state.summary !== before.summary) refused.hidden = true;
    // A movie's pixels lie where they are.
    root.hidden = isMovie(state.summary);
    if (state.recipe === before.recipe && state.sheet === before.sheet && state.summary === before.summary) return;
    const channels = (state.sheet ?? state.summary)?.channels ?? [];
    const known = channels.filter(({ position }) => position).length;
    const told = sentence(known, channels.length);
    said.textContent = told;
    lead.textContent = known === 0 && !state.recipe?.channels.positions
      ? "Neither the names nor a side file say where the channels lie. Patterns are shown in order of size; no head is invented for them."
      : "Names and side files say where the channels lie, unless it is told here.";
    if (state.summary !== before.summary) root.open = channels.length > 0 && known === 0;
    show();
  });
}

/** Where the channels lie, in words. @param {number} known @param {number} all */
function sentence(known, all) {
  const positions = now().recipe?.channels.positions;
  const about = now().summary?.recording.about;
  const of = known === all ? `all ${count(all)}` : `${count(known)} of ${count(all)}`;
  if (positions && "grid" in positions) return `Where the channels lie: ${of} on a grid of ${positions.grid.rows} × ${positions.grid.columns}, ${written(positions.grid.spacing_mm)} mm apart`;
  if (positions && "probe" in positions) return `Where the channels lie: ${of} on a shaft, ${written(positions.probe.spacing_um)} µm apart`;
  if (positions) return `Where the channels lie: ${of}, as the recipe says`;
  if (known === 0) return "Where the channels lie: not known";
  return `Where the channels lie: ${of} ${about?.positions ? `from ${about.positions}` : "by name"}`;
}

/** What is typed, as a recipe holds it. @returns {Positions} */
function asked() {
  const prefix = typed.prefix ? { prefix: typed.prefix } : {};
  const { rows, columns, spacing_mm, first, along, spacing_um, order } = typed;
  return way === "probe" ? { probe: { spacing_um, order, ...prefix } } : { grid: { rows, columns, spacing_mm, first, along, ...prefix } };
}

/** Why what is typed cannot serve, in a few words; empty where it can. */
function lacks() {
  const { summary, recipe } = now();
  const aside = summary?.recording.about.aside ?? {};
  const names = (summary?.channels ?? []).map(({ name }) => name);
  const numbers = names.flatMap((name) => {
    if (!typed.prefix) return name in aside && !recipe?.channels.keep?.includes(name) ? [] : [0];
    const rest = name.startsWith(typed.prefix) ? /^[ _-]*(\d+)$/.exec(name.slice(typed.prefix.length))?.[1] : undefined;
    return rest === undefined ? [] : [Number(rest)];
  });
  const needs = typed.prefix ? Math.max(0, ...numbers) : numbers.length;
  if (numbers.length === 0) return `No channel is called ${typed.prefix} and a number.`;
  const places = typed.rows * typed.columns;
  if (way === "grid" && needs > places) return `${typed.rows} × ${typed.columns} are ${places} places, and the channels need ${needs}.`;
  return "";
}

/** @param {"rows" | "columns" | "spacing_mm" | "spacing_um"} key @param {string} label @param {[number, number]} range @param {boolean} whole */
function numberOf(key, label, range, whole) {
  return numberField(label, { get: () => typed[key], range: () => range, step: () => 1, set: (value) => void (typed[key] = value ?? typed[key]), refuses: (value) => (whole && !Number.isInteger(value) ? "must be a whole number" : "") });
}

function prefixField() {
  return textField({ "aria-label": "what the channels are called before their number", placeholder: "all", class: "field word" }, {
    text: () => typed.prefix,
    refuses: () => "",
    take: (text) => void (typed.prefix = text.trim()),
  });
}

/** @param {"first" | "along" | "order"} key @param {string} label @param {{ value: string, label: string }[]} options */
function oneOf(key, label, options) {
  const field = select(label, (value) => void (typed[key] = value));
  field.show(options, typed[key]);
  return field.root;
}

function gridForm() {
  const [rows, columns, spacing] = [numberOf("rows", "rows", [1, 1000], true), numberOf("columns", "columns", [1, 1000], true), numberOf("spacing_mm", "spacing in millimetres", [0.001, 1000], false)];
  const prefix = prefixField();
  const together = (/** @type {(Node | string)[]} */ ...parts) => make("span", { class: "together" }, ...parts);
  return {
    fields: [rows, columns, spacing, prefix],
    parts: [
      together(rows.field, " rows × ", columns.field, " columns, "), together(spacing.field, " mm apart, "),
      together("number 1 ", oneOf("first", "corner of number 1", CORNERS)), together("counted ", oneOf("along", "order of counting", ALONG)),
      together("channels called ", prefix.field, " and a number"),
    ],
  };
}

function probeForm() {
  const spacing = numberOf("spacing_um", "spacing in micrometres", [0.001, 1e6], false);
  const prefix = prefixField();
  const together = (/** @type {(Node | string)[]} */ ...parts) => make("span", { class: "together" }, ...parts);
  return {
    fields: [spacing, prefix],
    parts: [together(spacing.field, " µm apart, "), together("the first channel ", oneOf("order", "end of the first channel", ENDS)), together("channels called ", prefix.field, " and a number")],
  };
}
