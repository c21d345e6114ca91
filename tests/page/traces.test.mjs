// The trace view as a user meets it: looking about by keys, mouse and touch, marking spans each of these ways, undo and redo.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { download, launch, openPage, reaches } from "./harness.mjs";
import { noise } from "./recordings.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => void (browser = await launch()));
after(() => browser.close());

/** Opens the demo, waits until everything is computed and brings the traces into sight. */
async function traces() {
  const { page, seen } = await openPage(browser.context);
  await page.click('button[data-demo="watch"]');
  assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready");
  await page.evaluate(() => document.querySelector(".traces")?.scrollIntoView({ behavior: "instant", block: "center" }));
  await inked(page);
  return { page, seen };
}

/** Waits until lines are drawn. @param {import("playwright-core").Page} page */
function inked(page) {
  return page.waitForFunction(() => {
    const canvas = /** @type {HTMLCanvasElement | null} */ (document.querySelector(".traces .over"));
    const data = canvas?.width ? canvas.getContext("2d")?.getImageData(0, 0, canvas.width, canvas.height).data : null;
    return data?.some((value, i) => i % 4 === 3 && value > 0) ?? false;
  });
}

/** What the view says that it shows. @param {import("playwright-core").Page} page @param {RegExp} words */
function says(page, words) {
  return page.waitForFunction((source) => new RegExp(source).test(document.querySelector(".traces")?.getAttribute("aria-label") ?? ""), words.source);
}

/** The choices in force, as the page hands them out. @param {import("playwright-core").Page} page */
async function recipe(page) {
  // A change is sent with the next frame.
  await page.evaluate(() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done))));
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  const { bytes } = await download(page, 'button[data-takeaway="recipe"]');
  return JSON.parse(bytes.toString("utf8"));
}

/** The middle of the traces, and a place left and right of it. @param {import("playwright-core").Page} page */
async function spots(page) {
  await page.evaluate(() => document.querySelector(".traces")?.scrollIntoView({ behavior: "instant", block: "center" }));
  const box = await page.locator(".traces").boundingBox();
  assert.ok(box);
  const y = box.y + box.height / 2;
  const at = (/** @type {number} */ share) => box.x + 66 + share * (box.width - 66 - 16);
  return { y, at };
}

