/** The one door: drop, picker, demo and link meet here, and what goes wrong is said in the error's own words. */
import { download, find, make } from "./kit.js";
import { isSmall } from "./choosing.js";
import { asProblem, say, sentence, unsay, whereabouts, whole } from "./notices.js";
import { clock, count } from "./numbers.js";
import { clearLink, recipeAtStart } from "./recipe-link.js";
import { now, put } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {import("./types").Summary} Summary */
/** @typedef {{ files: File[], salvage: boolean } | { demo: string }} Source */
/** @typedef {{ recipe: Recipe, link: string | null }} Waiting */

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

  const pick = () => find("#recording").click();
  const takeRecipe = () => download("recipe.json", bridge.recipeText(/** @type {Recipe} */ (now().recipe)), "application/json");

  /** @param {Source} source */
  async function open(source) {
    last = source;
    unsay("#problem");
    unsay("#hint");
    const demo = "demo" in source ? source.demo : null;
    put({ phase: "reading", progress: { stage: demo ? "making" : "reading", done: 0, of: 1 } });
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
    const brought = waiting?.link ? bridge.linkComplete(waiting.link, summary.recording.events) : waiting;
    const recipe = brought?.recipe ?? proposal?.recipe;
    if (brought && "notes" in brought && brought.notes.length) say("#hint", { title: "The link left some things open", text: [brought.notes.join(" ")], ways: [{ label: "Close", act: () => unsay("#hint") }] });
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
    const ofChoices = problem.kind === "contrast" || problem.kind === "recipe";
    const before = now().sheet?.stronger.length ? now().sheet?.recipe : null;
    if (ofChoices && before) ways.push({ label: "Back to the choices before", main: true, act: () => change(before) });
    if (problem.kind === "recipe" && !before) ways.push({ label: "Open another recipe…", act: () => find("#recipe-file").click() });
    if (ofChoices && now().summary) ways.push({ label: "Propose afresh", act: () => void afresh() });
    if (!ofChoices) ways.push({ label: "Choose another recording…", act: pick });
    const rest = salvage ? [" The ", make("b", {}, `${count(salvage.records)} whole records before it (${clock(salvage.seconds)})`), " can be opened."] : [];
    say("#problem", { title: sentence(about + problem.what, file), text: [whole(problem.advice), ...rest], where: whereabouts(problem), ways });
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
        if (/"teasel_weights"\s*:/.test(text)) return say("#hint", { title: `${file.name} holds weights`, text: ["This version applies weights in the terminal: ", make("code", {}, `teasel apply ${file.name} RECORDING --out DIR`), "."], ways: [{ label: "Close", act: () => unsay("#hint") }] });
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
      if (summary && recipe) say("#hint", { title: "Stopped", text: ["What was computed before stays on the sheet."], ways: [{ label: "Go on", main: true, act: goOn }, { label: "Leave it", act: () => unsay("#hint") }] });
    },
    died() {
      put({ phase: "error", progress: null });
      const { recipe, summary } = now();
      say("#problem", {
        title: "The computation stopped; your choices are kept",
        text: ["The browser ended the worker, most likely for memory. Fewer channels or a lower sampling rate need less."],
        ways: [{ label: "Try again as it was", main: true, act: () => void again() }, ...(summary && recipe ? [{ label: "Take recipe.json", bare: true, act: takeRecipe }] : [])],
      });
    },
  };

  /** @param {Waiting} recipe @param {string} title */
  function wait(recipe, title) {
    waiting = recipe;
    say("#hint", {
      title,
      text: ["They are used for the next recording that is opened. A link holds no data: drop the recording it belongs to, or take a demo."],
      ways: [{ label: "Set them aside", act: () => ((waiting = null), clearLink(), unsay("#hint")) }],
    });
  }
}

