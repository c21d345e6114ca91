// The five kinds of contrast, by mouse and by keyboard; a recording without events; the share that is locked away.
import assert from "node:assert/strict";
import { mkdir, writeFile } from "node:fs/promises";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { launch, openPage, picture, reaches, recordings } from "./harness.mjs";
import { noise } from "./recordings.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => void (browser = await launch()));
after(() => browser.close());

async function demo() {
  const opened = await openPage(browser.context);
  await opened.page.click('button[data-demo="watch"]');
  assert.equal(await reaches(opened.page, ["ready", "error"], 120_000), "ready");
  return opened;
}

/** @param {import("playwright-core").Page} page */
async function recipeInLink(page) {
  await page.waitForTimeout(400);
  const text = await page.evaluate(() => location.hash.replace("#recipe=", ""));
  return JSON.parse(Buffer.from(text, "base64url").toString("utf8"));
}

/** Waits for the results of what was just chosen. @param {import("playwright-core").Page} page */
async function settled(page) {
  await page.waitForFunction(() => !document.documentElement.hasAttribute("data-stale"), undefined, { timeout: 120_000 });
  assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready");
}

/** The null hypothesis that stands under the permutation's figure. @param {import("playwright-core").Page} page */
const nullOf = (page) => page.locator("#evidence .null").textContent();

test("each kind is chosen from the list, and says what it supposes", async () => {
  const { page, seen } = await demo();
  for (const [kind, says, fields] of /** @type {const} */ ([
    ["band", /same spectrum but for its size/, "centre of the band, in Hz"],
    ["repeatable", /Nothing repeats/, "event of the trials"],
    ["slow", /same spectrum but for its size/, "lag, in milliseconds"],
    ["spans", /nothing to do with when the spans lie/, "signal spans"],
    ["windows", /exchangeable/, "event of the reference windows"],
  ])) {
    await page.selectOption("#kind", kind);
    await page.waitForFunction((wanted) => document.querySelector("#kind")?.value === wanted, kind);
    await settled(page);
    assert.match((await nullOf(page)) ?? "", says, kind);
    assert.ok(await page.getByLabel(fields, { exact: true }).first().isVisible(), kind);
    assert.equal((await recipeInLink(page)).contrast.kind, kind);
    assert.ok((await page.locator("#reading-windows").textContent())?.length, kind);
    await page.locator("#windows").scrollIntoViewIfNeeded();
    await picture(page, `kinds-${kind}`);
  }
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("the keyboard alone chooses a rhythm and its centre", async () => {
  const { page } = await demo();
  await page.locator("#kind").focus();
  // The list opens with windows; two down is the rhythm.
  await page.keyboard.press("ArrowDown");
  await page.keyboard.press("ArrowDown");
  await settled(page);
  assert.equal(await page.locator("#kind").inputValue(), "band");
  const centre = page.getByLabel("centre of the band, in Hz");
  await centre.focus();
  await page.keyboard.press("Control+A");
  await page.keyboard.type("21");
  await page.keyboard.press("Enter");
  await settled(page);
  const { contrast } = await recipeInLink(page);
  assert.deepEqual([contrast.centre_hz, contrast.half_width_hz, contrast.reference], [21, 2, "flanks"]);
  // A band whose lower neighbour would lie below 0 Hz is refused where it is typed.
  await page.keyboard.press("Control+A");
  await page.keyboard.type("5");
  await page.keyboard.press("Enter");
  assert.match((await page.locator("#windows .refused:not([hidden])").first().textContent()) ?? "", /room below/);
  await page.close();
});

test("what repeats leaves one measure, and going back keeps the windows", async () => {
  const { page } = await demo();
  const first = (await recipeInLink(page)).contrast;
  await page.selectOption("#kind", "repeatable");
  await settled(page);
  assert.deepEqual(await page.locator('input[name="measure"]').evaluateAll((list) => list.map((input) => input.value)), ["total"]);
  assert.equal((await recipeInLink(page)).measure, "total");
  await page.selectOption("#kind", "windows");
  await settled(page);
  const back = await recipeInLink(page);
  assert.deepEqual(back.contrast, first);
  assert.equal(back.measure, "typical");
  await page.close();
});

test("spans are typed as times, and what cannot be read is refused", async () => {
  const { page } = await demo();
  await page.selectOption("#kind", "spans");
  await settled(page);
  const times = page.getByLabel("signal spans, in seconds");
  await times.fill("10 to 40, 90 to 130.5");
  await times.press("Enter");
  await settled(page);
  assert.deepEqual((await recipeInLink(page)).contrast.signal, [[10, 40], [90, 130.5]]);
  await times.fill("40 to 10");
  await times.press("Enter");
  assert.match((await page.locator("#windows .refused:not([hidden])").first().textContent()) ?? "", /must read like/);
  await page.close();
});

test("only some of the events, by number and by pattern", async () => {
  const { page } = await demo();
  await page.locator("#windows details.more summary").first().click();
  const last = page.getByLabel("only the last").first();
  await last.fill("20");
  await last.press("Enter");
  await settled(page);
  const { contrast } = await recipeInLink(page);
  assert.equal(contrast.signal.last, 20);
  assert.equal(contrast.reference.last, 20);
  assert.match((await page.locator("#reading-windows").textContent()) ?? "", /^20 of 20/);
  await page.close();
});

test("a recording without events is asked about a rhythm, or left to be marked", async () => {
  const { page } = await openPage(browser.context);
  await mkdir(recordings, { recursive: true });
  const file = join(recordings, "rhythm.edf");
  const bytes = noise([]);
  // A rhythm of 11 Hz in the samples, which begin after the header; 100 Hz, four channels, one second a record.
  const samples = new Int16Array(bytes.buffer.slice(bytes.byteOffset + 256 * 5, bytes.byteOffset + bytes.length - ((bytes.length - 256 * 5) % 2)));
  for (let i = 0; i < samples.length; i += 1) {
    const [record, within] = [Math.floor(i / 400), i % 100];
    const t = record + within / 100;
    samples[i] = (samples[i] ?? 0) * 0.3 + 250 * Math.sin(2 * Math.PI * 11 * t) * (1 + (Math.floor((i % 400) / 100) % 2));
  }
  Buffer.from(samples.buffer).copy(bytes, 256 * 5);
  await writeFile(file, bytes);
  await page.setInputFiles("input#recording", file);
  assert.equal(await reaches(page, ["ready", "error", "choosing"], 60_000), "ready");
  assert.equal(await page.locator("#kind").inputValue(), "band");
  const { contrast } = await recipeInLink(page);
  assert.equal(contrast.centre_hz, 11);
  assert.match((await page.locator("#windows .why").textContent()) ?? "", /marks no events.* at 11 Hz/);
  await page.close();
});
