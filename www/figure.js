/** A figure on the sheet: canvas, caption, saving, the numbers behind it, and redrawing whenever its place or the scheme changes. */
import { afterRest, eachFrame, make } from "./kit.js";
import { follow, now } from "./state.js";
import { readingOf } from "./readings.js";
import { saving } from "./save-figure.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Figure} Figure */
/** @typedef {import("./types").PlotBox} PlotBox */
/**
 * @typedef {object} Plan
 * @property {string} section whose reading says in words what the figure shows
 * @property {string} [title] caption in bold; small figures go without
 * @property {string} [hint] what can be done with it
 * @property {string} label what the figure is, for those who cannot see it
 * @property {number} [width] fixed width in CSS px; otherwise the place's own
 * @property {number} [height] fixed height in CSS px; otherwise the figure's natural one
 * @property {() => Promise<Figure | null>} [load] where the data come from; otherwise the newest sheet
 * @property {() => boolean} [wanted] whether the figure belongs to the choices in force; otherwise it stays away
 * @property {(figure: any) => boolean} [bare] whether the figure still lacks what it is about
 * @property {(figure: any) => Figure} [adjust] brings the figure's dials up to the choices, ahead of the numbers
 * @property {(box: PlotBox | null, size: { width: number, height: number }) => void} [placed] called after each drawing
 */
/**
 * @typedef {object} Slot
 * @property {string} name
 * @property {HTMLElement} root
 * @property {HTMLElement} place the positioned box around the canvas
 * @property {Plan} plan
 * @property {() => Figure | null} figure
 * @property {() => void} draw
 * @property {() => boolean} near whether it can be seen, or nearly
 * @property {() => void} forget the recording has changed: nothing of the figure holds
 * @property {() => void} refresh fetches the data again: at once where the figure can be seen, otherwise when it comes near
 * @property {() => Promise<void>} settle fetches and draws wherever the figure is
 * @property {() => void} drop forgets the figure's place on the page
 * @property {(yes: boolean) => void} comes the figure has come near the window, or left it
 */

/** @type {Set<Slot>} */
const slots = new Set();
const dark = matchMedia("(prefers-color-scheme: dark)");
let printing = false;
/** Time for drawing in one frame. */
const DRAWING_MS = 14;
/** Height of a figure that is not drawn yet, so that little moves when it comes. */
const RESERVED = 220;
/** A4 less its margins (see @page in the style sheet), in CSS px. */
const PAPER_WIDTH = 688;

/**
 * @param {App} app
 * @param {string} name the figure's name in the core
 * @param {Plan} plan
 * @returns {Slot}
 */
export function figureSlot(app, name, plan) {
  const canvas = make("canvas", { role: "img", "aria-label": plan.label, hidden: true });
  const place = make("div", { class: "drawn" }, canvas);
  place.style.minHeight = `${plan.height ?? (plan.title ? RESERVED : 0)}px`;
  const caption = plan.title ? make("div", { class: "caption" }, make("b", {}, plan.title), make("span", { class: "quiet hint" }, plan.hint ?? "")) : null;
  const root = make("figure", { class: plan.title ? "figure" : "figure small-figure", "data-figure": name }, caption, place);
  /** @type {Figure | null} */
  let figure = null;
  let [fresh, near, loading, again] = [false, false, false, false];

  const draw = () => {
    const width = plan.width ?? Math.round(place.clientWidth * onPaper(place));
    if (!figure || width < 20) return;
    const adjusted = plan.adjust ? plan.adjust(figure) : figure;
    const height = plan.height ?? app.bridge.figureHeight(adjusted, width);
    const scale = printing ? 3 : Math.max(1, devicePixelRatio);
    app.bridge.draw(canvas, adjusted, { width, height, scale, dark: dark.matches && !printing });
    canvas.hidden = false;
    place.style.minHeight = "";
    canvas.style.width = plan.width ? `${width}px` : "";
    canvas.setAttribute("aria-label", `${plan.label}. ${readingOf(plan.section)}`);
    plan.placed?.(app.bridge.plotBox(adjusted, width, height), { width, height });
  };
  const newest = async () => {
    if (plan.wanted && !plan.wanted()) return null;
    if (plan.load) return plan.load();
    const { figures, drawn } = now();
    return figures.includes(name) ? (drawn[name] ?? app.bridge.figure(name)) : null;
  };
  const load = async () => {
    if (loading) return void (again = true);
    loading = true;
    /** @type {Figure | null} */
    let loaded = null;
    try {
      do {
        again = false;
        loaded = await newest();
      } while (again);
      // While the work goes on, the figure of the choices before stays.
      if (figure && now().phase === "working" && (!loaded || plan.bare?.(loaded))) return;
      figure = loaded;
      fresh = true;
      root.hidden = !figure;
      soon(draw);
    } finally {
      loading = false;
    }
  };
  /** @type {Slot} */
  const slot = {
    name, root, place, plan, draw,
    near: () => near,
    figure: () => figure,
    forget() {
      figure = null;
      fresh = false;
      canvas.hidden = true;
    },
    refresh() {
      fresh = false;
      if (root.hidden && (plan.wanted?.() ?? true) && (plan.load || now().figures.includes(name))) root.hidden = false;
      if (near) void load().catch(() => undefined);
    },
    settle: async () => void (fresh || (await load().catch(() => undefined))),
    drop() {
      slots.delete(slot);
      near = false;
      nearby.unobserve(root);
      resized.unobserve(place);
    },
    comes(yes) {
      near = yes;
      watch(app);
      if (yes && !fresh) void load().catch(() => undefined);
    },
  };
  if (caption) caption.append(saving(app, slot));
  nearby.observe(root);
  resized.observe(place);
  slots.add(slot);
  owners.set(root, slot).set(place, slot);
  return slot;
}

