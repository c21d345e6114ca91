// The page's side of the budget table: prints {row: number} as JSON.   node page.mjs RECORDING.edf RECIPE.json
import { readFile } from "node:fs/promises";
import { join } from "node:path";
import { gunzipSync } from "node:zlib";
import { build } from "esbuild";
import { bridgeUrl, launch, openPage, pageFile, reaches, root } from "../page/harness.mjs";
import { hour, large } from "./long.mjs";

const [recording, recipeFile] = process.argv.slice(2);
const recipe = await readFile(recipeFile, "utf8");
const { context, close } = await launch();
const rows = /** @type {Record<string, number>} */ ({});

/** The sheet itself: from the start of loading until it takes a recording. */
async function firstScreen() {
  const times = [];
  for (let i = 0; i < 5; i += 1) {
    const { page } = await openPage(context);
    await reaches(page, ["empty"]);
    await page.waitForFunction(() => performance.getEntriesByName("teasel:started").length > 0);
    times.push(
      await page.evaluate(() => {
        const [loading] = /** @type {PerformanceNavigationTiming[]} */ (performance.getEntriesByType("navigation"));
        return performance.getEntriesByName("teasel:started")[0].startTime - loading.responseEnd;
      }),
    );
    await page.close();
  }
  rows.first_screen_ms = median(times);
}

/** The engine behind the sheet: bridge, worker, drawing on real canvases. */
async function engine() {
  const { page } = await openPage(context, { url: await bridgeUrl() });
  await page.evaluate(() => document.body.append(Object.assign(document.createElement("input"), { type: "file", id: "file" })));
  await page.setInputFiles("#file", recording);
  const measured = await page.evaluate(async (text) => {
    // A problem is a plain object: thrown as an error, so that it can be read.
    const readable = (/** @type {any} */ problem) => Promise.reject(problem instanceof Error ? problem : new Error(JSON.stringify(problem)));
    const w = /** @type {any} */ (globalThis);
    const bridge = await w.bridgeReady;
    const input = /** @type {HTMLInputElement} */ (document.getElementById("file"));
    const watched = ["stronger-1-map", "stronger-1-spectrum"];
    const canvases = watched.map(() => document.body.appendChild(document.createElement("canvas")));
    let /** @type {any} */ wanted = null;
    const /** @type {{ stage: string, at: number }[]} */ stages = [];
    bridge.on("progress", (/** @type {any} */ news) => {
      if (stages.at(-1)?.stage !== news.stage) stages.push({ stage: news.stage, at: performance.now() });
    });
    bridge.on("finished", () => stages.push({ stage: "end", at: performance.now() }));
    bridge.on("problem", (/** @type {any} */ problem) => wanted?.failed(new Error(JSON.stringify(problem))));
    bridge.on("sheet", (/** @type {any} */ news) => {
      const shown = news.sheet.stronger[0] && watched.every((name) => news.drawn[name]);
      if (!wanted || !shown || !wanted.fits(news)) return;
      watched.forEach((name, i) => {
        const figure = news.drawn[name];
        bridge.draw(canvases[i], figure, { width: 400, height: bridge.figureHeight(figure, 400), scale: 2, dark: false });
      });
      wanted.done(performance.now());
      wanted = null;
    });
    /** Time until the new ratio is there and its map and spectrum are drawn. */
    const drawn = (/** @type {any} */ next, /** @type {number} */ from) =>
      new Promise((done, failed) => {
        wanted = { done: (/** @type {number} */ at) => done(at - from), failed, fits: (/** @type {any} */ news) => JSON.stringify(news.sheet.recipe) === next };
        bridge.setRecipe(JSON.parse(next)).catch(readable).catch(failed);
      });
    const until = async (/** @type {string} */ stage) => {
      while (stages.at(-1)?.stage !== stage) await new Promise((next) => setTimeout(next, 20));
    };
    const asked = bridge.parseRecipe(text);
    const asText = (/** @type {any} */ recipe) => JSON.stringify(recipe);

    await bridge.watch(watched);
    const from = performance.now();
    await bridge.open([.../** @type {FileList} */ (input.files)]).catch(readable);
    const opened = performance.now() - from;
    const read = (stages.findLast(({ stage }) => stage === "reading")?.at ?? 0) - from;
    const first = await drawn(asText(asked), from);
    await until("end");
    const toEnd = performance.now() - from;

    const keeps = [];
    for (const keep of [20, 24, 28, 32, 36, 40, 48]) keeps.push(await drawn(asText({ ...asked, keep }), performance.now()));
    const edges = [];
    for (const step of [1, 2, 3, 4, 5]) {
      const moved = structuredClone(asked);
      moved.contrast.signal.from_s += step * 0.05;
      edges.push(await drawn(asText(moved), performance.now()));
    }
    stages.length = 0;
    await bridge.setRecipe({ ...asked, keep: 32 });
    await until("end");
    const at = (/** @type {string} */ stage) => stages.find((s) => s.stage === stage)?.at ?? NaN;
    const after = stages[stages.findIndex(({ stage }) => stage === "permuting") + 1]?.at ?? NaN;
    return { opened, read, first, toEnd, keeps, edges, permuting: after - at("permuting"), memory: await bridge.memory() };
  }, recipe);
  rows.opened_ms = measured.opened;
  rows.read_ms = measured.read;
  rows.first_result_ms = measured.first;
  rows.everything_ms = measured.toEnd;
  rows.change_keep_ms = median(measured.keeps);
  rows.change_edge_ms = median(measured.edges);
  rows.permute_ms = measured.permuting;
  rows.memory_bytes = measured.memory;
  await page.close();
}

/** The kernels alone. */
async function kernels() {
  const { outputFiles } = await build({
    entryPoints: [join(root, "tests/bench/kernels.js")],
    bundle: true,
    format: "iife",
    write: false,
    define: { "import.meta.url": '"about:blank"' },
    alias: { "teasel-module": join(root, "target/page/teasel_page.js") },
  });
  const html = await readFile(pageFile, "utf8");
  const module = gunzipSync(Buffer.from(html.match(/id="teasel-module">([^<]+)</)?.[1] ?? "", "base64")).toString("base64");
  const page = await context.newPage();
  await page.evaluate(outputFiles[0].text);
  const measured = await page.evaluate(
    (text) => /** @type {any} */ (globalThis).kernels(Uint8Array.from(atob(text), (c) => c.charCodeAt(0))),
    module,
  );
  Object.assign(rows, measured);
  await page.close();
}

/** @param {number[]} values */
function median(values) {
  return [...values].sort((a, b) => a - b)[values.length >> 1];
}

await firstScreen();
await engine();
await kernels();
Object.assign(rows, await hour(context), await large(context));
await close();
console.log(JSON.stringify(rows));
