/** Sends the choices to the worker, and takes in the sheets that answer them. */
import { refreshFigures, settleFigures } from "./figure.js";
import { eachFrame } from "./kit.js";
import { hasResults } from "./leading.js";
import { unsay } from "./notices.js";
import { now, put } from "./state.js";

/** @typedef {import("./types").Bridge} Bridge */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {import("./types").Sheet} Sheet */
/** @typedef {import("./types").SheetNews} SheetNews */

/** The generation of the choices in force; unknown while they are on their way. */
let expected = Infinity;
/** Counts what was sent; only the newest answer matters. */
let sent = 0;

/**
 * @param {Bridge} bridge
 * @param {{ failed: (thrown: unknown) => void, died: () => void }} trouble
 */
export function mountWork(bridge, trouble) {
  /** At most once a frame, however fast a dial moves; the worker drops what is overtaken. */
  const send = eachFrame(() => {
    const { recipe, phase } = now();
    if (!recipe || phase === "choosing") return;
    put({ phase: "working", stopped: false });
    sent += 1;
    const mine = sent;
    bridge.setRecipe(recipe).then(
      (generation) => {
        if (generation !== null && mine === sent) expected = generation;
      },
      (thrown) => mine === sent && trouble.failed(thrown),
    );
  });
  listen(bridge, trouble);
  return {
    send,
    /** @param {(recipe: Recipe) => void} edit */
    change(edit) {
      const { recipe, sheet } = now();
      if (!recipe) return;
      const next = structuredClone(recipe);
      edit(next);
      expected = Infinity;
      const asProposed = JSON.stringify(next.contrast) === JSON.stringify(recipe.contrast);
      put({ recipe: next, stale: hasResults(sheet), taken: 0, why: asProposed ? now().why : "" });
      unsay("#problem");
      send();
    },
  };
}

/** @param {Bridge} bridge @param {{ failed: (thrown: unknown) => void, died: () => void }} trouble */
function listen(bridge, trouble) {
  bridge.on("progress", (progress) => now().phase === "working" && put({ progress }));
  bridge.on("sheet", take);
  bridge.on("finished", ({ generation }) => {
    if (generation < expected) return;
    put({ phase: "ready", progress: null, stale: false, stopped: false, finished: now().recipe });
    refreshFigures();
    void settleFigures();
  });
  bridge.on("problem", (problem) => trouble.failed(problem));
  bridge.on("died", () => trouble.died());
}

/** @param {SheetNews} news */
function take({ sheet, readings, figures, drawn, generation }) {
  const whole = hasResults(sheet);
  const told = whole || !now().stale ? { readings } : {};
  put({ sheet: carriedOver(sheet, now().sheet), ...told, figures, drawn: drawn ?? {}, generation, stale: now().stale && !(whole && generation >= expected) });
  document.documentElement.toggleAttribute("data-sheet", hasResults(now().sheet));
  refreshFigures();
}

/**
 * Results are never blanked: until the new ones are there, the sheet shows those of the choices before (greyed, see `stale`).
 * @param {Sheet} sheet
 * @param {Sheet | null} before
 * @returns {Sheet}
 */
function carriedOver(sheet, before) {
  if (!before || hasResults(sheet) || !hasResults(before)) return sheet;
  const { recipe, leading, stronger, weaker, compare, permutation, folds, curve } = before;
  const { preparation, windows, compression } = sheet;
  return {
    ...sheet, recipe, leading, stronger, weaker, compare, permutation, folds, curve,
    preparation: preparation ?? before.preparation, windows: windows ?? before.windows, compression: compression ?? before.compression,
  };
}
