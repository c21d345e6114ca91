/** Channels and rank after each step of the preparation, folded away. */
import { make } from "./kit.js";
import { follow } from "./state.js";

/** @type {Record<string, string>} */
const STEPS = { recorded: "as recorded", "leave-out": "channels left out", interpolate: "interpolated", reference: "referred", filter: "filtered, in windows" };

export function ranks() {
  const rows = make("tbody");
  const summary = make("summary", {}, "Rank after each step");
  const root = make("details", { class: "more", id: "ranks", hidden: true }, summary,
    make("p", { class: "quiet small" }, "The rank is how many dimensions the channels span; no more than that can be kept."),
    make("div", { class: "scroll" }, make("table", { class: "limits" }, make("thead", {}, make("tr", {}, ...["step", "channels", "rank", "why"].map((name) => make("th", { scope: "col" }, name)))), rows)));
  follow((state, before) => {
    if (state.sheet === before.sheet) return;
    const steps = state.sheet?.preparation?.ranks ?? [];
    root.hidden = steps.length === 0;
    const last = steps[steps.length - 1];
    if (!last) return;
    summary.textContent = `Rank after each step: ${steps.map(({ rank }) => rank).join(" → ")}`;
    rows.replaceChildren(...steps.map(({ step, channels, rank, why }) => make("tr", {}, make("th", { scope: "row" }, STEPS[step] ?? step), make("td", {}, String(channels)), make("td", {}, make("b", {}, String(rank))), make("td", { class: "quiet" }, why))));
  });
  return root;
}
