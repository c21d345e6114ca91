// The bridge without the sheet around it: one queue, work in bites, stale work dropped, a death survived.
import assert from "node:assert/strict";
import { readFile } from "node:fs/promises";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { bridgeUrl, launch, openPage, recordings } from "./harness.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
let url = "";
let bytes = "";
before(async () => {
  [browser, url] = await Promise.all([launch(), bridgeUrl()]);
  bytes = (await readFile(join(recordings, "night-watch.edf"))).toString("base64");
});
after(() => browser.close());

/** A page with its bridge as `bridge`, the events it said as `said`, and `pick`, which makes a File of the recording. */
async function opened() {
  const { page, seen } = await openPage(browser.context, { url });
  await page.evaluate(async (text) => {
    const w = /** @type {any} */ (globalThis);
    w.bridge = await w.bridgeReady;
    w.said = [];
    for (const name of ["progress", "sheet", "finished", "problem", "died"]) {
      w.bridge.on(name, (/** @type {any} */ news) => w.said.push({ name, at: performance.now(), ...news }));
    }
    const raw = atob(text);
    const all = Uint8Array.from(raw, (c) => c.charCodeAt(0));
    w.pick = (/** @type {number} */ length = all.length, name = "watch.edf") => new File([all.subarray(0, length)], name);
    w.until = async (/** @type {() => unknown} */ holds, limit = 60_000) => {
      for (const from = performance.now(); !holds(); ) {
        if (performance.now() - from > limit) throw new Error(`not within ${limit} ms: ${holds}`);
        await new Promise((next) => setTimeout(next, 5));
      }
    };
  }, bytes);
  return { page, seen };
}

/** @param {import("playwright-core").Page} page @param {string} script */
const run = (page, script) => page.evaluate(`(async () => { ${script} })()`);

test("opens a recording and says what it is", async () => {
  const { page } = await opened();
  const summary = await run(page, `return bridge.open([pick()])`);
  assert.equal(summary.recording.name, "watch.edf");
  assert.equal(summary.recording.rate_hz, 250);
  assert.equal(summary.channels.length, 32);
  assert.ok(summary.recording.events.buoy >= 30);
  await page.close();
});

