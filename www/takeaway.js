/** Take-away: files, the link, the methods paragraph. */
import { download, find } from "./kit.js";
import { figuresOf } from "./figure.js";
import { hasResults } from "./leading.js";
import { size } from "./numbers.js";
import { pngBytes } from "./save-figure.js";
import { linkName, linkTo, nameLink } from "./recipe-link.js";
import { follow, now, put } from "./state.js";

/** @typedef {import("./types").App} App */

/** @type {Record<string, [string, string]>} */
const FILES = {
  "weights-json": ["weights.json", "application/json"], "weights-csv": ["weights.csv", "text/csv"], "results-json": ["results.json", "application/json"],
  recipe: ["recipe.json", "application/json"], report: ["report.html", "text/html"], everything: ["teasel.zip", "application/zip"],
  "trials-csv": ["trials.csv", "text/csv"], "series-csv": ["series.csv", "text/csv"], "series-npy": ["series.npy", "application/octet-stream"], "series-edf": ["series.edf", "application/octet-stream"],
  methods: ["methods.txt", "text/plain"], bibtex: ["references.bib", "text/plain"],
};

/** Parts of the table's rows; the same things come large. */
const SMALL = /-small$|-ratio$|^ratio-axis$/;

/** @param {App} app @param {(thrown: unknown) => void} failed */
export function mountTakeaway(app, failed) {
  for (const button of document.querySelectorAll("button[data-takeaway]"))
    button.addEventListener("click", () => void take(app, /** @type {HTMLButtonElement} */ (button)).catch(failed));
  find("#copy-link").addEventListener("click", (event) => copy(event, find("#link").textContent ?? ""));
  find("#copy-methods").addEventListener("click", (event) => copy(event, find("#methods").textContent ?? ""));
  find("#with-names").addEventListener("change", () => showLink(app));
  const named = /** @type {HTMLInputElement} */ (find("#link-name"));
  named.value = linkName();
  named.addEventListener("input", () => {
    nameLink(named.value);
    showLink(app);
  });
  follow((state, before) => {
    if (state.recipe !== before.recipe) showLink(app);
    if (state.sheet !== before.sheet) for (const place of document.querySelectorAll("[data-size]")) place.textContent = "";
    if (state.phase !== before.phase && state.phase === "ready") void showMethods(app);
    const whole = hasResults(state.sheet) && !state.stale;
    for (const button of document.querySelectorAll("button[data-takeaway]")) {
      const needs = button.getAttribute("data-takeaway") === "recipe" ? Boolean(state.recipe) : whole;
      /** @type {HTMLButtonElement} */ (button).disabled = !needs;
    }
  });
}

/** @param {App} app @param {HTMLButtonElement} button */
async function take(app, button) {
  const kind = button.getAttribute("data-takeaway") ?? "";
  const [name, type] = FILES[kind] ?? [kind, "application/octet-stream"];
  const bytes = await app.bridge.takeaway(kind, kind === "everything" ? await pictures(app) : []);
  const stem = (now().summary?.recording.name ?? "recording").replace(/\.[^.]*$/, "");
  download(kind === "everything" ? `${stem}-teasel.zip` : name, new Uint8Array(bytes), type);
  const place = document.querySelector(`[data-size="${kind}"]`);
  if (place) place.textContent = size(bytes.length);
  put({ taken: now().taken + 1 });
}

/** @param {App} app */
async function showMethods(app) {
  const text = await app.bridge.takeaway("methods").then((bytes) => new TextDecoder().decode(bytes), () => "");
  find(".methods-out").hidden = text === "";
  find("#methods").textContent = text;
}

/** Every figure of the sheet as PNG; the core adds the SVG files itself. @param {App} app */
async function pictures(app) {
  const made = [];
  for (const name of now().figures.filter((one) => !SMALL.test(one))) {
    const shown = figuresOf().find((slot) => slot.name === name)?.figure();
    const figure = shown ?? (await app.bridge.figure(name));
    if (figure) made.push({ name: `figures/${name}.png`, bytes: new Uint8Array(await pngBytes(app, figure)) });
  }
  return made;
}

/** @param {App} app */
function showLink(app) {
  const { recipe } = now();
  if (!recipe) return;
  const names = /** @type {HTMLInputElement} */ (find("#with-names")).checked;
  find("#link").textContent = `${location.href.replace(/#.*$/, "")}${linkTo(app.bridge, recipe, names)}`;
}

/** @param {Event} event @param {string} text */
async function copy(event, text) {
  const button = /** @type {HTMLButtonElement} */ (event.currentTarget);
  const [word] = button.childNodes;
  if (!word) return;
  try {
    await navigator.clipboard.writeText(text);
    word.textContent = "Copied";
  } catch {
    word.textContent = selectText(button) ? "Selected: press Ctrl C" : "Copy";
  }
  setTimeout(() => void (word.textContent = "Copy"), 2500);
}

/** Where the clipboard is closed to the page, marks the text for the user's own copying. @param {HTMLButtonElement} button */
function selectText(button) {
  const text = button.id === "copy-link" ? find("#link") : find("#methods");
  getSelection()?.selectAllChildren(text);
  return getSelection()?.isCollapsed === false;
}
