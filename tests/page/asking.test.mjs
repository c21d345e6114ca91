// What a file leaves open is asked in the place of an error; the answers open it and stay in the recipe. Files of one recording are joined
// only when that is said.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { download, launch, openPage, picture, reaches } from "./harness.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => {
  browser = await launch();
});
after(() => browser.close());

/** Six channels of noise at 100 Hz, half a minute, with a mark every second; `seed` makes another piece of it. */
function table(seed = 1) {
  let state = seed;
  const noise = () => (state = (state * 48271) % 2147483647) / 2147483647 - 0.5;
  const rows = ["Fz,Cz,Pz,O1,O2,T7,marker"];
  for (let k = 0; k < 3000; k += 1) rows.push([...Array.from({ length: 6 }, () => (20 * noise()).toFixed(2)), k % 100 === 50 ? "light" : ""].join(","));
  return { name: `walk-${seed}.csv`, mimeType: "text/csv", buffer: Buffer.from(`${rows.join("\n")}\n`) };
}

test("a table without a rate and a unit is asked for both, by keyboard, and its recipe keeps the answers", async () => {
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.setInputFiles("#recording", table());
  await reaches(page, ["error"]);
  assert.match(await page.innerText("#problem h3"), /walk-1\.csv does not say its sampling rate and its unit/);
  await picture(page, "asking");
  assert.equal(await page.evaluate(() => document.activeElement?.id), "ask-rate_hz");
  await page.keyboard.type("fast");
  await page.keyboard.press("Enter");
  assert.equal(await page.getAttribute("#ask-rate_hz", "aria-invalid"), "true");
  await page.fill("#ask-rate_hz", "100");
  assert.equal(await page.inputValue("#ask-unit"), "uV");
  await page.selectOption("#ask-unit", "mV");
  await page.keyboard.press("Enter");
  await reaches(page, ["ready"]);
  assert.match(await page.innerText("#opened"), /6 channels · 100 Hz/);
  const recipe = JSON.parse((await download(page, '[data-takeaway="recipe"]')).bytes.toString());
  assert.deepEqual(recipe.recording, { rate_hz: 100, unit: "mV" });
  assert.deepEqual(seen, { requests: [], violations: [], errors: [] });
  await page.close();
});

test("a recipe that waits answers for its recording", async () => {
  const { page } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  const contrast = { kind: "windows", signal: { event: "light", from_s: 0, to_s: 0.4 }, reference: { event: "light", from_s: -0.4, to_s: 0 } };
  const recipe = { teasel_recipe: 1, recording: { rate_hz: 100, unit: "uV" }, contrast };
  await page.setInputFiles("#recipe-file", { name: "recipe.json", mimeType: "application/json", buffer: Buffer.from(JSON.stringify(recipe)) });
  await page.waitForSelector("#hint:not([hidden])");
  await page.setInputFiles("#recording", table());
  await reaches(page, ["ready"]);
  assert.ok(await page.isHidden("#problem"));
  await page.close();
});

test("two recordings are joined when that is said, and in the order of their names", async () => {
  const { page } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.setInputFiles("#recording", [table(10), table(9)]);
  await reaches(page, ["error"]);
  assert.deepEqual(await page.locator("#problem .parts li").allInnerTexts(), ["walk-9.csv", "walk-10.csv"]);
  await picture(page, "parts");
  await page.getByRole("button", { name: "Open them as one recording" }).click();
  await page.waitForSelector("#ask-rate_hz");
  await page.fill("#ask-rate_hz", "100");
  await page.keyboard.press("Enter");
  await reaches(page, ["ready"]);
  assert.match(await page.innerText("#opened"), /walk-9\.csv · 6 channels · 100 Hz · 60 s/);
  await page.close();
});