test("proposes, computes to the end, and shows a first result before the evidence", async () => {
  const { page, seen } = await opened();
  const told = await run(page, `
    await bridge.open([pick()]);
    const { recipe, why } = await bridge.propose();
    await bridge.watch(["stronger-1-map"]);
    const generation = await bridge.setRecipe(recipe);
    await until(() => said.some((s) => s.name === "finished"));
    const sheets = said.filter((s) => s.name === "sheet");
    return { why, generation, first: sheets.find((s) => s.sheet.stronger.length), last: sheets.at(-1), figure: await bridge.figure("stronger-1-map") };
  `);
  assert.match(told.why, /\d/);
  assert.equal(told.generation, 1);
  assert.equal(told.first.sheet.permutation?.done ?? 0, 0, "the first result does not wait for the permutations");
  assert.ok(told.first.drawn["stronger-1-map"], "watched figures come along");
  assert.equal(told.last.generation, 1);
  assert.equal(told.last.finished, true);
  assert.equal(told.last.sheet.permutation.done, 1000);
  assert.ok(told.last.readings.length > 0);
  assert.deepEqual(told.figure, told.last.drawn["stronger-1-map"]);
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("a demo recording is the file that is written of it", async () => {
  const { page } = await opened();
  const results = await run(page, `
    const texts = [];
    let recipe = null;
    for (const open of [() => bridge.open([pick(undefined, "night-watch.edf")]), () => bridge.openDemo("watch")]) {
      await open();
      recipe ??= (await bridge.propose()).recipe;
      said.length = 0;
      await bridge.setRecipe(recipe);
      await until(() => said.some((s) => s.name === "finished"));
      texts.push(JSON.parse(new TextDecoder().decode(await bridge.takeaway("results-json"))));
    }
    return texts;
  `);
  assert.deepEqual(results[0].components, results[1].components);
  assert.deepEqual(results[0].compare, results[1].compare);
  await page.close();
});

test("stops within 200 ms and keeps what is done", async () => {
  const { page } = await opened();
  const { took, after, sheet } = await run(page, `
    await bridge.open([pick()]);
    const { recipe } = await bridge.propose();
    recipe.evidence.permutations = 100000;
    await bridge.setRecipe(recipe);
    const took = [];
    for (let i = 0; i < 8; i += 1) {
      await until(() => said.some((s) => s.name === "progress" && (i < 4 || s.stage === "permuting")));
      await new Promise((next) => setTimeout(next, 37 * i));
      const asked = performance.now();
      await bridge.stop();
      took.push(performance.now() - asked);
      if (i < 7) await bridge.resume();
    }
    said.length = 0;
    await new Promise((next) => setTimeout(next, 300));
    return { took, after: said.length, sheet: await bridge.figure("stronger-1-map") };
  `);
  assert.ok(Math.max(...took) <= 200, `stopping took ${took.map((/** @type {number} */ t) => Math.round(t)).join(", ")} ms`);
  assert.equal(after, 0, "nothing is said after a stop");
  assert.ok(sheet, "what was known is still there");
  await page.close();
});

test("a newer recipe overtakes an older one, and only its sheets follow", async () => {
  const { page } = await opened();
  const { answers, generations, keep } = await run(page, `
    await bridge.open([pick()]);
    const { recipe } = await bridge.propose();
    recipe.evidence.permutations = 100;
    const asked = [];
    for (let keep = 4; keep <= 20; keep += 1) asked.push(bridge.setRecipe({ ...recipe, keep }));
    const answers = await Promise.all(asked);
    said.length = 0;
    await until(() => said.some((s) => s.name === "finished"));
    const sheets = said.filter((s) => s.name === "sheet");
    return { answers, generations: sheets.map((s) => s.generation), keep: sheets.at(-1).sheet.compression.kept };
  `);
  const held = answers.filter((/** @type {unknown} */ a) => a !== null);
  assert.ok(answers.length - held.length > 0, "at least one was overtaken");
  assert.equal(answers.at(-1), Math.max(...held));
  assert.deepEqual([...new Set(generations)], [answers.at(-1)]);
  assert.equal(keep, 20);
  await page.close();
});

test("a recipe that does not fit is refused, and the one before still holds", async () => {
  const { page } = await opened();
  const { problem, name } = await run(page, `
    await bridge.open([pick()]);
    const { recipe } = await bridge.propose();
    const wrong = structuredClone(recipe);
    wrong.contrast.signal.event = "no such event";
    let problem = await bridge.setRecipe(wrong).catch((p) => p);
    await bridge.setRecipe(recipe);
    await until(() => said.some((s) => s.name === "finished"));
    const before = await bridge.figure("stronger-1-map");
    problem = await bridge.setRecipe(wrong).catch((p) => p);
    const after = await bridge.figure("stronger-1-map");
    if (JSON.stringify(before) !== JSON.stringify(after)) throw new Error("the result changed");
    return { problem, name: said.at(-1).name };
  `);
  assert.ok(["recipe", "contrast"].includes(problem.kind), JSON.stringify(problem));
  assert.match(JSON.stringify(problem), /no such event/);
  assert.ok(problem.advice.length > 0);
  assert.notEqual(name, "died");
  await page.close();
});

for (const [name, make, kind] of /** @type {[string, string, string][]} */ ([
  ["cut short", "pick(200_000)", "damaged"],
  ["cut in its header", "pick(300)", "damaged"],
  ["empty", "pick(0)", "empty"],
  ["something else", `new File(["a letter about fish, not a recording at all ".repeat(40)], "watch.edf")`, "unknown"],
])) {
  test(`a file that is ${name} gives a problem of kind ${kind}, and the next file opens`, async () => {
    const { page } = await opened();
    const { problem, next } = await run(page, `
      const problem = await bridge.open([${make}]).then(() => null, (p) => p);
      return { problem, next: (await bridge.open([pick()])).channels.length };
    `);
    assert.equal(problem.kind, kind);
    assert.equal(problem.file, "watch.edf");
    assert.ok(problem.what && problem.advice);
    assert.equal(next, 32);
    await page.close();
  });
}

test("the whole records before a cut open on request", async () => {
  const { page } = await opened();
  const { problem, summary } = await run(page, `
    const problem = await bridge.open([pick(200_000)]).then(() => null, (p) => p);
    return { problem, summary: await bridge.open([pick(200_000)], { salvage: true }) };
  `);
  assert.ok(problem.salvage.records > 0);
  assert.equal(summary.recording.duration_s, problem.salvage.seconds);
  await page.close();
});

test("two recordings at once are joined in the order of their names", async () => {
  const { page } = await opened();
  const [one, two] = await run(page, `
    const one = await bridge.open([pick()]);
    return [one, await bridge.open([pick(undefined, "b 10.edf"), pick(undefined, "b 9.edf")])];
  `);
  assert.equal(two.recording.name, "b 9.edf");
  assert.equal(two.recording.duration_s, 2 * one.recording.duration_s);
  assert.equal(two.recording.events.buoy, 2 * one.recording.events.buoy);
  await page.close();
});

test("an opening that is overtaken by another is told so", async () => {
  const { page } = await opened();
  const kinds = await run(page, `
    const first = bridge.open([pick()]).then(() => "opened", (p) => p.kind);
    const second = bridge.open([pick()]).then(() => "opened", (p) => p.kind);
    return Promise.all([first, second]);
  `);
  assert.deepEqual(kinds, ["stopped", "opened"]);
  await page.close();
});

test("when the worker dies the bridge says so, and comes back with the recording and the choices", async () => {
  const { page } = await opened();
  await run(page, `
    await bridge.open([pick()]);
    const { recipe } = await bridge.propose();
    await bridge.setRecipe({ ...recipe, keep: 9 });
    await until(() => said.some((s) => s.name === "finished"));
  `);
  const [worker] = page.workers();
  await worker.evaluate(() => void setTimeout(() => { throw new Error("a fault made by the test"); }));
  const back = await run(page, `
    await until(() => said.some((s) => s.name === "died"));
    const words = said.find((s) => s.name === "died").words;
    const refused = await bridge.figure("stronger-1-map").catch((p) => p.kind);
    said.length = 0;
    const summary = await bridge.revive();
    await until(() => said.some((s) => s.name === "finished"));
    return { words, refused, channels: summary.channels.length, kept: said.findLast((s) => s.name === "sheet").sheet.compression.kept };
  `);
  assert.match(back.words, /a fault made by the test/);
  assert.equal(back.refused, "died");
  assert.equal(back.channels, 32);
  assert.equal(back.kept, 9);
  await page.close();
});

test("nothing can be taken away before there is a contrast", async () => {
  const { page } = await opened();
  const kind = await run(page, `
    await bridge.open([pick()]);
    return bridge.takeaway("weights-json").then(() => "taken", (p) => p.kind);
  `);
  assert.equal(kind, "contrast");
  await page.close();
});
