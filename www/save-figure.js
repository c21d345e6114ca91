/** Saving a figure: SVG and PNG in the light scheme, and the numbers behind it. */
import { download, make } from "./kit.js";
import { csv } from "./tables.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Figure} Figure */

/** Width of a saved figure in CSS px, unless a width in millimetres is asked for. */
const WIDTH = 888;
const MM_PER_INCH = 25.4;
/** CSS px in a millimetre: 96 in an inch. */
const PX_PER_MM = 96 / MM_PER_INCH;
/** What figures are saved as; one choice for all of them. */
const chosen = { mm: 170, dpi: 300, clear: false };

/**
 * The menu beside a caption.
 * @param {App} app
 * @param {{ name: string, plan: { title?: string }, figure: () => Figure | null }} slot
 */
export function saving(app, slot) {
  const asSvg = (/** @type {Figure} */ figure) => download(`${slot.name}.svg`, sizedSvg(app, figure), "image/svg+xml");
  const asPng = async (/** @type {Figure} */ figure) => download(`${slot.name}.png`, new Uint8Array(await sizedPng(app, figure)), "image/png");
  const asCsv = (/** @type {Figure} */ figure) => download(`${slot.name}.csv`, csv(app.bridge.table(figure)), "text/csv");
  const button = (/** @type {string} */ label, /** @type {(figure: Figure) => void} */ act) =>
    make("button", { type: "button", class: "button slim", click: () => {
      const figure = slot.figure();
      if (figure) act(figure);
      menu.open = false;
    } }, label);
  const number = (/** @type {"mm" | "dpi"} */ key, /** @type {number} */ least, /** @type {number} */ most, /** @type {string} */ what) => {
    const field = make("input", { class: "field", type: "number", min: least, max: most, "aria-label": what, change: () => {
      const value = Number(field.value);
      if (value >= least && value <= most) chosen[key] = value;
      field.value = String(chosen[key]);
    } });
    return field;
  };
  const [mm, dpi] = [number("mm", 40, 400, "Width in millimetres"), number("dpi", 72, 600, "Dots per inch of the PNG")];
  const clear = make("input", { type: "checkbox", change: () => void (chosen.clear = clear.checked) });
  const menu = make("details", { class: "save", toggle: () => {
    mm.value = String(chosen.mm);
    dpi.value = String(chosen.dpi);
    clear.checked = chosen.clear;
  } },
    make("summary", {}, "Save figure", make("span", { class: "aside" }, `: ${slot.plan.title}`)),
    make("div", { class: "sheet-of" },
      make("p", {}, button("SVG", asSvg), button("PNG", asPng), button("Numbers", asCsv)),
      make("p", { class: "how" }, make("label", {}, mm, " mm wide"), make("label", {}, dpi, " dpi"), make("label", { class: "tick" }, clear, "no ground"))));
  menu.addEventListener("keydown", (event) => event.key === "Escape" && (menu.open = false));
  menu.addEventListener("focusout", (event) => {
    if (!menu.contains(/** @type {Node | null} */ (event.relatedTarget)) && event.relatedTarget) menu.open = false;
  });
  return menu;
}

/** An SVG of the chosen width, its text at the size it is read at. @param {App} app @param {Figure} figure */
function sizedSvg(app, figure) {
  const width = Math.round(chosen.mm * PX_PER_MM);
  const height = app.bridge.figureHeight(figure, width);
  const text = app.bridge.svg(figure, width, height).replace(`width="${width}" height="${height}"`, `width="${chosen.mm}mm" height="${((height / width) * chosen.mm).toFixed(2)}mm"`);
  // The first surface is the ground.
  return chosen.clear ? text.replace(/<rect [^>]*\/>\n?/, "") : text;
}

/** A PNG of the chosen width and density, which it says itself. @param {App} app @param {Figure} figure */
async function sizedPng(app, figure) {
  const width = Math.round(chosen.mm * PX_PER_MM);
  return withDensity(new Uint8Array(await pngBytes(app, figure, { width, scale: chosen.dpi / 96, clear: chosen.clear })), chosen.dpi);
}

/**
 * A PNG of a figure for files: light, two pixels to a CSS pixel unless told otherwise.
 * @param {App} app
 * @param {Figure} figure
 * @param {{ width: number, scale: number, clear: boolean }} [as]
 */
export async function pngBytes(app, figure, { width, scale, clear } = { width: WIDTH, scale: 2, clear: false }) {
  const canvas = make("canvas");
  app.bridge.draw(canvas, figure, { width, height: app.bridge.figureHeight(figure, width), scale, dark: false });
  const pen = canvas.getContext("2d");
  if (pen && !clear) {
    pen.resetTransform();
    pen.globalCompositeOperation = "destination-over";
    pen.fillStyle = "#fff";
    pen.fillRect(0, 0, canvas.width, canvas.height);
  }
  const blob = await new Promise((/** @type {(blob: Blob | null) => void} */ done) => canvas.toBlob(done, "image/png"));
  return blob ? blob.arrayBuffer() : new ArrayBuffer(0);
}

/**
 * Puts the density into a PNG: a pHYs chunk (pixels a metre) after its header chunk (PNG specification, section 11.3.5.3).
 * @param {Uint8Array<ArrayBuffer>} png
 * @param {number} dpi
 */
export function withDensity(png, dpi) {
  const header = 33;
  if (png.length < header) return png;
  const chunk = new Uint8Array(21);
  const view = new DataView(chunk.buffer);
  const perMetre = Math.round((dpi / MM_PER_INCH) * 1000);
  view.setUint32(0, 9);
  chunk.set([0x70, 0x48, 0x59, 0x73], 4);
  view.setUint32(8, perMetre);
  view.setUint32(12, perMetre);
  chunk[16] = 1;
  view.setUint32(17, crc(chunk.subarray(4, 17)));
  const out = new Uint8Array(png.length + chunk.length);
  out.set(png.subarray(0, header));
  out.set(chunk, header);
  out.set(png.subarray(header), header + chunk.length);
  return out;
}

/** CRC-32 as PNG uses it (ISO 3309). @param {Uint8Array} bytes */
function crc(bytes) {
  let value = 0xffffffff;
  for (const byte of bytes) {
    value ^= byte;
    for (let bit = 0; bit < 8; bit += 1) value = value & 1 ? (value >>> 1) ^ 0xedb88320 : value >>> 1;
  }
  return (value ^ 0xffffffff) >>> 0;
}
