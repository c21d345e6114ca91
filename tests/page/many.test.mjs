// A set of recordings on the page: one at a time with one recipe, failures listed, and the terminal's own table.
import assert from "node:assert/strict";
import { execFile } from "node:child_process";
import { mkdtemp, readFile, rm, writeFile } from "node:fs/promises";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { promisify } from "node:util";
import { download, launch, openPage, picture, reaches, root } from "./harness.mjs";
import { noise } from "./recordings.mjs";

const run = promisify(execFile);
const terminal = process.env.TEASEL_TERMINAL ?? join(root, "target/debug/teasel");
const events = Array.from({ length: 24 }, (_, k) => ({ onset: 2 * k + 2, label: "knock" }));
const recipe = {
  teasel_recipe: 1,
  contrast: { kind: "windows", signal: { event: "knock", from_s: 0, to_s: 0.8 }, reference: { event: "knock", from_s: -0.8, to_s: 0 } },
  components: 1,
  evidence: { folds: 5, permutations: 40, bootstrap: 40, seed: 3 },
};

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
let folder = "";
/** @type {string[]} */
const files = [];
before(async () => {
  browser = await launch();
  folder = await mkdtemp(join(tmpdir(), "teasel-many-"));
  const names = ["one.edf", "two.edf", "three.edf", "four.edf", "five.edf", "torn.edf", "<b>=1+1 \u202Eevil.edf"];
  for (const [k, name] of names.entries()) {
    // Other events, other samples of the same noise at the windows.
    const whole = noise(events.map(({ onset, label }) => ({ onset: onset + 0.01 * k, label })));
    await writeFile(join(folder, name), name === "torn.edf" ? whole.subarray(0, whole.length / 2 + 3) : whole);
    files.push(join(folder, name));
  }
  files.push(join(folder, "recipe.json"));
  await writeFile(join(folder, "recipe.json"), JSON.stringify(recipe));
});
after(async () => {
  await browser.close();
  await rm(folder, { recursive: true, force: true });
});

/** Files given at once may be one recording: the page asks, and is told that each is one. @param {import("playwright-core").Page} page */
async function apart(page) {
  await page.getByRole("button", { name: "Ask one question of each" }).click();
}

/** @param {import("playwright-core").Page} page @param {string} state */
const becomes = (page, state) => page.waitForFunction((wanted) => document.documentElement.dataset.many === wanted, state, { timeout: 120_000 });

test("a set is asked one by one; the table is the terminal's, and what failed is listed", async () => {
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.setInputFiles("input#recording", files);
  await apart(page);
  await becomes(page, "offered");
  assert.match((await page.textContent("#many .said")) ?? "", /7 recordings/);
  await page.getByRole("button", { name: "Ask all with the recipe that came along" }).click();
  await becomes(page, "ready");
  const queue = await page.locator("#many .queue li").allTextContents();
  assert.equal(queue.filter((text) => /done$/.test(text)).length, 6, queue.join("; "));
  assert.equal(queue.filter((text) => /torn\.edf.*not analysed/.test(text)).length, 1, queue.join("; "));
  assert.equal(await page.locator("#many b", { hasText: "=1+1" }).count(), 0, "a file's name is never markup");

  const out = join(folder, "out");
  const recordings = files.filter((file) => file.endsWith(".edf"));
  await assert.rejects(run(terminal, ["run", join(folder, "recipe.json"), ...recordings, "--out", out]), /torn\.edf/);
  const theirs = JSON.parse(await readFile(join(out, "table.json"), "utf8"));
  const ours = JSON.parse((await download(page, '[data-many="table.json"]')).bytes.toString());
  alike(ours, theirs, "$");
  assert.equal(theirs.recordings.length, 7);
  assert.equal(theirs.group.stronger.recordings, 6);
  const csv = (await download(page, '[data-many="table.csv"]')).bytes.toString();
  assert.equal(csv.split("\n").length, (await readFile(join(out, "table.csv"), "utf8")).split("\n").length);
  assert.ok((await page.locator("#many .group-figures canvas:visible").count()) > 2, "the group is drawn");
  await picture(page, "many-1280", true);
  await page.setViewportSize({ width: 820, height: 1180 });
  await picture(page, "many-820", true);
  await page.emulateMedia({ colorScheme: "dark" });
  await picture(page, "many-dark", true);
  assert.deepEqual(seen, { requests: [], violations: [], errors: [] });
  await page.close();
});

test("without a recipe the first recording asks for the question, and stopping keeps what is done", async () => {
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.setInputFiles("input#recording", files.slice(0, 5));
  await apart(page);
  await becomes(page, "offered");
  assert.equal(await page.getByRole("button", { name: "Ask all with" }).isDisabled(), true);
  await page.getByRole("button", { name: "Choose the question on the first one" }).click();
  await reaches(page, ["ready", "choosing"]);
  await page.getByRole("button", { name: "Ask all with the choices on this sheet" }).click();
  await becomes(page, "working");
  await page.locator("#many .queue li", { hasText: /done$/ }).first().waitFor();
  await page.locator("#many").getByRole("button", { name: "Stop" }).click();
  await becomes(page, "ready");
  assert.match((await page.textContent("#many .said")) ?? "", /Stopped/);
  await page.getByRole("button", { name: "Set them aside" }).click();
  assert.equal(await page.locator("#many").isHidden(), true);
  assert.deepEqual(seen, { requests: [], violations: [], errors: [] });
  await page.close();
});

/** The same shape, words and, to 1e-9, numbers. @param {any} a @param {any} b @param {string} path */
function alike(a, b, path) {
  if (typeof a === "number" && typeof b === "number") return void assert.ok(Math.abs(a - b) <= 1e-9 * Math.max(1e-6, Math.abs(a), Math.abs(b)), `${path}: ${a} and ${b}`);
  if (a === null || b === null || typeof a !== "object" || typeof b !== "object") return void assert.deepEqual(a, b, path);
  assert.deepEqual(Object.keys(a), Object.keys(b), path);
  for (const key of Object.keys(a)) alike(a[key], b[key], `${path}.${key}`);
}
