/** Saved filters on the recording that is open: nothing is fitted, so what they separate here they have never seen. */
import { figureSlot } from "./figure.js";
import { download, find, make } from "./kit.js";
import { asProblem } from "./notices.js";
import { factor, interval } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").CarriedTold} CarriedTold */

/** @param {App} app */
export function mountCarried(app) {
  const section = find("#carried");
  const body = find(".body", section);
  /** @type {{ name: string, text: string } | null} */
  let weights = null;
  let asked = "";

  const close = () => {
    weights = null;
    section.hidden = true;
    body.replaceChildren();
  };
  const aside = () => make("button", { type: "button", class: "button bare", click: close }, "Set them aside");

  follow((state, before) => {
    if (state.recipe !== before.recipe || state.summary !== before.summary || state.phase !== before.phase) void look();
  });

  async function look() {
    const { summary, recipe, phase } = now();
    if (!weights) return;
    section.hidden = false;
    if (!summary || !recipe) {
      asked = "";
      return body.replaceChildren(make("p", {}, make("b", {}, make("bdi", {}, weights.name)), " holds saved filters. Drop a recording of the same montage: they are applied as they are, around the windows that you choose."), make("p", { class: "acts" }, aside()));
    }
    if (phase === "reading" || phase === "error") return;
    const question = JSON.stringify([summary.recording.name, summary.recording.duration_s, recipe.contrast, recipe.evidence]);
    if (question === asked) return;
    asked = question;
    try {
      const told = await app.bridge.carry(weights.text, structuredClone(recipe));
      if (question === asked) show(told);
    } catch (thrown) {
      if (question !== asked) return;
      const { what, place, expected, found, advice } = asProblem(thrown);
      body.replaceChildren(make("p", {}, make("b", {}, "The saved filters do not fit this recording: "), `${what}.`), make("p", { class: "where" }, [place, expected && `expected ${expected}`, found && `found ${found}`].filter(Boolean).join(": ")), make("p", {}, `${advice}.`), make("p", { class: "acts" }, aside()));
    }
  }

  /** @param {CarriedTold} told */
  function show(told) {
    const row = (/** @type {CarriedTold["rows"][number]} */ one) => make("tr", {},
      make("th", { scope: "row" }, one.name),
      make("td", { class: "right" }, `${factor(one.before)} ${one.before_held_out ? "held-out" : "fitted"}`),
      make("td", { class: "right" }, make("b", {}, factor(one.typical)), one.interval ? ` ${interval(one.interval)}` : ""),
      make("td", { class: "right" }, factor(one.total)),
      make("td", { class: "right" }, `${one.windows[0]} + ${one.windows[1]}`));
    const head = ["component", "where it was fitted", "here, typical trial", "here, total power", "windows"];
    const figures = told.figures.map(([name, caption, figure]) => figureSlot(app, `carried-${name}`, { section: "carried", title: caption, label: caption, load: () => Promise.resolve(figure) }).root);
    body.replaceChildren(
      make("p", { class: "say" }, told.rows.slice(0, 1).map(({ reading }) => reading).join(" ")),
      ...told.rows.filter(({ name }) => name === "weaker 1").map(({ reading }) => make("p", {}, reading)),
      ...told.notes.map((note) => make("p", { class: "quiet" }, make("bdi", {}, note))),
      make("div", { class: "scroll", tabindex: 0, role: "region", "aria-label": "One row a component" }, make("table", { class: "comps many-rows" }, make("thead", {}, make("tr", {}, ...head.map((text, k) => make("th", { scope: "col", class: k ? "right" : "" }, text)))), make("tbody", {}, ...told.rows.map(row)))),
      make("p", { class: "acts" }, make("button", { type: "button", class: "button slim", click: () => download("series.csv", told.csv, "text/csv") }, "Take their time courses"), aside()),
      make("div", { class: "group-figures" }, ...figures),
    );
  }

  return {
    /** @param {string} name @param {string} text */
    take(name, text) {
      weights = { name, text };
      asked = "";
      void look();
    },
  };
}
