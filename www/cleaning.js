/** The recording without some components, or with nothing but them: what it would do, and the files. */
import { figureSlot } from "./figure.js";
import { download, find, make } from "./kit.js";
import { asProblem } from "./notices.js";
import { hasResults } from "./leading.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").CleanLook} CleanLook */

/** Seconds before and after the first trial that are shown. */
const [BEFORE_S, SHOWN_S] = [1, 4];

/** @param {App} app */
export function mountCleaning(app) {
  const root = make("details", { class: "cleaning" });
  const boxes = make("span", { class: "picks-many" });
  const how = make("select", { class: "field", "aria-label": "What is done with them", change: () => void look() },
    make("option", { value: "remove" }, "taken out"), make("option", { value: "keep-only" }, "kept, and all else taken out"));
  const said = make("p", { class: "but-plain", role: "status" });
  const pictures = make("div", { class: "halves" });
  const shares = make("div", { class: "scroll", tabindex: 0, role: "region", "aria-label": "Share of the variance removed, channel by channel" });
  const take = (/** @type {"edf" | "npy" | "csv"} */ form, /** @type {string} */ label, /** @type {string} */ type) =>
    make("button", { type: "button", class: "button slim", "data-clean": form, click: () => void save(form, type).catch(say) }, label);
  root.append(
    make("summary", {}, "Cleaned recording"),
    make("div", { class: "choice" }, boxes, " ", how),
    said, pictures, shares,
    make("p", { class: "acts" }, take("edf", "Take EDF+", "application/octet-stream"), take("npy", "Take NPY", "application/octet-stream"), take("csv", "Take the shares", "text/csv")),
    make("p", { class: "quiet small" }, "X − A WᵀX in the prepared channels, at the prepared rate, with the filters and the reference of this sheet. EDF+ rounds to 16 bits and says in its header what was done; NPY (channels × samples) does not round."),
  );
  root.addEventListener("toggle", () => root.open && void look());
  find("#take-away .body").append(root);

  let shown = "";
  follow((state, before) => {
    if (state.sheet === before.sheet && state.phase === before.phase) return;
    root.hidden = !hasResults(state.sheet);
    const names = [...(state.sheet?.stronger ?? []).map((_, k) => `stronger ${k + 1}`), ...(state.sheet?.weaker ?? []).map((_, k) => `weaker ${k + 1}`)];
    if (names.join() !== shown) {
      shown = names.join();
      boxes.replaceChildren(...names.map((name, k) => make("label", { class: "tick" }, make("input", { type: "checkbox", value: name, checked: k === 0, change: () => void look() }), ` ${name}`)));
    }
    if (state.phase === "ready" && root.open) void look();
  });

  const chosen = () => [...boxes.querySelectorAll("input")].filter(({ checked }) => checked).map(({ value }) => value);
  const way = () => /** @type {"remove" | "keep-only"} */ (how.value);
  const say = (/** @type {unknown} */ thrown) => {
    const { what, advice } = asProblem(thrown);
    said.textContent = `${what}: ${advice}`;
    pictures.replaceChildren();
    shares.replaceChildren();
  };

  let turn = 0;
  async function look() {
    turn += 1;
    const mine = turn;
    if (!root.open || now().phase !== "ready") return;
    const from = Math.max(0, (now().sheet?.windows?.trials.find(({ dropped }) => !dropped)?.onset_s ?? BEFORE_S) - BEFORE_S);
    try {
      const found = await app.bridge.cleanLook(chosen(), way(), from, SHOWN_S);
      if (mine === turn) show(found);
    } catch (thrown) {
      if (mine === turn) say(thrown);
    }
  }

  /** @param {CleanLook} found */
  function show(found) {
    const most = Math.max(...found.shares.removed);
    const at = found.shares.channels[found.shares.removed.indexOf(most)] ?? "";
    said.textContent = `${found.note} Most of the variance goes at ${at}: ${percent(most)}. ${found.others < 1e-4 ? "The other components stay as they are." : `The other components change by up to ${percent(found.others)} of their size: by the total measure components overlap.`}`;
    const slot = (/** @type {string} */ name, /** @type {string} */ title, /** @type {import("./types").Figure} */ figure) =>
      figureSlot(app, name, { section: "take-away", title, hint: "the six channels that change most", label: title, load: () => Promise.resolve(figure) }).root;
    pictures.replaceChildren(slot("cleaned-before", "Before", found.before), slot("cleaned-after", "After", found.after));
    shares.replaceChildren(table(found.shares));
  }

  /** @param {"edf" | "npy" | "csv"} form @param {string} type */
  async function save(form, type) {
    const bytes = await app.bridge.cleaned(chosen(), way(), form);
    const stem = (now().summary?.recording.name ?? "recording").replace(/\.[^.]*$/, "");
    download(form === "csv" ? "cleaned.csv" : `${stem}-cleaned.${form}`, new Uint8Array(bytes), type);
  }
}

/** @param {CleanLook["shares"]} shares */
function table({ channels, before, after, removed, unit }) {
  const order = channels.map((_, k) => k).sort((a, b) => Number(removed[b]) - Number(removed[a]));
  const row = (/** @type {number} */ k) => {
    const share = Number(removed[k]);
    const bar = make("i");
    bar.style.width = `${(100 * Math.min(1, Math.abs(share))).toFixed(1)}%`;
    return make("tr", {}, make("th", { scope: "row" }, make("bdi", {}, channels[k] ?? "")), make("td", {}, make("span", { class: share < 0 ? "share grew" : "share" }, bar)), make("td", { class: "right" }, percent(share)), make("td", { class: "right" }, Number(before[k]).toPrecision(3)), make("td", { class: "right" }, Number(after[k]).toPrecision(3)));
  };
  const head = ["channel", "share of the variance removed", "", `SD before, ${unit || "mixed units"}`, "SD after"];
  return make("table", { class: "comps shares" }, make("thead", {}, make("tr", {}, ...head.map((text) => make("th", { scope: "col" }, text)))), make("tbody", {}, ...order.map(row)));
}

/** @param {number} share */
const percent = (share) => `${(100 * share).toFixed(Math.abs(share) < 0.1 ? 1 : 0).replace("-", "−")} %`;
