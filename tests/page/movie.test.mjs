// The movie demo: pixels told by row and column, its pictures, bins, a mask and a running baseline; no list of thousands of channels.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { launch, openPage, picture, reaches } from "./harness.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => void (browser = await launch()));
after(() => browser.close());

/** Waits for the results of what was just chosen. @param {import("playwright-core").Page} page */
async function settled(page) {
  await page.waitForTimeout(400);
  await page.waitForFunction(() => !document.documentElement.hasAttribute("data-stale"), undefined, { timeout: 120_000 });
  assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready");
}

/** @param {import("playwright-core").Page} page @param {string} id */
const reading = async (page, id) => (await page.locator(`#reading-${id}`).textContent()) ?? "";

test("a movie is told as a movie, and its pixels can be binned, masked and set against a baseline", async () => {
  const { page, seen } = await openPage(browser.context);
  await page.click('button[data-demo="movie"]');
  assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready");
  assert.match((await page.locator("#opened").textContent()) ?? "", /100 × 100 pixels/);
  assert.match(await reading(page, "recording"), /^100 × 100 pixels at 20/);
  assert.match(await reading(page, "channels"), /^All 10,000 pixels are used/);
  assert.match(await reading(page, "so-far"), /largest at row\s\d+, column\s\d+/);
  assert.equal(await page.locator(".chips button").count(), 0);
  assert.ok(await page.locator(".leave-out").isHidden());
  assert.ok(await page.locator(".places").isHidden());

  // The page holds through every section: pictures, maps, the pixels under a component.
  for (const id of ["recording", "channels", "compression", "components", "evidence", "take-away"]) {
    await page.locator(`section#${id}`).scrollIntoViewIfNeeded();
    await page.waitForTimeout(300);
  }
  await page.locator("#channels .pictures canvas").waitFor();
  await page.locator('.whole [data-figure$="-map"] canvas').waitFor();
  await page.locator("#components").scrollIntoViewIfNeeded();
  await page.waitForFunction(() => /row \d+, column \d+/.test(document.querySelector(".opened-one .told")?.textContent ?? ""));
  await picture(page, "movie-components");

  await page.getByLabel("pixels along a side of a bin").selectOption("4");
  await page.waitForFunction(() => /^All 625 bins of 4 × 4 pixels are used/.test((document.querySelector("#reading-channels")?.textContent ?? "").replaceAll("\u00a0", " ")), undefined, { timeout: 120_000 });
  await page.getByLabel("which pixels are used").selectOption("bright");
  await page.waitForFunction(() => /^31[23] of 625 bins/.test((document.querySelector("#reading-channels")?.textContent ?? "").replaceAll("\u00a0", " ")), undefined, { timeout: 120_000 });
  await page.locator(".movie input[type=checkbox]").check();
  await settled(page);
  await page.waitForFunction(() => /bins of 4 × 4 pixels .*0\.5 quantile.*running baseline, \(F.*10th percentile of a window of 30/s.test(document.querySelector("#methods")?.textContent ?? ""), undefined, { timeout: 120_000 });
  await page.locator("#channels").scrollIntoViewIfNeeded();
  await picture(page, "movie-binned");
  assert.deepEqual(seen.errors, []);
  assert.notEqual(await page.evaluate(() => document.documentElement.dataset.state), "error");
  await page.close();
});
