// The whole job on the sheet, and the terminal's answer to the same recording and recipe.
import assert from "node:assert/strict";
import { execFile } from "node:child_process";
import { mkdtemp, readFile, rm, writeFile } from "node:fs/promises";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { promisify } from "node:util";
import { download, launch, openPage, picture, reaches, recordings, root } from "./harness.mjs";

const run = promisify(execFile);
const terminal = process.env.TEASEL_TERMINAL ?? join(root, "target/debug/teasel");
const edf = join(recordings, "night-watch.edf");

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
let folder = "";
before(async () => {
  browser = await launch();
  folder = await mkdtemp(join(tmpdir(), "teasel-agree-"));
});
after(async () => {
  await browser.close();
  await rm(folder, { recursive: true, force: true });
});

/** Opens the recording with this recipe in the address, and waits for the end. @param {any} recipe */
async function onThePage(recipe) {
  const link = Buffer.from(JSON.stringify(recipe)).toString("base64url");
  const { page, seen } = await openPage(browser.context, { fragment: `#recipe=${link}` });
  await reaches(page, ["empty"]);
  await page.setInputFiles("input#recording", edf);
  assert.equal(await reaches(page, ["ready", "error"], 180_000), "ready", (await page.textContent("#problem")) ?? "");
  return { page, seen };
}

/** What the terminal makes of it. @param {any} recipe @param {string} name */
async function inTheTerminal(recipe, name) {
  const file = join(folder, `${name}.json`);
  await writeFile(file, JSON.stringify(recipe));
  const out = join(folder, name);
  await run(terminal, ["run", file, edf, "--out", out]);
  return join(out, "night-watch");
}

/** Largest relative difference of the numbers in two values of one shape; anything else that differs is an error. */
function apart(/** @type {any} */ a, /** @type {any} */ b, path = "$") {
  if (typeof a === "number" && typeof b === "number") {
    return { by: a === b ? 0 : Math.abs(a - b) / Math.max(Math.abs(a), Math.abs(b)), path };
  }
  if (a === null || b === null || typeof a !== "object" || typeof b !== "object") {
    assert.deepEqual(a, b, path);
    return { by: 0, path };
  }
  assert.deepEqual(Object.keys(a), Object.keys(b), path);
  let worst = { by: 0, path };
  for (const key of Object.keys(a)) {
    const here = apart(a[key], b[key], `${path}.${key}`);
    if (here.by > worst.by) worst = here;
  }
  return worst;
}

const chosen = JSON.parse(await readFile(join(recordings, "night-watch.recipe.json"), "utf8"));
for (const [name, recipe] of /** @type {[string, any][]} */ ([
  ["typical", { ...chosen, evidence: { ...chosen.evidence, permutations: 200 } }],
  ["total", { ...chosen, measure: "total", keep: 10, evidence: { ...chosen.evidence, permutations: 99, seed: 5 } }],
])) {
  test(`page and terminal give the same results.json: ${name}`, async () => {
    const { page, seen } = await onThePage(recipe);
    const taken = await download(page, 'button[data-takeaway="results-json"]');
    const ours = JSON.parse(taken.bytes.toString());
    const theirs = JSON.parse(await readFile(join(await inTheTerminal(recipe, name), "results.json"), "utf8"));
    const worst = apart(ours, theirs);
    assert.ok(worst.by <= 1e-9, `${worst.path} differs by ${worst.by}`);
    assert.equal(ours.components.length, 4);
    assert.ok(ours.components[0].typical.held_out > 1.2, "the planted rhythm is found");
    assert.deepEqual(seen.requests, []);
    assert.deepEqual(seen.violations, []);
    assert.deepEqual(seen.errors, []);
    await page.close();
  });
}

test("weights.json of the page, applied in the terminal, gives the terminal's own component", async () => {
  const recipe = { ...chosen, evidence: { ...chosen.evidence, permutations: 50 } };
  const { page } = await onThePage(recipe);
  const taken = await download(page, 'button[data-takeaway="weights-json"]');
  await page.close();
  const weights = join(folder, "page-weights.json");
  await writeFile(weights, taken.bytes);
  await run(terminal, ["apply", weights, edf, "--out", join(folder, "carried")]);
  const series = async (/** @type {string} */ path) => {
    const [header, ...lines] = (await readFile(path, "utf8")).trim().split(/\r?\n/);
    return { column: header.split(",").findIndex((name) => /stronger.1$/.test(name)), rows: lines.map((line) => line.split(",").map(Number)) };
  };
  const own = await series(join(await inTheTerminal(recipe, "own"), "series.csv"));
  const carried = await series(join(folder, "carried/night-watch/series.csv"));
  assert.ok(own.column > 0 && carried.column > 0);
  assert.equal(own.rows.length, carried.rows.length);
  let [size, difference] = [0, 0];
  own.rows.forEach((row, i) => {
    size = Math.max(size, Math.abs(row[own.column]));
    difference = Math.max(difference, Math.abs(row[own.column] - carried.rows[i][carried.column]));
  });
  // Samples are stored as 32-bit floats between the filters: 24 bits of each, summed over the channels.
  assert.ok(difference <= size * 2 ** -18, `differs by ${difference} where the component reaches ${size}`);
});

test("the demo button goes the whole way", async () => {
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.click('button[data-demo="watch"]');
  assert.equal(await reaches(page, ["ready", "error"], 180_000), "ready");
  await picture(page, "demo", true);
  const everything = await download(page, 'button[data-takeaway="everything"]');
  assert.equal(everything.bytes.subarray(0, 4).toString("latin1"), "PK\x03\x04");
  assert.match(everything.bytes.toString("latin1"), /results\.json/);
  assert.deepEqual(seen, { requests: [], violations: [], errors: [] });
  await page.close();
});

test("the stop button ends the work within 200 ms and the sheet stays", async () => {
  const { page } = await openPage(browser.context, {
    fragment: `#recipe=${Buffer.from(JSON.stringify({ ...chosen, evidence: { ...chosen.evidence, permutations: 50_000 } })).toString("base64url")}`,
  });
  await reaches(page, ["empty"]);
  await page.setInputFiles("input#recording", edf);
  await page.waitForFunction(() => document.documentElement.dataset.state === "working" && document.documentElement.hasAttribute("data-sheet"));
  const took = await page.evaluate(
    () =>
      new Promise((done) => {
        const from = performance.now();
        new MutationObserver(() => document.documentElement.dataset.state !== "working" && done(performance.now() - from)).observe(
          document.documentElement,
          { attributeFilter: ["data-state"] },
        );
        /** @type {HTMLButtonElement} */ (document.querySelector("button#stop")).click();
      }),
  );
  assert.ok(took <= 200, `stopping took ${took} ms`);
  assert.notEqual(await page.evaluate(() => document.documentElement.dataset.state), "error");
  await page.close();
});

test("a recording that is cut short is a problem in words, with the way on", async () => {
  const cut = join(folder, "cut.edf");
  await writeFile(cut, (await readFile(edf)).subarray(0, 1_000_000));
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.setInputFiles("input#recording", cut);
  assert.equal(await reaches(page, ["ready", "choosing", "error"]), "error");
  const words = (await page.textContent("#problem")) ?? "";
  assert.match(words, /cut\.edf/);
  assert.match(words, /\d+ whole records/);
  await picture(page, "cut");
  assert.deepEqual(seen.errors, []);
  await page.close();
});
