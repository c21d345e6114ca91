/** The one door: drop, picker, demo and link meet here, and what goes wrong is said in the error's own words. */
import { sayAsks, sayParts } from "./asking.js";
import { sorted } from "./files.js";
import { download, find } from "./kit.js";
import { isSmall } from "./choosing.js";
import { asProblem, unsay } from "./notices.js";
import { count } from "./numbers.js";
import { clearLink, linkName, recipeAtStart } from "./recipe-link.js";
import { sayEnded, sayFewEvents, sayNoEvents, sayOpenEnds, sayProblem, sayStopped, sayWaiting } from "./sayings.js";
import { now, put } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {import("./types").Summary} Summary */
/** @typedef {import("./types").Given} Given */
/** @typedef {{ files: File[], salvage: boolean, given?: Given } | { demo: string }} Source */
/** @typedef {{ recipe: Recipe, link: string | null }} Waiting */

/** What a file of saved filters begins with, and the largest that is looked into. */
const [WEIGHTS, WEIGHTS_BYTES] = [/"teasel_weights"\s*:/, 64 * 1024 * 1024];
/** Files that lie beside a recording and are none. */
const BESIDE = /\.tsv$|_(events|channels|electrodes|coordsystem|eeg|ieeg|meg|nirs)\.(json|csv)$/i;
/** Tables that may lie beside a recording or be one: their content decides. */
const TABLE = /\.(csv|txt)$/i;
/** No table beside a recording is larger. */
const TABLE_BYTES = 64 * 1024 * 1024;

/**
 * @param {App} app
 * @param {() => void} compute
 * @param {{ set: (files: File[]) => Promise<void>, weights: (name: string, text: string) => void }} elsewhere what takes several recordings at once, and saved filters
 */