test("keys move and zoom the view, and the frame of the overview goes along", async () => {
  const { page, seen } = await traces();
  const frame = page.locator(".frame");
  await page.locator(".traces").focus();
  await says(page, /16 channels as recorded, .* 0:00\.0 to 0:10\.0 of 4 min/);
  await page.keyboard.press("Shift+ArrowRight");
  await page.keyboard.press("ArrowLeft");
  await says(page, /0:09\.0 to 0:19\.0/);
  assert.equal(Number(await frame.getAttribute("aria-valuenow")), 9);
  await page.keyboard.press("-");
  await says(page, /0:06\.5 to 0:21\.5/);
  await page.keyboard.press("+");
  await page.keyboard.press("End");
  await says(page, /3:50\.0 to 4:00\.0/);
  await page.keyboard.press("PageDown");
  await says(page, /16 channels as recorded, CP5 to |16 channels as recorded, C4 to /);
  await frame.focus();
  await page.keyboard.press("Home");
  await says(page, /0:00\.0 to 0:10\.0/);
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("before and after the preparation, and the components under both", async () => {
  const { page } = await traces();
  await page.getByRole("textbox", { name: "high-pass in hertz" }).fill("2");
  await page.keyboard.press("Enter");
  assert.equal(await reaches(page, ["ready", "error"]), "ready");
  await page.getByRole("radio", { name: "as prepared" }).check();
  await says(page, /16 channels as prepared/);
  const tall = () => page.locator(".traces").evaluate((place) => place.clientHeight);
  const before = await tall();
  await page.getByRole("checkbox", { name: "components below" }).uncheck();
  await page.waitForFunction((height) => (document.querySelector(".traces")?.clientHeight ?? 0) < height - 100, before);
  await page.close();
});

test("spans are marked, moved, undone and removed by keyboard alone", async () => {
  const { page, seen } = await traces();
  await page.locator(".traces").focus();
  await page.keyboard.press("n");
  const edge = page.getByRole("slider", { name: "not to be used 1 from" });
  assert.equal(await edge.evaluate((node) => node === document.activeElement), true);
  assert.equal(await edge.getAttribute("aria-valuenow"), "4");
  // Steps of a two-hundredth of the view, on the grid of samples: 0.05 s is 12.5 samples of 1/250 s, which rounds to 13.
  await page.keyboard.press("Shift+ArrowLeft");
  await page.keyboard.press("Alt+ArrowRight");
  assert.ok(Math.abs(Number(await edge.getAttribute("aria-valuenow")) - 3.484) < 1e-9);
  await page.keyboard.press("Tab");
  await page.keyboard.press("ArrowRight");
  assert.deepEqual((await recipe(page)).not_used, [[3.484, 6.052]]);
  await page.locator(".traces").focus();
  // Changes that follow each other closely are undone together, so how many steps there are depends on the machine.
  const all = async (/** @type {string} */ name, /** @type {string} */ keys) => {
    while (await page.getByRole("button", { name }).isEnabled()) await page.keyboard.press(keys);
  };
  await all("Undo", "Control+z");
  assert.deepEqual((await recipe(page)).not_used ?? [], []);
  await all("Redo", "Control+Shift+z");
  assert.deepEqual((await recipe(page)).not_used, [[3.484, 6.052]]);
  await page.getByRole("button", { name: "Show not to be used 1" }).press("Enter");
  assert.equal(await edge.evaluate((node) => node === document.activeElement), true);
  await page.keyboard.press("Delete");
  assert.deepEqual((await recipe(page)).not_used ?? [], []);
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("marks are typed into the table, and the windows that touch a span not to be used are left out", async () => {
  const { page } = await traces();
  await page.locator(".marking summary").click();
  await page.getByRole("button", { name: "Mark not to be used" }).click();
  const to = page.getByRole("textbox", { name: "not to be used 1 to, in seconds" });
  await to.fill("20");
  await to.press("Enter");
  assert.deepEqual((await recipe(page)).not_used, [[4, 20]]);
  await page.waitForFunction(() => !/^42 \+ 42/.test(document.querySelector('li[data-step="windows"] .answer')?.textContent ?? ""));
  await to.fill("3");
  await to.press("Enter");
  assert.equal(await to.getAttribute("aria-invalid"), "true");
  assert.deepEqual((await recipe(page)).not_used, [[4, 20]]);
  await page.close();
});

test("spans dragged with the mouse become the question, and the way back leads to the events", async () => {
  const { page, seen } = await traces();
  await page.getByRole("textbox", { name: "seconds across" }).fill("240");
  await page.keyboard.press("Enter");
  const mark = async (/** @type {string} */ kind, /** @type {number} */ from, /** @type {number} */ to) => {
    await page.getByRole("radio", { name: `marks ${kind}` }).check();
    const { y, at } = await spots(page);
    await page.mouse.move(at(from), y);
    await page.mouse.down();
    await page.mouse.move(at(to), y, { steps: 8 });
    await page.mouse.up();
  };
  await mark("signal", 0.1, 0.3);
  await mark("reference", 0.5, 0.7);
  await page.getByRole("button", { name: "Contrast the marked spans" }).click();
  const { contrast } = await recipe(page);
  assert.equal(contrast.kind, "spans");
  const near = (/** @type {number[]} */ [from, to], /** @type {number} */ a, /** @type {number} */ b) => assert.ok(Math.abs(Number(from) - a) < 1 && Math.abs(Number(to) - b) < 1, `${from} to ${to}`);
  near(contrast.signal[0], 24, 72);
  near(contrast.reference[0], 120, 168);
  await page.getByRole("button", { name: "Back to the windows around events" }).click();
  assert.equal((await recipe(page)).contrast.kind, "windows");
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("one finger moves the view, two zoom it, and a finger marks", async () => {
  const { page, seen } = await traces();
  const client = await page.context().newCDPSession(page);
  await client.send("Emulation.setTouchEmulationEnabled", { enabled: true, maxTouchPoints: 2 });
  const touch = (/** @type {"touchStart" | "touchMove" | "touchEnd"} */ type, /** @type {[number, number][]} */ points) =>
    client.send("Input.dispatchTouchEvent", { type, touchPoints: points.map(([x, y], id) => ({ x, y, id })) });
  const { y, at } = await spots(page);
  const slide = async (/** @type {number} */ from, /** @type {number} */ to) => {
    await touch("touchStart", [[from, y]]);
    for (let i = 1; i <= 10; i += 1) await touch("touchMove", [[from + ((to - from) * i) / 10, y]]);
    await touch("touchEnd", []);
  };
  await slide(at(0.8), at(0.3));
  await page.waitForFunction(() => Number(document.querySelector(".frame")?.getAttribute("aria-valuenow")) > 4);
  const from = Number(await page.locator(".frame").getAttribute("aria-valuenow"));
  assert.ok(Math.abs(from - 5) < 0.3, `${from} s after half a view`);
  await touch("touchStart", [[at(0.4), y], [at(0.6), y]]);
  for (let i = 1; i <= 10; i += 1) await touch("touchMove", [[at(0.4 - 0.02 * i), y], [at(0.6 + 0.02 * i), y]]);
  await touch("touchEnd", []);
  await page.waitForFunction(() => Number(/** @type {HTMLInputElement | null} */ (document.querySelector('[aria-label="seconds across"]'))?.value) < 5);
  await page.getByRole("radio", { name: "marks not to be used" }).check();
  await spots(page);
  await slide(at(0.2), at(0.6));
  const [span] = (await recipe(page)).not_used;
  assert.ok(span && span[1] > span[0], "a span was marked");
  assert.deepEqual(seen.errors, []);
  await page.close();
});

test("without events the traces are there, and marks become the question", async () => {
  const { page, seen } = await openPage(browser.context);
  await page.setInputFiles("#recording", { name: "quiet.edf", mimeType: "application/octet-stream", buffer: noise([]) });
  await reaches(page, ["choosing", "ready", "error"]);
  await inked(page);
  assert.deepEqual(seen.errors, []);
  await page.close();
});