/** Drawing is spread over frames, so that the page answers in between: the queue, in the order of asking. @type {Set<() => void>} */
const queue = new Set();
const pump = eachFrame(() => {
  const began = performance.now();
  for (const draw of queue) {
    queue.delete(draw);
    draw();
    if (performance.now() - began > DRAWING_MS) break;
  }
  if (queue.size) pump();
});

/** @param {() => void} draw */
function soon(draw) {
  queue.add(draw);
  pump();
}

/** @type {WeakMap<Element, Slot>} */
const owners = new WeakMap();
const nearby = new IntersectionObserver((entries) => entries.forEach(({ target, isIntersecting }) => owners.get(target)?.comes(isIntersecting)), { rootMargin: "300px" });
const resized = new ResizeObserver((entries) => entries.forEach(({ target }) => soon(owners.get(target)?.draw ?? (() => undefined))));

/** Asks for the figures near the window to come along with each sheet. @type {(app: App) => void} */
const watch = (() => {
  /** @type {App | null} */
  let asker = null;
  const ask = afterRest(() => {
    const names = [...slots].filter((slot) => slot.near() && !slot.plan.load).map(({ name }) => name);
    void asker?.bridge.watch([...new Set(names)]).catch(() => undefined);
  }, 60);
  return (app) => {
    asker = app;
    ask();
  };
})();

/** All figures of a section, or of the whole sheet. @param {string} [section] */
export function figuresOf(section) {
  return [...slots].filter(({ plan }) => !section || plan.section === section);
}

/** Fetches every figure that is not there yet, a few at a time, so that paper and screen hold the same. */
export async function settleFigures() {
  for (const slot of [...slots]) {
    await new Promise((/** @type {(value?: unknown) => void} */ done) => setTimeout(done, 30));
    if (now().phase !== "ready") return;
    await slot.settle();
  }
}

/** How much narrower a place is on paper than on the screen; what stands side by side there stands below each other here. @param {HTMLElement} place */
function onPaper(place) {
  const column = place.closest(".pair > div, .body")?.clientWidth;
  return printing && column ? PAPER_WIDTH / column : 1;
}

/** Tells every figure that the sheet has changed. */
export function refreshFigures() {
  for (const slot of slots) slot.refresh();
}

/** Redraws on a change of scheme or of pixel density, and in the light scheme for paper. */
export function mountFigures() {
  const all = () => [...slots].forEach((slot) => slot.draw());
  dark.addEventListener("change", all);
  const density = () => matchMedia(`(resolution: ${devicePixelRatio}dppx)`).addEventListener("change", () => (all(), density()), { once: true });
  density();
  const turn = (/** @type {boolean} */ on) => {
    printing = on;
    all();
  };
  follow((state, before) => {
    if (state.summary !== before.summary) for (const slot of slots) slot.forget(), slot.refresh();
    if (state.recipe !== before.recipe) for (const slot of slots) if (slot.plan.adjust) soon(slot.draw);
  });
  addEventListener("beforeprint", () => turn(true));
  addEventListener("afterprint", () => turn(false));
}
