/** Doubtful channels: what speaks against each, and what is to become of it. Nothing is left out by itself. */
import { make } from "./kit.js";
import { picks } from "./fields.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {"keep" | "leave_out" | "interpolate"} Fate */

/** @type {[Fate, string][]} */
const FATES = [["keep", "keep"], ["leave_out", "leave out"], ["interpolate", "interpolate"]];

/** @param {App} app */
export function proposals(app) {
  const list = make("ul", { class: "proposals" });
  const all = make("button", { type: "button", class: "button slim", click: () => takeAll(app) }, "Take all proposals");
  const back = make("button", { type: "button", class: "button slim bare", hidden: true, click: () => undo(app) }, "Undo");
  const said = make("span", { class: "quiet" });
  const root = make("div", { class: "more proposed", role: "group", "aria-label": "Channels in doubt", hidden: true },
    make("div", { class: "caption" }, make("h3", {}, "Channels in doubt"), said, all, back), list);
  /** The choices before everything was taken. @type {Recipe["channels"] | null} */
  let before = null;

  /** @param {App} app */
  function takeAll(app) {
    before = structuredClone(now().recipe?.channels ?? null);
    app.change((recipe) => doubtful().filter(({ name }) => !fateOf(recipe, name)).forEach(({ name }) => settle(recipe, name, "leave_out")));
    back.focus();
  }
  /** @param {App} app */
  function undo(app) {
    const channels = before;
    before = null;
    if (channels) app.change((recipe) => void (recipe.channels = { ...channels, reference: recipe.channels.reference }));
    all.focus();
  }
  /** @type {Map<string, ReturnType<typeof picks>>} */
  const rows = new Map();
  const show = () => {
    const doubts = doubtful();
    const { recipe } = now();
    root.hidden = doubts.length === 0;
    const names = doubts.map(({ name }) => name);
    if (names.join("\n") !== [...rows.keys()].join("\n")) {
      rows.clear();
      list.replaceChildren(...doubts.map((channel, i) => {
        const row = picks(`What becomes of ${channel.name}`, `fate-${i}`, (value) => app.change((recipe) => settle(recipe, channel.name, /** @type {Fate} */ (value))));
        rows.set(channel.name, row);
        return make("li", {}, make("b", {}, channel.name), make("span", {}, channel.doubts.map(({ reason }) => reason).join("; ")), row.root);
      }));
    }
    for (const [name, row] of rows) {
      const placed = now().summary?.channels.find((card) => card.name === name)?.position;
      const options = FATES.filter(([fate]) => fate !== "interpolate" || placed).map(([value, label]) => ({ value, label }));
      row.show(options, recipe ? fateOf(recipe, name) : undefined);
    }
    const open = recipe ? doubts.filter(({ name }) => !fateOf(recipe, name)).length : 0;
    said.textContent = open ? `${open === doubts.length ? "all" : `${open} of ${doubts.length}`} in use as ${open === 1 ? "it is" : "they are"}; the proposal is to leave ${open === 1 ? "it" : "them"} out` : "all decided";
    all.hidden = open === 0;
    back.hidden = before === null;
  };
  follow((state, old) => {
    if (state.summary !== old.summary) before = null;
    if (state.recipe !== old.recipe || state.sheet !== old.sheet || state.summary !== old.summary) show();
  });
  return root;
}

function doubtful() {
  return (now().sheet?.quality?.channels ?? []).filter(({ doubts }) => doubts.length > 0);
}

/** @param {Recipe} recipe @param {string} name @returns {Fate | undefined} */
export function fateOf({ channels }, name) {
  return FATES.map(([fate]) => fate).find((fate) => channels[fate]?.includes(name));
}

/** @param {Recipe} recipe @param {string} name @param {Fate | null} fate */
export function settle({ channels }, name, fate) {
  for (const [other] of FATES) channels[other] = (channels[other] ?? []).filter((one) => one !== name);
  if (fate) channels[fate] = [...(channels[fate] ?? []), name];
  if (!channels.keep?.length) delete channels.keep;
}
