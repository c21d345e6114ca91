/** Evidence: what else one could have used, what chance does, and every held-out trial in order of time. */
import { find, make } from "./kit.js";
import { numberField, select } from "./fields.js";
import { figureSlot } from "./figure.js";
import { looksAndLock } from "./looks.js";
import { count } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */

/** @param {App} app @param {() => void} goOn */
export function mountEvidence(app, goOn) {
  const body = find("#evidence .body");
  const beside = figureSlot(app, "beside", { section: "evidence", title: "Beside it", hint: "the same held-out windows", label: "Held-out ratio of the leading component beside principal components and single channels" }).root;
  const alike = figureSlot(app, "alike", { section: "evidence", title: "If the sides were alike", hint: "", label: "Largest fitted ratio of every permuted arrangement, with the observed ones" }).root;
  const weaker = figureSlot(app, "alike-weaker", { section: "evidence", title: "The same, weaker end", hint: "", label: "Smallest fitted ratio of every permuted arrangement, with the observed ones" }).root;
  const choices = moreChoices(app);
  const nothing = make("p", { class: "quiet small null" });
  const pair = make("div", { class: "pair" }, make("div", {}, beside, nothing, choices.root), make("div", {}, alike, weaker));
  const trials = figureSlot(app, "trial-by-trial", { section: "evidence", title: "Trial by trial", hint: "held-out, in order of time; each trial scored by filters that never saw it", label: "Held-out ratio of every trial" }).root;
  const stopped = make("p", { class: "stopped", hidden: true }, "Stopped before the end; what was computed stays.", make("button", { type: "button", class: "button slim", id: "go-on", click: goOn }, "Go on"));
  body.append(stopped, pair, trials, looksAndLock(app));
  follow((state, before) => {
    if (state.recipe !== before.recipe) choices.show();
    stopped.hidden = !state.stopped;
    document.documentElement.toggleAttribute("data-stopped", state.stopped);
    if (state.sheet !== before.sheet) nothing.textContent = permuted(state.sheet);
  });
}

/** What the permutation supposes, and how p is counted. @param {import("./types").Sheet | null} sheet */
function permuted(sheet) {
  const test = sheet?.permutation;
  if (!test || !test.done) return "";
  const few = test.distinct !== null && test.distinct < 1000 && !test.exact ? ` of ${count(test.distinct)} distinct ones` : "";
  const many = test.exact ? `All ${count(test.done)} distinct arrangements were tried, the observed one among them; p is b / m` : `${count(test.done)} arrangements${few} were drawn; p is (b + 1) / (m + 1)`;
  const level = test.done && test.exact && test.done < 100 ? ` The smallest p that can be reached is 1 / ${count(test.done)}.` : "";
  return `${test.null.replace(/\.?$/, ".")} ${many}, where b of m reach the observed ratio.${level} Each component is held against the largest ratio of an arrangement, so p holds for all of them together.`;
}

/** @param {App} app */
function moreChoices(app) {
  const whole = (/** @type {string} */ label, /** @type {keyof Recipe["evidence"]} */ key, /** @type {[number, number]} */ range) =>
    numberField(label, { get: () => now().recipe?.evidence[key], range: () => range, step: () => 1, set: (value) => value !== null && app.change((recipe) => void (recipe.evidence[key] = Math.round(value))) });
  const fields = {
    folds: whole("folds", "folds", [2, 100]), permutations: whole("permutations", "permutations", [0, 1e6]),
    bootstrap: whole("bootstrap samples", "bootstrap", [0, 1e6]), seed: whole("seed", "seed", [0, 2 ** 53]),
    components: numberField("components at each end", { get: () => now().recipe?.components, range: () => [1, 20], step: () => 1, set: (value) => value !== null && app.change((recipe) => void (recipe.components = Math.round(value))) }),
    share: numberField("shrinkage", { get: () => (typeof now().recipe?.shrink === "number" ? Number(now().recipe?.shrink) : null), range: () => [0, 1], step: () => 0.01, optional: true, empty: "rule", set: (value) => app.change((recipe) => void (recipe.shrink = value ?? "auto")) }),
  };
  const rule = select("rule of shrinkage", (value) => app.change((recipe) => void (recipe.shrink = asShrink(value, recipe.shrink))));
  const together = (/** @type {(Node | string)[]} */ ...parts) => make("span", { class: "together" }, ...parts);
  const root = make("details", { class: "more" }, make("summary", {}, "More choices"),
    make("div", { class: "choice" }, together("Test on ", fields.folds.field, " folds, contiguous in time,"), together("against ", fields.permutations.field, " permutations;"), together("intervals from ", fields.bootstrap.field, " bootstrap samples;"), together("seed ", fields.seed.field)),
    make("div", { class: "choice" }, together("Shrink by ", rule.root, fields.share.field), together("and report ", fields.components.field, " components at each end")));
  return {
    root,
    show() {
      Object.values(fields).forEach((field) => field.show());
      const { recipe } = now();
      if (!recipe) return;
      const total = recipe.measure === "total";
      rule.show([
        { value: "auto", label: total ? "what inner folds choose" : "the usual 0.1" },
        ...(total ? [{ value: "ledoit-wolf", label: "Ledoit–Wolf" }, { value: "oas", label: "oracle approximating (OAS)" }] : []),
        { value: "number", label: "a number" },
      ], typeof recipe.shrink === "number" ? "number" : recipe.shrink);
      fields.share.field.hidden = typeof recipe.shrink !== "number";
    },
  };
}

/** @param {string} value @param {Recipe["shrink"]} before @returns {Recipe["shrink"]} */
function asShrink(value, before) {
  if (value === "number") return typeof before === "number" ? before : (now().sheet?.shrinkage ?? 0.1);
  return value === "ledoit-wolf" || value === "oas" ? value : "auto";
}
