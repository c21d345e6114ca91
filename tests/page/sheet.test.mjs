// The sheet as a user meets it: handles, keyboard, the dial, problems in words, the link, names and contrast, no overflow.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { launch, openPage, reaches } from "./harness.mjs";
import { noise } from "./recordings.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => void (browser = await launch()));
after(() => browser.close());

/** Opens the demo and waits until everything is computed. */
async function demo(options = {}) {
  const opened = await openPage(browser.context, options);
  await opened.page.click('button[data-demo="watch"]');
  assert.equal(await reaches(opened.page, ["ready", "error"], 120_000), "ready");
  return opened;
}

/** Brings a figure into sight and waits until it is drawn and its dials are laid over it. @param {import("playwright-core").Page} page @param {string} name */
async function drawn(page, name) {
  await page.evaluate((figure) => document.querySelector(`[data-figure="${figure}"]`)?.scrollIntoView({ behavior: "instant", block: "center" }), name);
  await page.waitForFunction((figure) => document.querySelector(`[data-figure="${figure}"] canvas:not([hidden])`) !== null, name);
}

/** The recipe that the address holds. @param {import("playwright-core").Page} page */
async function recipeInLink(page) {
  await page.waitForTimeout(400);
  const text = await page.evaluate(() => location.hash.replace("#recipe=", ""));
  return JSON.parse(Buffer.from(text, "base64url").toString("utf8"));
}

