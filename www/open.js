/** The one door: drop, picker, demo and link meet here, and what goes wrong is said in the error's own words. */
import { download, find } from "./kit.js";
import { isSmall } from "./choosing.js";
import { asProblem, unsay } from "./notices.js";
import { count } from "./numbers.js";
import { clearLink, recipeAtStart } from "./recipe-link.js";
import { sayEnded, sayFewEvents, sayNoEvents, sayOpenEnds, sayProblem, sayStopped, sayWaiting, sayWeights } from "./sayings.js";
import { fitted, forget, now, put } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {import("./types").Summary} Summary */
/** @typedef {{ files: File[], salvage: boolean } | { demo: string }} Source */
/** @typedef {{ recipe: Recipe, link: string | null }} Waiting */

/** Whether two events are equally the most frequent: then the page asks instead of choosing by the alphabet. @param {Summary} summary */
function tied(summary) {
  const [first, second] = Object.values(summary.recording.events).sort((a, b) => b - a);
  return first !== undefined && first === second;
}

/**
 * @param {App} app
 * @param {() => void} compute
 */
export function door({ bridge, change: edit }, compute) {
  const change = (/** @type {Recipe} */ recipe) => {
    if (!now().recipe) put({ recipe });
    edit((old) => void Object.assign(old, structuredClone(recipe)));
  };
  /** A recipe, or a link that leaves names to the recording. @type {Waiting | null} */
  let waiting = null;
  /** @type {Source | null} */
  let last = null;
  /** What is open: a file that cannot be opened does not take its place. @type {Source | null} */
  let standing = null;
  /** Counts what was opened: an answer that was overtaken is dropped. */
  let turn = 0;

  const pick = () => find("#recording").click();
  const takeRecipe = () => download("recipe.json", bridge.recipeText(/** @type {Recipe} */ (now().recipe)), "application/json");

  /** @param {Source} source */
  async function open(source) {
    last = source;
    turn += 1;
    const mine = turn;
    unsay("#problem");
    unsay("#hint");
    const demo = "demo" in source ? source.demo : null;
    put({ phase: "reading", progress: { stage: demo ? "making" : "reading", done: 0, of: 1 } });
    /** @type {Summary} */
    let summary;
    try {
      summary = "demo" in source ? await bridge.openDemo(source.demo) : await bridge.open(source.files, { salvage: source.salvage });
    } catch (thrown) {
      if (mine !== turn) return;
      return standing ? await back(standing, thrown) : lost(thrown);
    }
    if (mine !== turn) return;
    standing = source;
    try {
      const size = "files" in source ? (source.files.find(({ name }) => name === summary.recording.name)?.size ?? null) : null;
      put({ summary, sheet: null, readings: [], figures: [], recipe: null, stale: false, taken: 0, source: { name: summary.recording.name, size, demo } });
      document.documentElement.removeAttribute("data-sheet");
      await ask(summary);
    } catch (thrown) {
      failed(thrown);
    }
  }

  /** Nothing is open any more. @param {unknown} thrown */
  function lost(thrown) {
    standing = null;
    forget();
    document.documentElement.removeAttribute("data-sheet");
    failed(thrown);
  }

  /** Opens again what was open before a file that cannot be, with its choices. @param {Source} source @param {unknown} thrown */
  async function back(source, thrown) {
    const { recipe } = now();
    try {
      const summary = "demo" in source ? await bridge.openDemo(source.demo) : await bridge.open(source.files, { salvage: source.salvage });
      put({ summary, phase: recipe ? "working" : "choosing", progress: null });
      const problem = asProblem(thrown);
      sayProblem(problem, waysOn(problem));
      if (recipe) compute();
    } catch {
      lost(thrown);
    }
  }

  /** A recipe that came along, or a proposal; then the work begins, at once where it is small. @param {Summary} summary */
  async function ask(summary) {
    const proposal = await bridge.propose();
    const brings = Boolean(standing && "demo" in standing);
    const brought = waiting?.link ? bridge.linkComplete(waiting.link, summary.recording.events) : waiting;
    const recipe = brought?.recipe ?? proposal?.recipe ?? unproposed(bridge, summary);
    if (brought && "notes" in brought && brought.notes.length) sayOpenEnds(brought.notes);
    if (!recipe) {
      put({ phase: "choosing", progress: null });
      return sayNoEvents(pick);
    }
    put({ recipe, why: waiting ? "" : (proposal?.why ?? ""), progress: null, phase: waiting || (proposal && isSmall(summary) && (brings || !tied(summary))) ? "working" : "choosing" });
    if (!waiting && !proposal) sayFewEvents();
    waiting = null;
    if (now().phase === "working") compute();
    find("#main").focus({ preventScroll: true });
  }

  /** @param {unknown} thrown */
  function failed(thrown) {
    const problem = asProblem(thrown);
    if (problem.kind === "stopped") return put({ phase: now().summary ? "ready" : "empty", progress: null });
    put({ phase: "error", progress: null });
    sayProblem(problem, waysOn(problem));
  }

  /** @param {import("./types").Problem} problem @returns {import("./notices.js").Way[]} */
  function waysOn({ kind, salvage }) {
    const files = last && "files" in last ? last.files : null;
    const { sheet, summary } = now();
    const before = fitted(sheet) && JSON.stringify(sheet?.recipe) !== JSON.stringify(now().recipe) ? sheet?.recipe : null;
    const ofChoices = kind === "contrast" || kind === "recipe";
    const ways = [
      salvage && files && { label: `Open the ${count(salvage.records)} whole records`, main: true, act: () => void open({ files, salvage: true }) },
      ofChoices && before && { label: "Back to the choices before", main: true, act: () => change(before) },
      kind === "recipe" && !before && { label: "Open another recipe…", act: () => find("#recipe-file").click() },
      ofChoices && summary && { label: "Propose afresh", act: () => void afresh() },
      !ofChoices && { label: "Choose another recording…", act: pick },
    ];
    return ways.flatMap((way) => way || []);
  }

  async function afresh() {
    unsay("#problem");
    waiting = null;
    const { summary } = now();
    if (summary) await ask(summary).catch(failed);
  }

  /** Takes the same choices again: the worker computes only what is missing. */
  function goOn() {
    unsay("#hint");
    put({ phase: "working" });
    compute();
  }

  /** Another worker, the same recording, the same choices. */
  async function again() {
    unsay("#problem");
    put({ phase: "reading", progress: { stage: "reading", done: 0, of: 1 } });
    const { recipe } = now();
    try {
      const summary = await bridge.revive();
      put({ phase: summary ? "working" : "empty", progress: null });
      if (summary && recipe) change(recipe);
    } catch (thrown) {
      failed(thrown);
    }
  }

  return {
    failed,
    /** @param {File[]} files */
    async files(files) {
      const own = files.length === 1 && files[0]?.name.endsWith(".json") ? files[0] : null;
      await (own ? this.recipe(own) : open({ files, salvage: false }));
    },
    /** @param {string} which */
    demo: (which) => open({ demo: which }),
    /** @param {File} file */
    async recipe(file) {
      unsay("#problem");
      try {
        const text = await file.text();
        if (/"teasel_weights"\s*:/.test(text)) return sayWeights(file.name);
        const recipe = bridge.parseRecipe(text);
        if (!now().summary) return wait({ recipe, link: null }, `${file.name} is open`);
        unsay("#hint");
        change(recipe);
      } catch (thrown) {
        const problem = asProblem(thrown);
        failed({ ...problem, file: problem.file ?? file.name });
      }
    },
    /** The link that the page was opened with. */
    begin() {
      try {
        const found = recipeAtStart(bridge);
        if (found) wait(found, found.link ? "The link brought choices along" : "Your choices are kept");
      } catch (thrown) {
        failed(thrown);
      }
    },
    async stop() {
      const { summary, recipe } = now();
      await bridge.stop();
      put({ phase: !summary ? "empty" : recipe ? "ready" : "choosing", progress: null });
      if (summary && recipe) sayStopped(goOn);
    },
    died() {
      put({ phase: "error", progress: null });
      const { recipe, summary } = now();
      sayEnded(() => void again(), summary && recipe ? takeRecipe : null);
    },
  };

  /** @param {Waiting} recipe @param {string} title */
  function wait(recipe, title) {
    waiting = recipe;
    sayWaiting(title, () => {
      waiting = null;
      clearLink();
      unsay("#hint");
    });
  }
}

/**
 * Windows as the core proposes them, around the most frequent event, however rare; null where there are no events.
 * @param {App["bridge"]} bridge
 * @param {Summary} summary
 */
function unproposed(bridge, { recording }) {
  const [most] = Object.entries(recording.events).sort((a, b) => b[1] - a[1]);
  if (!most) return null;
  const onsets = recording.event_onsets_s[most[0]] ?? [];
  const gaps = onsets.slice(1).map((t, i) => t - Number(onsets[i]));
  const long = Math.min(1, ...gaps.filter((gap) => gap > 0).map((gap) => gap / 2));
  const window = (/** @type {number} */ from_s, /** @type {number} */ to_s) => ({ event: most[0], from_s, to_s });
  return bridge.parseRecipe(JSON.stringify({ teasel_recipe: 1, contrast: { kind: "windows", signal: window(0, long), reference: window(-long, 0) } }));
}
