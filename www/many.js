/** Many recordings, one recipe: a set is dropped, asked one after the other by a worker of its own, and told together. */
import { figureSlot } from "./figure.js";
import { download, find, make } from "./kit.js";
import { asProblem } from "./notices.js";
import { count, factor, interval, probability } from "./numbers.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Bridge} Bridge */
/** @typedef {import("./types").Many} Many */
/** @typedef {import("./types").ManyRow} ManyRow */
/** @typedef {import("./types").Recipe} Recipe */
/** @typedef {{ recording: File, sides: File[], folder: string, place: HTMLElement, told: HTMLElement }} Member */

/** What lies beside a recording under its name. */
const SIDE = /\.(tsv|json)$|_(events|channels|electrodes|coordsystem)\.csv$/i;
/** Everything before the last underscore is shared by a recording and its side files (BIDS). @param {File} file */
const entity = ({ name }) => name.replace(/\.[^.]*$/, "").replace(/_[^_]*$/, "");

/**
 * @param {App} app
 * @param {{ first: (files: File[]) => void }} doors `first` opens one recording with its side files on the sheet
 */
export function mountMany(app, doors) {
  const section = find("#many");
  /** @type {Member[]} */
  let members = [];
  /** The recipe that came along with the set. @type {Recipe | null} */
  let brought = null;
  /** The worker at work. @type {Bridge | null} */
  let helper = null;
  /** Counts the runs: one that was stopped or overtaken says nothing more. */
  let turn = 0;

  const list = make("ul", { class: "queue" });
  const heading = make("p", { class: "said" });
  const told = make("div", { class: "told-many" });
  const bar = make("div", { class: "bar" }, make("i"));
  const all = make("button", { type: "button", class: "button main", click: () => void run() }, "Ask all");
  const one = make("button", { type: "button", class: "button", click: () => members[0] && doors.first([members[0].recording, ...members[0].sides]) }, "Choose the question on the first one");
  const stop = make("button", { type: "button", class: "button", hidden: true, click: () => halt("Stopped. What is done stays.") }, "Stop");
  const aside = make("button", { type: "button", class: "button bare", click: () => close() }, "Set them aside");
  find(".body", section).append(heading, make("p", { class: "acts" }, all, one, stop, aside), bar, told, list);
  follow((state, before) => (state.recipe !== before.recipe || state.summary !== before.summary) && members.length && !helper && offer());

  /** @param {"" | "offered" | "working" | "ready"} state */
  function mark(state) {
    document.documentElement.dataset.many = state;
    section.hidden = state === "";
    [all.hidden, one.hidden, stop.hidden, bar.hidden] = [state === "working", state === "working" || Boolean(now().summary), state !== "working", state !== "working"];
  }

  function offer() {
    const recipe = brought ?? now().recipe;
    all.disabled = !recipe;
    all.textContent = brought ? "Ask all with the recipe that came along" : "Ask all with the choices on this sheet";
    heading.textContent = `These are ${count(members.length)} recordings. One recipe is asked of each, one at a time, on this machine; the sheet below stays as it is.${recipe ? "" : " Choose the question on the first one; then all can be asked."}`;
    if (document.documentElement.dataset.many !== "ready") mark("offered");
  }

  function close() {
    halt("");
    members = [];
    told.replaceChildren();
    list.replaceChildren();
    mark("");
  }

  /** @param {string} words */
  function halt(words) {
    turn += 1;
    helper?.end();
    helper = null;
    if (words) {
      heading.textContent = words;
      mark("ready");
    }
  }

  async function run() {
    const recipe = brought ?? now().recipe;
    if (!recipe) return;
    turn += 1;
    const mine = turn;
    told.replaceChildren();
    for (const { told: words } of members) words.textContent = "waiting";
    mark("working");
    /** @type {string[]} */
    const rows = [];
    for (const [k, member] of members.entries()) {
      heading.textContent = `Recording ${k + 1} of ${members.length}: ${member.recording.name}`;
      bar.style.setProperty("--part", String((100 * k) / members.length));
      const row = await ask(member, structuredClone(recipe)).catch((thrown) => fail(member, thrown));
      if (mine !== turn) return;
      rows.push(row);
      show(app.bridge.many(rows), rows.length);
    }
    helper?.end();
    helper = null;
    heading.textContent = `All ${count(members.length)} recordings are asked.`;
    mark("ready");
    const [title] = section.getElementsByTagName("h2");
    title?.focus({ preventScroll: true });
  }

  /** One recording in the worker of the set. @param {Member} member @param {Recipe} recipe @returns {Promise<string>} */
  async function ask(member, recipe) {
    helper ??= await app.bridge.another();
    const worker = helper;
    member.told.textContent = "reading";
    await worker.open([member.recording, ...member.sides], { salvage: false });
    /** @type {(() => void)[]} */
    let deaf = [];
    const done = new Promise((/** @type {(value?: unknown) => void} */ finished, failed) => {
      deaf = [
        worker.on("finished", finished),
        worker.on("problem", failed),
        worker.on("died", ({ words }) => failed({ ...asProblem(words), what: `the part that computes ended: ${words}`, advice: "use fewer channels or a lower rate" })),
        worker.on("progress", ({ stage, done: part, of }) => void (member.told.textContent = of > 0 ? `${stage.replace("-", " ")}, ${Math.floor((100 * part) / of)} %` : stage)),
      ];
    });
    // A refused recipe is heard first; the other promise is then nobody's.
    done.catch(() => undefined);
    try {
      await worker.setRecipe(recipe);
      await done;
    } finally {
      for (const off of deaf) off();
    }
    const row = await worker.row(member.folder);
    member.told.textContent = "done";
    return row;
  }

  /** @param {Member} member @param {unknown} thrown @returns {string} */
  function fail(member, thrown) {
    const problem = asProblem(thrown);
    if (problem.kind === "died" || /computes ended/.test(problem.what)) {
      helper?.end();
      helper = null;
    }
    const known = ["empty", "unknown", "damaged", "unsupported", "too-large", "needs-answer", "recipe", "contrast", "storage"].includes(problem.kind);
    member.told.replaceChildren(make("b", {}, "not analysed: "), `${problem.what}${problem.expected && problem.found ? ` (expected ${problem.expected}, found ${problem.found})` : ""}`);
    return app.bridge.failedRow(member.recording.name, member.folder, known ? problem : { ...problem, kind: "storage" });
  }

  /** @param {Many} many @param {number} asked */
  function show(many, asked) {
    const whole = asked === members.length;
    const save = (/** @type {string} */ name, /** @type {string} */ text, /** @type {string} */ type) =>
      make("button", { type: "button", class: "button slim", "data-many": name, click: () => download(name, text, type) }, `Take ${name}`);
    const figures = whole ? many.figures.map(({ name, caption, figure }) => figureSlot(app, `group-${name}`, { section: "many", title: caption.replace(/^Mean over recordings\. /, ""), label: caption, load: () => Promise.resolve(figure) }).root) : [];
    told.replaceChildren(
      make("p", { class: "say" }, many.said.join(" ")),
      many.but.length ? make("p", { class: "but" }, many.but.join(" ")) : "",
      make("div", { class: "scroll", tabindex: 0, role: "region", "aria-label": "One row a recording" }, table(many.recordings)),
      whole ? make("p", { class: "acts" }, save("table.csv", many.csv, "text/csv"), save("table.json", many.json, "application/json"), save("group.csv", many.group_csv, "text/csv")) : "",
      whole && figures.length ? make("p", { class: "quiet" }, "The group: patterns at length 1 with their signs aligned, over the channels that all share; spectra and courses averaged in dB. Bands: 95 % bootstrap interval over recordings.") : "",
      make("div", { class: "group-figures" }, ...figures),
    );
  }

  return {
    /** Several recordings were given at once. @param {File[]} files */
    async offer(files) {
      halt("");
      brought = null;
      for (const file of files.filter(({ name }) => /\.json$/i.test(name))) {
        const text = await file.text();
        if (/"teasel_recipe"\s*:/.test(text)) brought = app.bridge.parseRecipe(text);
      }
      const recordings = files.filter(({ name }) => !SIDE.test(name)).sort((a, b) => (a.name < b.name ? -1 : 1));
      const folders = app.bridge.folderNames(recordings.map(({ name }) => name));
      const sides = files.filter(({ name }) => SIDE.test(name));
      members = recordings.map((recording, k) => {
        const words = make("span", { class: "quiet" }, "waiting");
        const place = make("li", {}, make("bdi", {}, recording.name), " ", words);
        return { recording, folder: folders[k] ?? recording.name, sides: sides.filter((side) => entity(side) === entity(recording)), place, told: words };
      });
      list.replaceChildren(...members.map(({ place }) => place));
      told.replaceChildren();
      document.documentElement.dataset.many = "";
      offer();
      find("h2", section).focus();
    },
  };
}

