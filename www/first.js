/** The first screen, and dropping anywhere on the page. Drop, picker and demo all end in `open`. */
import { droppedFiles } from "./files.js";
import { find } from "./kit.js";
import { combing } from "./combing.js";
import { follow } from "./state.js";

/** @typedef {{ files: (files: File[]) => void, demo: (which: string) => void, recipe: (file: File) => void }} Doors */

/** @param {Doors} doors */
export function mountFirst(doors) {
  find(".combing").replaceChildren(combing());
  const picker = /** @type {HTMLInputElement} */ (find("#recording"));
  const recipes = /** @type {HTMLInputElement} */ (find("#recipe-file"));
  for (const id of ["#choose", "#another"]) find(id).addEventListener("click", () => picker.click());
  find("#open-recipe").addEventListener("click", () => recipes.click());
  find("#drop").addEventListener("click", (event) => {
    if (event.target instanceof Element && !event.target.closest("button")) picker.click();
  });
  picker.addEventListener("change", () => take(picker, (files) => doors.files(files)));
  recipes.addEventListener("change", () => take(recipes, (files) => files[0] && doors.recipe(files[0])));
  for (const button of document.querySelectorAll("button[data-demo]"))
    button.addEventListener("click", () => doors.demo(button.getAttribute("data-demo") ?? ""));
  acceptDrops(doors);
  follow(({ phase, summary }) => {
    find("#first").hidden = summary !== null;
    document.documentElement.dataset.state = phase;
  });
}

/**
 * Empties the input after taking its files, so that the same file can be chosen again.
 * @param {HTMLInputElement} input
 * @param {(files: File[]) => void} use
 */
function take(input, use) {
  const files = [...(input.files ?? [])];
  input.value = "";
  if (files.length) use(files);
}

/** @param {Doors} doors */
function acceptDrops(doors) {
  let depth = 0;
  const over = (/** @type {number} */ change) => {
    depth = Math.max(0, depth + change);
    document.body.classList.toggle("over", depth > 0);
  };
  addEventListener("dragenter", () => over(1));
  addEventListener("dragleave", () => over(-1));
  addEventListener("dragover", (event) => event.preventDefault());
  addEventListener("drop", (event) => {
    event.preventDefault();
    over(-depth);
    if (event.dataTransfer) void droppedFiles(event.dataTransfer).then((files) => files.length && doors.files(files));
  });
}
