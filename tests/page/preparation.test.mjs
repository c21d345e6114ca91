// Channels in doubt, filters, dropped windows and compression guides, by keyboard and by touch.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { launch, openPage, picture, reaches } from "./harness.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => void (browser = await launch()));
after(() => browser.close());

/** Opens the demo and waits until everything is computed. */
async function demo() {
  const opened = await openPage(browser.context);
  await opened.page.click('button[data-demo="watch"]');
  await settled(opened.page);
  return opened;
}

/** @param {import("playwright-core").Page} page */
async function settled(page) {
  await page.waitForTimeout(150);
  assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready", (await page.locator("#problem").textContent()) ?? "");
}

/** @param {import("playwright-core").Page} page */
const used = async (page) => (await page.locator('li[data-step="channels"] .answer').textContent()) ?? "";

/** What is checked beside each doubtful channel. @param {import("playwright-core").Page} page @param {string} name */
const fate = (page, name) => page.locator(".proposals li", { has: page.locator("b", { hasText: new RegExp(`^${name}$`) }) }).locator("input:checked").evaluateAll((inputs) => inputs.map((input) => /** @type {HTMLInputElement} */ (input).value));

test("doubtful channels are proposed with a reason, taken all at once and given back, by keyboard alone", async () => {
  const { page, seen } = await demo();
  const names = await page.locator(".proposals b").allTextContents();
  assert.ok(names.includes("T7") && names.length <= 3, names.join());
  assert.match((await page.locator(".proposals li").filter({ hasText: "T7" }).textContent()) ?? "", /wanders \d/);
  assert.deepEqual(await fate(page, "T7"), [], "nothing is decided by itself");
  const before = await used(page);
  await page.getByRole("button", { name: "Take all proposals" }).focus();
  await page.keyboard.press("Enter");
  await settled(page);
  assert.deepEqual(await fate(page, "T7"), ["leave_out"]);
  assert.notEqual(await used(page), before);
  assert.equal(await page.evaluate(() => document.activeElement?.textContent), "Undo");
  await page.keyboard.press("Enter");
  await settled(page);
  assert.deepEqual(await fate(page, "T7"), []);
  assert.equal(await used(page), before);
  await page.getByRole("radiogroup", { name: "What becomes of T7" }).getByRole("radio").first().focus();
  await page.keyboard.press("Space");
  await settled(page);
  assert.deepEqual(await fate(page, "T7"), ["keep"]);
  await page.keyboard.press("ArrowRight");
  await page.keyboard.press("ArrowRight");
  await settled(page);
  assert.deepEqual(await fate(page, "T7"), ["interpolate"]);
  assert.match((await page.locator("#ranks summary").textContent()) ?? "", /^Rank after each step: 32 → 31 → \d+$/);
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("the filters are drawn, and mains is removed by a fit", async () => {
  const { page, seen } = await demo();
  await page.locator("#more-filters > summary").focus();
  await page.keyboard.press("Enter");
  await page.waitForFunction(() => document.querySelector('[data-figure="filters"] canvas:not([hidden])') !== null);
  await page.getByRole("combobox", { name: "how mains is removed" }).selectOption("fit");
  await settled(page);
  assert.equal(await page.getByRole("textbox", { name: "mains frequency in hertz" }).inputValue(), "50");
  assert.match((await page.locator("#methods").textContent()) ?? "", /sinusoids at 50, 100 Hz fitted by least squares/);
  await page.getByRole("combobox", { name: "reference" , exact: true }).selectOption("neighbours");
  await settled(page);
  assert.match((await page.locator("#ranks summary").textContent()) ?? "", /32 → 31 → 31$/);
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("windows are dropped by a robust limit, with counts and the effect on the ratio", async () => {
  const { page, seen } = await demo();
  const box = page.locator("#drop-windows");
  assert.match((await box.locator("summary").textContent()) ?? "", /: off$/);
  await box.locator("summary").click();
  assert.match((await box.textContent()) ?? "", /has to see an artefact to learn to cancel it/);
  await box.getByRole("textbox").first().fill("2");
  await page.keyboard.press("Enter");
  await settled(page);
  assert.match((await box.locator("summary").textContent()) ?? "", /: 1 of 4 criteria$/);
  assert.match((await box.textContent()) ?? "", /\d+ beyond [\d.]+ µV .*\d+ of 84 windows dropped\. Fitted ratio .*×/);
  await box.getByRole("textbox").first().fill("");
  await page.keyboard.press("Enter");
  await settled(page);
  assert.match((await box.locator("summary").textContent()) ?? "", /: off$/);
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("the guides set C, and the largest dimensions are shown as what they are", async () => {
  const { page, seen } = await demo();
  const guide = page.locator(".guides button", { hasText: "parallel analysis" });
  const keep = await guide.getAttribute("data-guide");
  await guide.focus();
  await page.keyboard.press("Enter");
  await settled(page);
  assert.equal(await page.locator("#keep").inputValue(), keep);
  await page.locator("#principal > summary").click();
  await page.waitForFunction(() => document.querySelector('[data-figure="principal"] canvas:not([hidden])') !== null);
  await page.locator("#noise-rules > summary").click();
  assert.match((await page.locator("#noise-rules").textContent()) ?? "", /samples in windows are worth [\d,]+ independent ones/);
  assert.deepEqual(seen.errors, []);
  await picture(page, "compression");
  await page.close();
});

test("on touch every choice is at least 44 px high", async () => {
  const { page } = await demo();
  const session = await page.context().newCDPSession(page);
  await session.send("Emulation.setTouchEmulationEnabled", { enabled: true });
  await page.setViewportSize({ width: 820, height: 1180 });
  await page.locator("details.more").evaluateAll((all) => all.forEach((one) => one.setAttribute("open", "")));
  assert.ok(await page.evaluate(() => matchMedia("(pointer: coarse)").matches));
  const low = await page.locator("#channels .body :is(button, select, .field, .picks label, summary), #drop-windows :is(.field, summary), #compression .body :is(button, summary)").evaluateAll((all) =>
    all.filter((one) => one.checkVisibility()).map((one) => [one.textContent?.slice(0, 30), one.getBoundingClientRect().height]).filter(([, height]) => Number(height) < 43.5));
  assert.deepEqual(low, []);
  assert.equal(await page.evaluate(() => document.documentElement.scrollWidth <= innerWidth), true);
  await page.close();
});
