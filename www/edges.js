/** Edges that are dragged over a plot, or moved by the arrow keys: typing, dragging and arrows do the same thing. */
import { make } from "./kit.js";

/** @typedef {import("./types").PlotBox} PlotBox */
/**
 * @typedef {object} EdgePlan
 * @property {string} kind class of its colour
 * @property {string} label
 * @property {() => number} value in data units
 * @property {() => [number, number]} limits
 * @property {() => number} step one sample
 * @property {(value: number) => string} text what a screen reader says
 * @property {(value: number) => void} set
 * @property {(yes: boolean) => void} held called when a drag begins and ends
 */

/** Below the axis, above the values, which the figure writes itself. */
const ROOM_BELOW = 32;
/** Grips nearer than this to each other move apart, so that each can be hit; the lines that the figure draws stay. */
const GRIP_ROOM = matchMedia("(pointer: coarse)").matches ? 46 : 26;

/**
 * Lays edges over a figure's plot and keeps them there.
 * @param {HTMLElement} place the positioned box around the canvas
 * @param {EdgePlan[]} plans
 */
export function edgesOver(place, plans) {
  /** @type {PlotBox | null} */
  let box = null;
  const nodes = plans.map((plan) => {
    const node = make("div", { class: `edge ${plan.kind}`, role: "slider", tabindex: 0, "aria-label": plan.label, "aria-orientation": "horizontal" }, make("span", { class: "grip" }));
    keys(node, plan);
    drag(node, plan, () => box, place);
    place.append(node);
    return { node, plan };
  });

  const lay = () => {
    for (const { node, plan } of nodes) {
      const [value, [low, high]] = [plan.value(), plan.limits()];
      node.hidden = !box;
      node.setAttribute("aria-valuenow", String(value));
      node.setAttribute("aria-valuemin", String(low));
      node.setAttribute("aria-valuemax", String(high));
      node.setAttribute("aria-valuetext", plan.text(value));
      if (!box) continue;
      node.style.top = `${box.top}px`;
      node.style.height = `${box.bottom - box.top + ROOM_BELOW}px`;
    }
    const plot = box;
    if (plot) apart(nodes.map(({ node, plan }) => ({ node, x: across(plot, plan.value()) })));
  };
  return {
    lay,
    /** @param {PlotBox | null} at */
    over(at) {
      box = at;
      lay();
    },
  };
}

/** @param {PlotBox} box @param {number} value */
function across(box, value) {
  const x = box.left + ((value - box.x0) / (box.x1 - box.x0)) * (box.right - box.left);
  return Math.max(box.left, Math.min(box.right, x));
}

/** Places the edges; where two stand close together, their grips make room for each other. @param {{ node: HTMLElement, x: number }[]} edges */
function apart(edges) {
  const order = edges.map((edge, i) => ({ ...edge, i })).sort((a, b) => a.x - b.x || a.i - b.i);
  const at = order.map(({ x }) => x);
  for (let round = 0; round < 8; round += 1)
    for (let k = 1; k < at.length; k += 1) {
      const lack = GRIP_ROOM - (Number(at[k]) - Number(at[k - 1]));
      if (lack > 0) (at[k - 1] = Number(at[k - 1]) - lack / 2), (at[k] = Number(at[k]) + lack / 2);
    }
  order.forEach(({ node }, k) => (node.style.left = `${at[k]}px`));
}

/** Arrows one step, Shift ten, Home and End the limits. @param {KeyboardEvent} event @param {number} value @param {number} step @param {[number, number]} limits */
export function keyed(event, value, step, [low, high]) {
  const far = event.shiftKey ? 10 : 1;
  /** @type {Record<string, number>} */
  const to = { ArrowLeft: value - step * far, ArrowDown: value - step * far, ArrowRight: value + step * far, ArrowUp: value + step * far, PageDown: value - step * 10, PageUp: value + step * 10, Home: low, End: high };
  const next = to[event.key];
  return next === undefined || event.altKey || event.ctrlKey || event.metaKey ? null : Math.max(low, Math.min(high, next));
}

/** @param {HTMLElement} node @param {EdgePlan} plan */
function keys(node, plan) {
  node.addEventListener("keydown", (event) => {
    const next = keyed(event, plan.value(), plan.step(), plan.limits());
    if (next === null) return;
    event.preventDefault();
    plan.set(next);
  });
}

/** @param {HTMLElement} node @param {EdgePlan} plan @param {() => PlotBox | null} boxNow @param {HTMLElement} place */
function drag(node, plan, boxNow, place) {
  node.addEventListener("pointerdown", (down) => {
    /** Scale and limits hold still for the length of the drag, even if the plot is redrawn under it. */
    const box = boxNow();
    const [low, high] = plan.limits();
    if (!box || down.button !== 0) return;
    down.preventDefault();
    node.focus({ preventScroll: true });
    node.setPointerCapture(down.pointerId);
    plan.held(true);
    const grabbed = down.clientX - place.getBoundingClientRect().left - across(box, plan.value());
    const move = (/** @type {PointerEvent} */ at) => {
      const x = at.clientX - place.getBoundingClientRect().left - grabbed;
      const value = box.x0 + ((x - box.left) / (box.right - box.left)) * (box.x1 - box.x0);
      plan.set(Math.max(low, Math.min(high, value)));
    };
    const done = () => {
      plan.held(false);
      node.removeEventListener("pointermove", move);
      node.removeEventListener("lostpointercapture", done);
    };
    node.addEventListener("pointermove", move);
    node.addEventListener("lostpointercapture", done);
  });
}
