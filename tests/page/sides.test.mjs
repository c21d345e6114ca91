// Side files as a user meets them: what the files tell, a table of events with columns of its own, channels without positions, a typed grid.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { launch, openPage, picture, reaches } from "./harness.mjs";
import { noise } from "./recordings.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => void (browser = await launch()));
after(() => browser.close());

/** @param {string} name @param {string | Buffer} content */
const file = (name, content) => ({ name, mimeType: "", buffer: Buffer.from(content) });
const onsets = Array.from({ length: 27 }, (_, i) => 2 * i + 2.5);
const events = onsets.map((onset) => ({ onset, label: "beep" }));

/** @param {import("playwright-core").Page} page @param {string} label */
const fact = (page, label) => page.locator(".facts div", { has: page.locator("dt", { hasText: new RegExp(`^${label}$`) }) }).locator("dd").textContent();

/** The channels of the noise. */
const CHANNELS = ["A1", "A2", "A3", "A4"];

test("a table with columns of its own is asked about, and its answers become the recipe's", async () => {
  const { page, seen } = await openPage(browser.context);
  await page.setInputFiles("#recording", file("quiet.edf", noise([])));
  assert.equal(await reaches(page, ["choosing", "error"]), "choosing");
  const rows = onsets.map((onset, i) => `${Math.round(onset * 1000)};${i % 2 ? "low" : "high"};x`);
  await page.setInputFiles("#recording", file("log.csv", `stamp;tone;note\n${rows.join("\n")}\n`));
  await page.locator("#mapping").waitFor();
  assert.equal(await page.locator("#mapping .rows tbody tr").count(), 5);
  assert.match((await page.locator("#mapping .outcome").textContent()) ?? "", /^27 rows give high 14×, low 13×, from 0:03 to 0:55\.$/);
  await page.locator("#mapping label", { hasText: /^seconds$/ }).click();
  assert.match((await page.locator("#mapping .outcome").textContent()) ?? "", /But 27 of them lie after the end/);
  await page.getByLabel("column of the times").selectOption("tone");
  assert.match((await page.locator("#mapping .outcome").textContent()) ?? "", /line 2, column tone/);
  assert.ok(await page.locator("#use-events").isDisabled());
  await page.getByLabel("column of the times").selectOption("stamp");
  await page.locator("#mapping label", { hasText: "milliseconds" }).click();
  await page.getByLabel("column of the labels").selectOption("");
  await picture(page, "mapping");
  await page.locator("#use-events").focus();
  await page.keyboard.press("Enter");
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  assert.ok(await page.locator("#mapping").isHidden());
  assert.equal(await fact(page, "events"), "27: event 27×");
  assert.equal(await fact(page, "side files"), "log.csv");
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("channels without positions are said to have none, and a typed grid places them", async () => {
  const { page, seen } = await openPage(browser.context);
  await page.setInputFiles("#recording", [file("plain_eeg.edf", noise(events)), file("plain_channels.tsv", depth)]);
  assert.equal(await reaches(page, ["ready", "choosing", "error"]), "ready");
  assert.match((await fact(page, "positions")) ?? "", /^none of 4: patterns stand in order of size$/);
  const places = page.locator(".places");
  assert.ok(await places.evaluate((details) => /** @type {HTMLDetailsElement} */ (details).open));
  assert.match((await places.locator("summary").textContent()) ?? "", /not known$/);
  await page.getByLabel("rows", { exact: true }).fill("1");
  await page.getByLabel("columns", { exact: true }).fill("3");
  await page.locator("#place").click();
  assert.match((await page.locator(".places > .refused").textContent()) ?? "", /1 × 3 are 3 places, and the channels need 4/);
  await page.getByLabel("rows", { exact: true }).fill("2");
  await page.getByLabel("columns", { exact: true }).fill("2");
  await page.locator("#place").click();
  await page.waitForFunction(() => /all 4 on a grid of 2 × 2, 10 mm apart/.test(document.querySelector(".places summary")?.textContent ?? ""));
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  await page.evaluate(() => document.querySelector("#channels")?.scrollIntoView({ behavior: "instant" }));
  await page.waitForTimeout(400);
  await picture(page, "grid");
  await page.locator("#unplace").click();
  await page.waitForFunction(() => /not known$/.test(document.querySelector(".places summary")?.textContent ?? ""));
  assert.deepEqual(seen.errors, []);
  await page.close();
});

/** A table that calls every channel of the noise a depth contact, so that no name is a place on a head. */
const depth = `name\ttype\tunits\n${CHANNELS.map((name) => `${name}\tSEEG\tuV\n`).join("")}`;

test("a channel that a side file sets aside comes back by pressing its name", async () => {
  const { page } = await openPage(browser.context);
  const table = `name\ttype\tunits\tstatus\n${CHANNELS.map((name, i) => `${name}\tEEG\tuV\t${i ? "good" : "bad"}\n`).join("")}`;
  await page.setInputFiles("#recording", [file("names.edf", noise(events)), file("names_channels.tsv", table)]);
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  assert.match((await fact(page, "set aside")) ?? "", /\(marked bad\)$/);
  await page.locator(".leave-out summary").click();
  const first = page.locator(".chips button").first();
  assert.equal(await first.getAttribute("aria-pressed"), "true");
  assert.match((await page.locator("#reading-channels").textContent()) ?? "", /^3 of 4 channels are used/);
  await first.click();
  await page.waitForFunction(() => /^All 4 channels are used/.test(document.querySelector("#reading-channels")?.textContent ?? ""));
  assert.equal(await first.getAttribute("aria-pressed"), "false");
  await first.click();
  await page.waitForFunction(() => /^3 of 4 channels are used/.test(document.querySelector("#reading-channels")?.textContent ?? ""));
  await page.close();
});