/** @param {ManyRow[]} rows */
function table(rows) {
  const head = ["recording", "windows", "stronger, held-out", "p", "likeness", "weaker, held-out", "p", "likeness", "to know"];
  const cells = (/** @type {import("./types").Leader | null} */ leader, /** @type {"typical" | "total" | null} */ measure) => {
    const typical = measure !== "total";
    const held = typical ? (leader?.typical_held_out ?? null) : (leader?.total_held_out ?? null);
    const bounds = typical && leader?.typical_low !== null && leader?.typical_high !== null && leader ? interval([Number(leader.typical_low), Number(leader.typical_high)]) : "";
    return [`${factor(held)} ${bounds}`.trim(), probability(leader?.p ?? null), leader?.likeness === null || !leader ? "–" : leader.likeness.toFixed(2)];
  };
  const row = (/** @type {ManyRow} */ { recording, problem, signal_windows, reference_windows, measure, stronger_1, weaker_1, warnings }) =>
    problem
      ? make("tr", { class: "faint" }, make("th", { scope: "row" }, make("bdi", {}, recording)), make("td", { colspan: head.length - 1 }, make("bdi", {}, problem)))
      : make("tr", {}, make("th", { scope: "row" }, make("bdi", {}, recording)), make("td", { class: "right" }, `${signal_windows} + ${reference_windows}`),
          ...[...cells(stronger_1, measure), ...cells(weaker_1, measure)].map((text) => make("td", { class: "right number" }, text)),
          make("td", {}, warnings.length ? make("details", {}, make("summary", {}, `${warnings.length} to know`), ...warnings.map((text) => make("p", {}, make("bdi", {}, text)))) : "–"));
  return make("table", { class: "comps many-rows" },
    make("thead", {}, make("tr", {}, ...head.map((text, k) => make("th", { scope: "col", class: k > 0 && k < head.length - 1 ? "right" : "" }, text)))),
    make("tbody", {}, ...rows.map(row)));
}