export function door({ bridge, change: edit }, compute, elsewhere) {
  const change = (/** @type {Recipe} */ recipe) => {
    if (!now().recipe) put({ recipe });
    edit((old) => void Object.assign(old, structuredClone(recipe)));
  };
  /** A recipe, or a link that leaves names to the recording. @type {Waiting | null} */
  let waiting = null;
  /** What was tried last, what is open, and what the worker died of. @type {Source | null} */
  let last = null;
  /** @type {Source | null} */
  let good = null;
  /** @type {Source | null} */
  let dying = null;
  /** The phase before reading began. @type {import("./types").Phase} */
  let before = "empty";
  /** Counts what was opened: an answer that was overtaken is dropped. */
  let turn = 0;

  const pick = () => find("#recording").click();
  const takeRecipe = () => download("recipe.json", bridge.recipeText(/** @type {Recipe} */ (now().recipe)), "application/json");

  /** @param {Source} wanted @returns {Promise<void>} */
  async function open(wanted) {
    // What a waiting recipe tells of the file is the file's from now on.
    const source = "files" in wanted ? { ...wanted, ...asked(wanted) } : wanted;
    last = source;
    turn += 1;
    const mine = turn;
    unsay("#problem");
    unsay("#hint");
    const { phase } = now();
    if (phase !== "reading") before = phase;
    put({ phase: "reading", progress: { stage: "demo" in source ? "making" : "reading", done: 0, of: 1 } });
    try {
      const summary = "demo" in source ? await bridge.openDemo(source.demo) : await bridge.open(source.files, asked(source));
      if (mine === turn) await arrive(source, summary);
    } catch (thrown) {
      if (mine === turn) await keep(thrown, source).catch(failed);
    }
  }

  /** Another recording is open: nothing of the one before holds. @param {Source} source @param {Summary} summary */
  async function arrive(source, summary) {
    good = source;
    const size = "files" in source ? (source.files.find(({ name }) => name === summary.recording.name)?.size ?? null) : null;
    put({ summary, sheet: null, readings: [], figures: [], recipe: null, stale: false, stopped: false, finished: null, taken: 0, source: { name: summary.recording.name, size, demo: "demo" in source ? source.demo : null } });
    document.documentElement.removeAttribute("data-sheet");
    await ask(summary).catch(failed);
  }

  /** A recording could not be opened, or its reading was stopped: what was open before stays, with its choices and its sheet. @param {unknown} thrown @param {Source} source */
  async function keep(thrown, source) {
    const problem = asProblem(thrown);
    if (problem.kind === "died") return void (dying = source);
    const { summary, recipe } = now();
    if (problem.kind !== "stopped") failed(thrown);
    if (!summary || !good) return void (problem.kind === "stopped" && put({ phase: "empty", progress: null }));
    const mine = turn;
    const holds = await bridge.holds();
    if (!holds) await ("demo" in good ? bridge.openDemo(good.demo) : bridge.open(good.files, asked(good)));
    if (mine !== turn) return;
    if (before === "choosing") return put({ phase: "choosing", progress: null });
    if (recipe && (!holds || before === "working")) compute();
    else if (problem.kind === "stopped") put({ phase: before === "empty" ? "ready" : before, progress: null });
  }

  /**
   * A recipe that came along, or a proposal; then the work begins, at once where it is small and no event had to be guessed.
   * @param {Summary} summary
   */
  async function ask(summary) {
    const { events } = summary.recording;
    const proposal = await bridge.propose();
    const link = waiting?.link ? bridge.linkComplete(waiting.link, events) : null;
    const guessed = waiting?.link ? bridge.linkDecode(waiting.link).events !== null && Object.keys(events).length > 1 : !waiting && !isDemo() && isTied(events);
    const recipe = withTold(link?.recipe ?? waiting?.recipe ?? proposal?.recipe ?? unproposed(bridge, summary));
    if (link?.notes.length) sayOpenEnds(link.notes);
    if (!recipe) {
      put({ phase: "choosing", progress: null });
      return summary.recording.about.untold ? undefined : sayNoEvents(pick);
    }
    const atOnce = !guessed && (waiting || (proposal && isSmall(summary)));
    put({ recipe, why: waiting || guessed ? "" : (proposal?.why ?? ""), progress: null, phase: atOnce ? "working" : "choosing" });
    if (!waiting && !proposal) sayFewEvents();
    waiting = null;
    if (now().phase === "working") compute();
    find("#main").focus({ preventScroll: true });
  }

  /** A demo brings its own question. */
  function isDemo() {
    return now().source?.demo !== null;
  }

  /** Files as they were dropped or chosen; several recordings are opened as one only when that is said. @param {File[]} files */
  async function gather(files) {
    const all = withRecording(files);
    const told = all === files ? {} : given();
    const { recordings } = await sorted(all).catch(() => ({ recordings: [] }));
    const join = () => void open({ files: all, salvage: false, given: told });
    if (recordings.length < 2) return join();
    const names = recordings.map(({ name }) => name);
    const order = bridge.naturalOrder(names).map((at) => names[at] ?? "");
    unsay("#hint");
    const each = () => {
      unsay("#problem");
      put({ phase: now().summary ? "ready" : "empty", progress: null });
      void elsewhere.set(all);
    };
    sayParts(order, [{ label: "Ask one question of each", main: true, act: each }, { label: "Open them as one recording", act: join }, { label: "Choose another recording…", act: pick }, ...(now().summary ? [{ label: `Stay with ${now().source?.name ?? "this one"}`, act: stay }] : [])]);
    put({ phase: "error", progress: null });
  }

  /** @param {unknown} thrown */
  function failed(thrown) {
    const problem = asProblem(thrown);
    // A death is said by who hears of it.
    if (problem.kind === "died") return;
    if (problem.kind === "stopped") return put({ phase: now().summary ? "ready" : "empty", progress: null });
    put({ phase: "error", progress: null });
    const asking = last && "files" in last ? last : null;
    if (problem.asks?.length && asking) return sayAsks(problem, asked(asking).given, (told) => void open({ ...asking, given: { ...asking.given, ...told } }), waysOn(problem));
    sayProblem(problem, waysOn(problem));
  }

  /** @param {import("./types").Problem} problem @returns {import("./notices.js").Way[]} */
  function waysOn({ kind, salvage }) {
    const files = last && "files" in last ? last.files : null;
    const { finished, summary, source } = now();
    const ofChoices = kind === "contrast" || kind === "recipe";
    const ways = [
      salvage && files && { label: `Open the ${count(salvage.records)} whole records`, main: true, act: () => void open({ files, salvage: true, given: last && "files" in last ? last.given : {} }) },
      ofChoices && finished && { label: "Back to the choices before", main: true, act: () => back(finished) },
      kind === "recipe" && !finished && { label: "Open another recipe…", act: () => find("#recipe-file").click() },
      ofChoices && summary && { label: "Propose afresh", act: () => void afresh() },
      !ofChoices && { label: "Choose another recording…", act: pick },
      !ofChoices && summary && { label: `Stay with ${source?.name ?? "this one"}`, act: stay },
    ];
    return ways.flatMap((way) => way || []);
  }

  /** The last choices that came to their end; the focus goes where they differ from those that failed. @param {Recipe} finished */
  function back(finished) {
    const failed = now().recipe;
    change(finished);
    const differ = (/** @type {(keyof Recipe)[]} */ ...keys) => keys.some((key) => JSON.stringify(failed?.[key]) !== JSON.stringify(finished[key]));
    const section = differ("contrast") ? "windows" : differ("channels", "filter") ? "channels" : differ("keep") ? "compression" : differ("evidence", "shrink", "components") ? "evidence" : "windows";
    const fields = document.querySelectorAll(`#${section} .body :is(input, select, summary)`);
    const first = [...fields].find((field) => field.getClientRects().length > 0);
    if (first instanceof HTMLElement) first.focus();
  }

  /** Puts a file's problem aside. */
  function stay() {
    unsay("#problem");
    if (now().phase === "error") put({ phase: now().recipe ? "ready" : "choosing" });
    find("#main").focus({ preventScroll: true });
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
      const source = dying;
      dying = null;
      if (summary && source) return await arrive(source, summary);
      put({ phase: summary ? "working" : "empty", progress: null });
      if (summary && recipe) change(recipe);
    } catch (thrown) {
      failed(thrown);
    }
  }

  const doors = {
    failed,
    /** @param {File[]} files */
    async files(files) {
      files = await withoutWeights(files, elsewhere.weights);
      if (files.length === 0) return;
      const own = files.length === 1 && files[0]?.name.endsWith(".json") && !BESIDE.test(files[0].name) ? files[0] : null;
      if (own) return doors.recipe(own);
      const [alone] = files;
      if (files.length === 1 && alone && (await isBeside(alone).catch(() => false))) return doors.beside(alone);
      await gather(files);
    },
    /** A table that belongs to the open recording, in place of one of the same name. @param {File} file */
    async beside(file) {
      if (!good || !("files" in good)) return;
      await open({ ...good, files: [...good.files.filter(({ name }) => name !== file.name), file] });
    },
    /** The open recording without one of its side files. @param {string} name */
    async without(name) {
      if (good && "files" in good) await open({ ...good, files: good.files.filter((file) => file.name !== name) });
    },
    /** Opens the recording again with what was told of it. @param {Given} told */
    async tell(told) {
      if (good && "files" in good) await open({ ...good, given: { ...given(), ...told } });
    },
    /** What was told of the open recording. */
    told: () => given(),
    /** A file of the open recording, by name; of a demo there is none. @param {string} name */
    file: (name) => (good && "files" in good ? (good.files.find((file) => file.name === name) ?? null) : null),
    /** Whether the open recording is a file, which others can join. */
    isFile: () => good !== null && "files" in good,
    /** @param {string} which */
    demo: (which) => open({ demo: which }),
    /** @param {File} file */
    async recipe(file) {
      unsay("#problem");
      try {
        const text = await file.text();
        if (WEIGHTS.test(text)) return elsewhere.weights(file.name, text);
        const recipe = bridge.parseRecipe(text);
        if (!now().summary) return wait({ recipe, link: null }, `${file.name} is open`);
        unsay("#hint");
        if (!good || !("files" in good) || tellsNothingNew(recipe)) return change(/** @type {Recipe} */ (withTold(recipe)));
        // The recipe reads the file in another way than it is open: it is opened again, with the recipe waiting for it.
        waiting = { recipe, link: null };
        await open({ ...good, given: { ...good.given, ...recipe.recording } });
      } catch (thrown) {
        const problem = asProblem(thrown);
        failed({ ...problem, file: problem.file ?? file.name });
      }
    },
    /** The link that the page was opened with. */
    begin() {
      try {
        const found = recipeAtStart(bridge);
        if (found) wait(found, linkName() ? `The link brought along: ${linkName()}` : found.link ? "The link brought choices along" : "Your choices are kept");
      } catch (thrown) {
        failed(thrown);
      }
    },
    async stop() {
      const { phase, recipe } = now();
      await bridge.stop();
      // Reading that is stopped is answered where it was asked for.
      if (phase !== "working") return;
      put({ phase: "ready", progress: null, stopped: true });
      if (recipe) sayStopped(goOn);
    },
    goOn,
    died() {
      put({ phase: "error", progress: null });
      const { recipe, summary } = now();
      sayEnded(() => void again(), summary && recipe ? takeRecipe : null);
    },
  };
  return doors;

  /** @returns {Given} */
  function given() {
    return good && "files" in good ? (good.given ?? {}) : {};
  }

  /** A recipe with what the open recording was opened with. @param {Recipe | null} recipe */
  function withTold(recipe) {
    if (!recipe || !good || !("files" in good)) return recipe;
    return { ...recipe, recording: asked(good).given };
  }

  /** Whether a recipe tells of the recording what it was opened with, or nothing. @param {Recipe} recipe */
  function tellsNothingNew(recipe) {
    const old = /** @type {Record<string, unknown>} */ (given());
    return Object.entries(recipe.recording ?? {}).every(([key, value]) => value === null || value === undefined || JSON.stringify(value) === JSON.stringify(old[key]));
  }

  /** How a file is to be opened: a recipe that waits may tell what the file does not. @param {{ salvage: boolean, given?: Given }} source */
  function asked({ salvage, given: told }) {
    return { salvage, given: { ...waiting?.recipe.recording, ...told } };
  }

  /** Whether a table that was dropped alone is about the open recording. @param {File} file */
  async function isBeside(file) {
    const channels = (now().summary?.channels ?? []).map(({ name }) => name);
    if (!good || !("files" in good) || !channels.length || !TABLE.test(file.name) || file.size > TABLE_BYTES) return false;
    return bridge.isSideTable(file.name, new Uint8Array(await file.arrayBuffer()), channels);
  }

  /** Side files alone belong to the recording that is open. @param {File[]} files */
  function withRecording(files) {
    if (!good || !("files" in good) || !now().summary || !files.every(({ name }) => BESIDE.test(name))) return files;
    const kind = (/** @type {File} */ { name }) => (BESIDE.test(name) ? (/_([a-z]+)\.\w+$/i.exec(name)?.[1] ?? "events").toLowerCase() : null);
    const replaced = files.map(kind);
    return [...good.files.filter((file) => kind(file) === null || !replaced.includes(kind(file))), ...files];
  }

  /** @param {Waiting} recipe @param {string} title */
  function wait(recipe, title) {
    waiting = recipe;
    sayWaiting(title, recipe.link && bridge.linkDecode(recipe.link).events ? [] : labels(recipe.recipe), () => {
      waiting = null;
      clearLink();
      unsay("#hint");
    });
  }
}

/** Labels of the events that a question names, whatever its kind. @param {Recipe} recipe @returns {string[]} */
function labels({ contrast }) {
  const found = new Set();
  JSON.stringify(contrast, (key, value) => {
    if (key === "event" && typeof value === "string" && value) found.add(value);
    return value;
  });
  return [...found];
}

/** Saved filters that come along with a recording are taken elsewhere. @param {File[]} files @param {(name: string, text: string) => void} take */
async function withoutWeights(files, take) {
  const left = [];
  for (const file of files) {
    const text = /\.json$/i.test(file.name) && file.size < WEIGHTS_BYTES ? await file.text() : "";
    if (WEIGHTS.test(text)) take(file.name, text);
    else left.push(file);
  }
  return left;
}

/** Whether two events are equally the most frequent. @param {Record<string, number>} events */
function isTied(events) {
  const [most, next] = Object.values(events).sort((a, b) => b - a);
  return most !== undefined && most === next;
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