test("every handle that scripts depend on is there", async () => {
  const { page, seen } = await openPage(browser.context);
  const handles = ["input#recording[type=file][multiple]", "input#recipe-file[type=file]", "#message[role=status]", "#problem[role=alert]", "input#keep[type=range]", "button#stop", 'button[data-demo="watch"]'];
  for (const kind of ["weights-json", "weights-csv", "results-json", "recipe", "report", "everything"]) handles.push(`button[data-takeaway="${kind}"]`);
  // The script puts some of them in place.
  for (const handle of handles) await page.locator(handle).first().waitFor({ state: "attached" });
  for (const handle of handles) assert.equal(await page.locator(handle).count(), 1, handle);
  assert.equal(await page.evaluate(() => document.documentElement.dataset.state), "empty");
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("the ledger counts nothing, because nothing is requested", async () => {
  const { page, seen } = await demo();
  assert.deepEqual(await page.locator("[data-ledger]").allTextContents(), ["0", "0", "0"]);
  assert.deepEqual(seen.requests, []);
  await page.close();
});

test("the ledger counts an attempt that the policy refuses", async () => {
  const { page } = await openPage(browser.context);
  await page.evaluate(() => fetch("https://teasel.invalid/").catch(() => undefined));
  await page.waitForFunction(() => Number(document.querySelector("[data-ledger]")?.textContent) > 0);
  await page.close();
});

test("arrow keys move a window's edge, field and recipe follow", async () => {
  const { page } = await demo();
  await drawn(page, "windows");
  const edge = page.getByRole("slider", { name: "signal from" });
  const field = page.getByRole("textbox", { name: /^signal from/ });
  const start = Number(await edge.getAttribute("aria-valuenow"));
  await edge.focus();
  await page.keyboard.press("Shift+ArrowRight");
  await page.keyboard.press("ArrowLeft");
  const moved = start + 9 / 250;
  assert.ok(Math.abs(Number(await edge.getAttribute("aria-valuenow")) - moved) < 1e-9);
  assert.match((await edge.getAttribute("aria-valuetext")) ?? "", / seconds from buoy$/);
  assert.equal(Number((await field.inputValue()).replace("−", "-")), Number(moved.toFixed(4)));
  assert.ok(Math.abs((await recipeInLink(page)).contrast.signal.from_s - moved) < 1e-9);
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  await page.close();
});

test("an edge that meets its partner pushes it along", async () => {
  const { page } = await demo();
  await drawn(page, "windows");
  const from = page.getByRole("slider", { name: "signal from" });
  const to = page.getByRole("slider", { name: "signal to" });
  await from.focus();
  await page.keyboard.press("End");
  assert.ok(Number(await from.getAttribute("aria-valuenow")) < Number(await to.getAttribute("aria-valuenow")));
  await page.close();
});

test("a dragged edge stays under the pointer", async () => {
  const { page } = await demo();
  await drawn(page, "windows");
  const edge = page.getByRole("slider", { name: "signal to" });
  const box = await edge.boundingBox();
  assert.ok(box);
  const [x, y] = [box.x + box.width / 2, box.y + box.height - 12];
  await page.mouse.move(x, y);
  await page.mouse.down();
  await page.mouse.move(x + 60, y, { steps: 12 });
  await page.waitForTimeout(300);
  const moved = await edge.boundingBox();
  assert.ok(moved && Math.abs(moved.x - box.x - 60) < 3, `moved by ${(moved?.x ?? 0) - box.x} px`);
  await page.mouse.up();
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  await page.close();
});

test("the dial sets C, and C = 1 is out of reach", async () => {
  const { page } = await demo();
  const keep = page.locator("#keep");
  await keep.focus();
  await page.keyboard.press("Home");
  assert.equal(await keep.inputValue(), "2");
  assert.equal(await keep.getAttribute("min"), "2");
  await page.waitForFunction(() => /^keep 2 of/.test(document.querySelector('li[data-step="compression"] .answer')?.textContent ?? ""));
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  assert.equal((await recipeInLink(page)).keep, 2);
  await page.close();
});

test("the thumb of the dial stands under its value on the plot's axis", async () => {
  const { page } = await demo();
  await drawn(page, "keep");
  const off = await page.evaluate(() => {
    const keep = /** @type {HTMLInputElement} */ (document.querySelector("#keep"));
    const canvas = /** @type {HTMLElement} */ (document.querySelector('[data-figure="keep"] canvas'));
    return keep.getBoundingClientRect().right - canvas.getBoundingClientRect().right;
  });
  assert.ok(Math.abs(off) < 24, `the track ends ${off} px beside the plot`);
  await page.close();
});

test("a broken file is a problem in words, and the page goes on", async () => {
  const { page } = await openPage(browser.context);
  await page.setInputFiles("#recording", { name: "<b>noise</b>.edf", mimeType: "", buffer: Buffer.from("0       not a recording at all") });
  assert.equal(await reaches(page, ["error"]), "error");
  const problem = page.locator("#problem");
  assert.ok(await problem.isVisible());
  assert.ok(((await problem.textContent()) ?? "").includes("<b>noise</b>.edf"), "the name is text, never markup");
  assert.equal(await problem.locator("b").count(), 0);
  await page.click('button[data-demo="watch"]');
  assert.equal(await reaches(page, ["ready"], 120_000), "ready");
  assert.ok(await problem.isHidden());
  await page.close();
});

test("a broken file leaves the sheet that is open in place", async () => {
  const { page } = await demo();
  const evidence = await page.locator('li[data-step="evidence"] .answer').textContent();
  await page.setInputFiles("#recording", { name: "note.txt", mimeType: "", buffer: Buffer.from("no recording, but words that are long enough to be looked at") });
  assert.equal(await reaches(page, ["error"]), "error");
  assert.ok(await page.locator("#problem").isVisible());
  assert.equal(await page.locator('li[data-step="evidence"] .answer').textContent(), evidence);
  await page.getByRole("button", { name: /^Stay with / }).click();
  assert.equal(await reaches(page, ["ready"]), "ready");
  await page.locator("#keep").focus();
  await page.keyboard.press("Home");
  await page.waitForFunction(() => /^keep 2 of/.test(document.querySelector('li[data-step="compression"] .answer')?.textContent ?? ""));
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  await page.close();
});

test("an end of a window that is typed never pushes the other", async () => {
  const { page } = await demo();
  const from = page.getByRole("textbox", { name: /^signal from/ });
  const to = page.getByRole("textbox", { name: /^signal to/ });
  const [start, end] = [await from.inputValue(), await to.inputValue()];
  await from.fill("3");
  await from.press("Enter");
  assert.equal(await from.getAttribute("aria-invalid"), "true");
  assert.equal(await from.inputValue(), "3");
  assert.equal(await to.inputValue(), end);
  assert.ok(await page.getByText("must end after it begins").isVisible());
  assert.equal(await page.evaluate(() => document.documentElement.dataset.state), "ready");
  await to.fill("4");
  await to.press("Enter");
  assert.equal(await from.getAttribute("aria-invalid"), "false");
  const { signal } = (await recipeInLink(page)).contrast;
  assert.deepEqual([signal.from_s, signal.to_s], [3, 4]);
  await from.fill("x");
  await from.press("Enter");
  await from.press("Escape");
  assert.equal(await from.inputValue(), "3.00");
  assert.notEqual(start, "3.00");
  await page.close();
});

test("a sheet that arrives leaves alone what is being typed", async () => {
  const { page } = await demo();
  await page.locator("#keep").focus();
  await page.keyboard.press("Home");
  const field = page.getByRole("textbox", { name: /^signal to/ });
  await field.fill("0.7");
  await page.waitForFunction(() => /^keep 2 of/.test(document.querySelector('li[data-step="compression"] .answer')?.textContent ?? ""));
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  assert.equal(await field.inputValue(), "0.7");
  await page.close();
});

test("several lines are stopped, and what is no number is refused", async () => {
  const { page } = await demo();
  const notch = page.getByRole("textbox", { name: /^mains/ });
  await notch.fill("50; abc");
  await notch.press("Enter");
  assert.equal(await notch.getAttribute("aria-invalid"), "true");
  await notch.fill("50,100");
  await notch.press("Enter");
  assert.deepEqual((await recipeInLink(page)).filter.notch_hz, [50, 100]);
  await page.close();
});

test("work that was stopped can be gone on with from the evidence", async () => {
  const { page } = await demo();
  await page.locator("#evidence details.more summary").click();
  const permutations = page.getByRole("textbox", { name: "permutations" });
  await permutations.fill("60000");
  await permutations.press("Enter");
  await page.locator("#stop").click();
  await page.getByRole("button", { name: "Leave it" }).click();
  assert.equal(await page.locator('li[data-step="evidence"]').getAttribute("data-knot"), "look");
  assert.equal(await page.locator('li[data-step="evidence"] .answer').textContent(), "stopped");
  await page.locator("#go-on").click();
  assert.equal(await reaches(page, ["working"]), "working");
  await page.close();
});

test("a row that is opened stays where it was pressed", async () => {
  const { page } = await demo();
  const place = (/** @type {string} */ id) => page.locator(`tr[data-component="${id}"] button`);
  await place("stronger-1").evaluate((button) => button.getAttribute("aria-expanded") === "true" || /** @type {HTMLElement} */ (button).click());
  await place("weaker-1").evaluate((button) => button.scrollIntoView({ block: "center", behavior: "instant" }));
  await page.waitForTimeout(1200);
  const before = await place("weaker-1").boundingBox();
  await page.keyboard.press("Tab");
  await place("weaker-1").evaluate((button) => (/** @type {HTMLElement} */ (button).focus({ preventScroll: true }), /** @type {HTMLElement} */ (button).click()));
  await page.waitForTimeout(500);
  const after = await place("weaker-1").boundingBox();
  assert.ok(before && after && Math.abs(after.y - before.y) < 2, `moved by ${(after?.y ?? 0) - (before?.y ?? 0)} px`);
  assert.ok(await place("weaker-1").evaluate((button) => button === document.activeElement));
  await page.close();
});

/** @param {string} name @param {string | Buffer} content */
const file = (name, content) => ({ name, mimeType: "", buffer: Buffer.from(content) });
const everyOther = Array.from({ length: 27 }, (_, i) => 2 * i + 2.5);

test("a table of events alone joins the recording that is open", async () => {
  const { page } = await openPage(browser.context);
  await page.setInputFiles("#recording", file("quiet.edf", noise([])));
  assert.equal(await reaches(page, ["choosing", "error"]), "choosing");
  assert.match((await page.locator("#reading-recording").textContent()) ?? "", /^4 channels at 100 Hz .* no events\.$/);
  assert.ok(await page.locator(".chips button").first().isDisabled());
  await page.setInputFiles("#recording", file("quiet_events.tsv", `onset\tduration\ttrial_type\n${everyOther.map((onset) => `${onset}\t0\tbeep\n`).join("")}`));
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  assert.match((await page.locator('li[data-step="windows"] .answer').textContent()) ?? "", /^27 \+ 27$/);
  await page.close();
});

test("events that are equally frequent are asked about", async () => {
  const { page } = await openPage(browser.context);
  const events = everyOther.flatMap((onset) => [{ onset, label: "left" }, { onset: onset + 1, label: "right" }]);
  await page.setInputFiles("#recording", file("tied.edf", noise(events)));
  assert.equal(await reaches(page, ["choosing", "ready", "error"]), "choosing");
  await page.locator('[data-event="right"]').click();
  assert.equal(await reaches(page, ["working", "ready"]).then(Boolean), true);
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  assert.match((await page.locator("#reading-so-far").textContent()) ?? "", /right/);
  await page.close();
});

test("choices outlive a reload", async () => {
  const { page } = await demo();
  await page.locator("#keep").focus();
  await page.keyboard.press("Home");
  await recipeInLink(page);
  await page.reload();
  await page.waitForFunction(() => !document.querySelector("#hint")?.hasAttribute("hidden"));
  await page.click('button[data-demo="watch"]');
  assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready");
  assert.equal(await page.locator("#keep").inputValue(), "2");
  await page.close();
});

test("a link names no events unless asked to", async () => {
  const { page } = await demo();
  assert.doesNotMatch(JSON.stringify(await recipeInLink(page)), /buoy/);
  await page.check("#with-names");
  assert.match(JSON.stringify(await recipeInLink(page)), /buoy/);
  await page.close();
});

test("every control has a name, every heading its level, every slider its words", async () => {
  const { page } = await demo();
  const nameless = await page.evaluate(() => {
    const shown = (/** @type {Element} */ node) => node.getClientRects().length > 0;
    const name = (/** @type {Element} */ node) =>
      node.getAttribute("aria-label") || node.textContent?.trim() || node.closest("label")?.textContent?.trim() || document.getElementById(node.getAttribute("aria-labelledby") ?? "")?.textContent || "";
    return [...document.querySelectorAll("button, input, select, a, summary, [role=slider], [role=img], canvas, section")].filter((node) => shown(node) && !name(node) && !(node.getAttribute("aria-hidden") && node.parentElement?.closest("[aria-label]"))).map((node) => node.outerHTML.slice(0, 120));
  });
  assert.deepEqual(nameless, []);
  await drawn(page, "windows");
  const sliders = await page.locator("[role=slider]:visible").all();
  assert.equal(sliders.length, 5);
  for (const slider of sliders) for (const word of ["aria-valuenow", "aria-valuemin", "aria-valuemax", "aria-valuetext"]) assert.ok(await slider.getAttribute(word), word);
  const unlabelled = await page.evaluate(() => [...document.querySelectorAll("[aria-labelledby]")].filter((node) => !document.getElementById(node.getAttribute("aria-labelledby") ?? "")).length);
  assert.equal(unlabelled, 0);
  await page.close();
});

for (const scheme of /** @type {const} */ (["light", "dark"]))
  test(`text stands out from its ground in the ${scheme} scheme`, async () => {
    const { page } = await openPage(browser.context);
    await page.emulateMedia({ colorScheme: scheme });
    const token = await page.evaluate(() => {
      const style = getComputedStyle(document.documentElement);
      return Object.fromEntries(["paper", "plate", "wash", "ink", "slate", "line", "signal", "reference"].map((name) => [name, style.getPropertyValue(`--${name}`).trim()]));
    });
    const least = [["ink", "paper"], ["ink", "wash"], ["slate", "paper"], ["slate", "plate"], ["slate", "wash"], ["signal", "paper"], ["signal", "wash"], ["reference", "paper"], ["reference", "plate"], ["paper", "ink"]];
    for (const [text, ground] of least) assert.ok(contrast(token[text ?? ""], token[ground ?? ""]) >= 4.5, `${text} on ${ground}: ${contrast(token[text ?? ""], token[ground ?? ""]).toFixed(2)}`);
    assert.ok(contrast(token.line, token.plate) >= 3, "borders of controls");
    await page.close();
  });

for (const [width, height] of /** @type {const} */ ([[1280, 720], [820, 1180]]))
  test(`nothing stands beyond the window at ${width} × ${height}`, async () => {
    const { page } = await openPage(browser.context);
    await page.setViewportSize({ width, height });
    const beyond = () => page.evaluate(() => document.documentElement.scrollWidth - innerWidth);
    assert.ok((await beyond()) <= 0, "first screen");
    await page.click('button[data-demo="watch"]');
    assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready");
    assert.ok((await beyond()) <= 0, "sheet");
    await page.close();
  });

/** Contrast of two colours by WCAG 2.2. @param {string | undefined} a @param {string | undefined} b */
function contrast(a, b) {
  const light = (/** @type {string} */ hex) => {
    const parts = [1, 3, 5].map((at) => parseInt(hex.slice(at, at + 2), 16) / 255).map((v) => (v <= 0.04045 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4));
    return 0.2126 * Number(parts[0]) + 0.7152 * Number(parts[1]) + 0.0722 * Number(parts[2]);
  };
  const [high, low] = [light(a ?? "#000000"), light(b ?? "#000000")].sort((x, y) => y - x);
  return (Number(high) + 0.05) / (Number(low) + 0.05);
}
