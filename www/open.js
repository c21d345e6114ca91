/** The one door: drop, picker, demo and link meet here, and what goes wrong is said in the error's own words. */
import { clock, count, download, find, make } from "./kit.js";
import { isSmall } from "./choosing.js";
import { asProblem, say, sentence, unsay, whereabouts } from "./notices.js";
import { clearLink, recipeAtStart } from "./recipe-link.js";
import { now, put } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {import("./types").Summary} Summary */
/** @typedef {{ files: File[], salvage: boolean } | { demo: string }} Source */

/**
 * @param {App} app
 * @param {() => void} compute
 */
export function door({ bridge }, compute) {
  /** A recipe that waits for its recording. @type {Recipe | null} */
  let waiting = null;
  /** @type {Source | null} */
  let last = null;

  const pick = () => find("#recording").click();
  const takeRecipe = () => download("recipe.json", `${JSON.stringify(now().recipe, null, 2)}\n`, "application/json");

  /** @param {Source} source */
  async function open(source) {
    last = source;
    unsay("#problem");
    unsay("#hint");
    const demo = "demo" in source ? source.demo : null;
    put({ phase: "reading", progress: { stage: demo ? "making the recording" : "reading", done: 0, of: 1 } });
    try {
      const summary = "demo" in source ? await bridge.openDemo(source.demo) : await bridge.open(source.files, { salvage: source.salvage });
      const size = "files" in source ? (source.files.find(({ name }) => name === summary.recording.name)?.size ?? null) : null;
      put({ summary, sheet: null, readings: [], figures: [], recipe: null, stale: false, taken: 0, source: { name: summary.recording.name, size, demo } });
      document.documentElement.removeAttribute("data-sheet");
      await ask(summary);
    } catch (thrown) {
      failed(thrown);
    }
  }

  /** A recipe that came along, or a proposal; then the work begins, at once where it is small. @param {Summary} summary */
  async function ask(summary) {
    const proposal = await bridge.propose();
    const recipe = waiting ? completed(waiting, summary) : proposal?.recipe;
    if (!recipe) {
      put({ phase: "choosing", progress: null });
      return noEvents();
    }
    put({ recipe, why: waiting ? "" : (proposal?.why ?? ""), progress: null, phase: waiting || isSmall(summary) ? "working" : "choosing" });
    waiting = null;
    if (now().phase === "working") compute();
    find("#main").focus({ preventScroll: true });
  }

  function noEvents() {
    say("#hint", {
      title: "This recording holds no events",
      text: ["This version compares windows around events. Drop the recording again together with its table of events: a tab-separated file with the columns ", make("b", {}, "onset"), ", ", make("b", {}, "duration"), " and ", make("b", {}, "trial_type"), ", named as the recording and ending in ", make("b", {}, "events.tsv"), "."],
      ways: [{ label: "Choose the recording and its events…", act: pick, main: true }],
    });
  }

  /** @param {unknown} thrown */
  function failed(thrown) {
    const problem = asProblem(thrown);
    if (problem.kind === "stopped") return put({ phase: now().summary ? "ready" : "empty", progress: null });
    put({ phase: "error", progress: null });
    const { salvage, file } = problem;
    const about = file && !problem.what.includes(file) ? `${file}: ` : "";
    const salvaged = salvage && last && "files" in last ? last.files : null;
    /** @type {import("./notices.js").Way[]} */
    const ways = [];
    if (salvage && salvaged) ways.push({ label: `Open the ${count(salvage.records)} whole records`, main: true, act: () => void open({ files: salvaged, salvage: true }) });
    if (problem.kind === "recipe") ways.push({ label: "Open another recipe…", act: () => find("#recipe-file").click() });
    if (problem.kind === "contrast" && now().summary) ways.push({ label: "Propose afresh", act: () => void afresh() });
    else if (problem.kind !== "recipe") ways.push({ label: "Choose another recording…", act: pick });
    const rest = salvage ? [" The ", make("b", {}, `${count(salvage.records)} whole records before it (${clock(salvage.seconds)})`), " can be opened."] : [];
    say("#problem", { title: sentence(about + problem.what), text: [problem.advice, ...rest], where: whereabouts(problem), ways });
  }

  async function afresh() {
    unsay("#problem");
    waiting = null;
    const { summary } = now();
    if (summary) await ask(summary).catch(failed);
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
        if (/"teasel_weights"\s*:/.test(text)) return say("#hint", { title: `${file.name} holds weights`, text: ["This version applies weights in the terminal: ", make("code", {}, `teasel apply ${file.name} RECORDING --out DIR`), "."], ways: [{ label: "Close", act: () => unsay("#hint") }] });
        const recipe = bridge.parseRecipe(text);
        if (!now().summary) return wait(recipe, `${file.name} is open`);
        put({ recipe, phase: "working", stale: Boolean(now().sheet?.stronger.length) });
        compute();
      } catch (thrown) {
        const problem = asProblem(thrown);
        failed({ ...problem, file: problem.file ?? file.name });
      }
    },
    /** The link that the page was opened with. */
    begin() {
      try {
        const found = recipeAtStart(bridge);
        if (found) wait(found.recipe, found.from === "tab" ? "Your choices are kept" : "The link brought choices along");
      } catch (thrown) {
        failed(thrown);
      }
    },
    async stop() {
      await bridge.stop();
      put({ phase: now().summary ? (now().recipe ? "ready" : "choosing") : "empty", progress: null });
    },
    died() {
      put({ phase: "error", progress: null });
      const again = last;
      say("#problem", {
        title: "The computation stopped; your choices are kept",
        text: ["The browser ended the worker, most likely for memory. Fewer channels or a lower sampling rate need less."],
        ways: [...(again ? [{ label: "Try again as it was", main: true, act: () => ((waiting = now().recipe), void open(again)) }] : []), ...(now().recipe ? [{ label: "Take recipe.json", bare: true, act: takeRecipe }] : [])],
      });
    },
  };

  /** @param {Recipe} recipe @param {string} title */
  function wait(recipe, title) {
    waiting = recipe;
    say("#hint", {
      title,
      text: ["They are used for the next recording that is opened. A link holds no data: drop the recording it belongs to, or take a demo."],
      ways: [{ label: "Set them aside", act: () => ((waiting = null), clearLink(), unsay("#hint")) }],
    });
  }
}

/** Events that a link left out are the recording's most frequent ones. @param {Recipe} recipe @param {Summary} summary @returns {Recipe} */
function completed(recipe, summary) {
  const next = structuredClone(recipe);
  const byCount = Object.entries(summary.recording.events).sort((a, b) => b[1] - a[1] || (a[0] < b[0] ? -1 : 1)).map(([name]) => name);
  for (const side of /** @type {const} */ (["signal", "reference"])) if (next.contrast[side].event === "") next.contrast[side].event = byCount[0] ?? "";
  return next;
}
