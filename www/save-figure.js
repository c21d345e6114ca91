/** Saving a figure: SVG and PNG in the light scheme, and the numbers behind it. */
import { download, make } from "./kit.js";
import { csv } from "./tables.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Figure} Figure */

/** Width of a saved figure in CSS px. */
const WIDTH = 888;

/**
 * The menu beside a caption.
 * @param {App} app
 * @param {{ name: string, plan: { title?: string }, figure: () => Figure | null }} slot
 */
export function saving(app, slot) {
  const size = (/** @type {Figure} */ figure) => ({ width: WIDTH, height: app.bridge.figureHeight(figure, WIDTH) });
  const asSvg = (/** @type {Figure} */ figure) => download(`${slot.name}.svg`, app.bridge.svg(figure, WIDTH, size(figure).height), "image/svg+xml");
  const asPng = async (/** @type {Figure} */ figure) => download(`${slot.name}.png`, new Uint8Array(await pngBytes(app, figure)), "image/png");
  const asCsv = (/** @type {Figure} */ figure) => download(`${slot.name}.csv`, csv(app.bridge.table(figure)), "text/csv");
  const button = (/** @type {string} */ label, /** @type {(figure: Figure) => void} */ act) =>
    make("button", { type: "button", class: "button slim", click: () => {
      const figure = slot.figure();
      if (figure) act(figure);
      menu.open = false;
    } }, label);
  const menu = make("details", { class: "save" },
    make("summary", {}, "Save figure", make("span", { class: "aside" }, `: ${slot.plan.title}`)),
    make("p", {}, button("SVG", asSvg), button("PNG", asPng), button("Numbers", asCsv)));
  menu.addEventListener("keydown", (event) => event.key === "Escape" && (menu.open = false));
  menu.addEventListener("focusout", (event) => {
    if (!menu.contains(/** @type {Node | null} */ (event.relatedTarget)) && event.relatedTarget) menu.open = false;
  });
  return menu;
}

/**
 * A PNG of a figure for files: light, two pixels to a CSS pixel.
 * @param {App} app
 * @param {Figure} figure
 */
export async function pngBytes(app, figure) {
  const canvas = make("canvas");
  app.bridge.draw(canvas, figure, { width: WIDTH, height: app.bridge.figureHeight(figure, WIDTH), scale: 2, dark: false });
  const blob = await new Promise((/** @type {(blob: Blob | null) => void} */ done) => canvas.toBlob(done, "image/png"));
  return blob ? blob.arrayBuffer() : new ArrayBuffer(0);
}
