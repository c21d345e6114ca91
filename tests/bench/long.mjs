// Long recordings: an hour that is looked at, and ten gigabytes of which the page keeps what the windows need.
import { existsSync } from "node:fs";
import { mkdir, open, rename, writeFile } from "node:fs/promises";
import { join } from "node:path";
import { bridgeUrl, openPage, reaches, root } from "../page/harness.mjs";

const [CHANNELS, RATE] = [64, 512];
const RECORD = CHANNELS * RATE * 2;
const folder = join(root, "target/bench");

/** @param {string | number} text @param {number} width */
const field = (text, width) => String(text).slice(0, width).padEnd(width);

/** A plain EDF header for records of one second. @param {number} records */
function header(records) {
  const each = (/** @type {number} */ width, /** @type {(i: number) => string | number} */ text) => Array.from({ length: CHANNELS }, (_, i) => field(text(i), width)).join("");
  return Buffer.from([
    field(0, 8), field("X", 80), field("X", 80), "01.01.26", "00.00.00", field(256 * (CHANNELS + 1), 8), field("", 44), field(records, 8), field(1, 8), field(CHANNELS, 4),
    each(16, (i) => `L${i + 1}`), each(80, () => ""), each(8, () => "uV"), each(8, () => -3276.8), each(8, () => 3276.7), each(8, () => -32768), each(8, () => 32767), each(80, () => ""), each(8, () => RATE), each(32, () => ""),
  ].join(""), "latin1");
}

/** Records of noise, a few that are used again and again. @param {number} count */
function records(count) {
  let state = 99;
  const random = () => (state = (state * 48271) % 2147483647) / 2147483647 - 0.5;
  return Array.from({ length: count }, () => Buffer.from(Int16Array.from({ length: CHANNELS * RATE }, () => 800 * (random() + random() + random())).buffer));
}

/** 64 channels × 1 h × 512 Hz. */
async function hourFile() {
  const path = join(folder, "hour.edf");
  if (existsSync(path)) return path;
  await mkdir(folder, { recursive: true });
  const file = await open(`${path}.part`, "w");
  const some = records(30);
  await file.write(header(3600));
  for (let i = 0; i < 3600; i += some.length) await file.writev(some);
  await file.close();
  await rename(`${path}.part`, path);
  return path;
}

const LARGE_RECORDS = 160_000;
const EVENTS = Array.from({ length: 40 }, (_, i) => 600 + i * 3900);

/** Ten gigabytes, almost all of it a hole in the file: noise stands around the events and in the middle. */
async function largeFiles() {
  const [path, table] = [join(folder, "large_eeg.edf"), join(folder, "large_events.tsv")];
  if (!existsSync(path)) {
    await mkdir(folder, { recursive: true });
    const file = await open(`${path}.part`, "w");
    const head = header(LARGE_RECORDS);
    const some = records(60);
    await file.write(head);
    await file.truncate(head.length + LARGE_RECORDS * RECORD);
    const put = async (/** @type {number} */ from, /** @type {number} */ count) => {
      for (let i = 0; i < count; i += 1) await file.write(/** @type {Buffer} */ (some[(from + i) % some.length]), 0, RECORD, head.length + (from + i) * RECORD);
    };
    for (const at of EVENTS) await put(at - 5, 10);
    await put(LARGE_RECORDS / 2 - 30, 60);
    await file.close();
    await writeFile(table, ["onset\tduration\ttrial_type", ...EVENTS.map((t) => `${t}\t0\tlight`)].join("\n") + "\n");
    await rename(`${path}.part`, path);
  }
  return [path, table];
}

/**
 * The hour on the sheet: first traces, and the slowest frame while one moves about with all channels in sight.
 * @param {import("playwright-core").BrowserContext} context
 */
export async function hour(context) {
  const { page } = await openPage(context);
  await page.setInputFiles("#recording", await hourFile());
  await reaches(page, ["choosing", "ready", "error"], 120_000);
  await page.waitForFunction(() => performance.getEntriesByName("teasel:traces").length > 0, null, { timeout: 60_000 });
  const first = await page.evaluate(() => Number(performance.getEntriesByName("teasel:traces")[0]?.startTime) - Number(performance.getEntriesByName("teasel:read").at(-1)?.startTime));
  await page.getByRole("textbox", { name: "channels at once" }).fill("64");
  await page.keyboard.press("Enter");
  await page.evaluate(() => document.querySelector(".traces")?.scrollIntoView({ behavior: "instant", block: "center" }));
  await page.waitForTimeout(1000);
  const box = await page.locator(".traces").boundingBox();
  if (!box) throw new Error("there are no traces");
  await page.evaluate(() => {
    const w = /** @type {any} */ (globalThis);
    w.frames = [];
    let last = performance.now();
    const frame = (/** @type {number} */ at) => {
      w.frames.push(at - last);
      last = at;
      requestAnimationFrame(frame);
    };
    requestAnimationFrame(frame);
  });
  const [x, y] = [box.x + box.width / 2, box.y + box.height / 2];
  const drag = async () => {
    await page.mouse.move(x + 300, y);
    await page.mouse.down();
    await page.mouse.move(x - 300, y, { steps: 60 });
    await page.mouse.up();
  };
  const wheel = async (/** @type {number} */ by) => {
    await page.keyboard.down("Control");
    for (let i = 0; i < 24; i += 1) await page.mouse.wheel(0, by);
    await page.keyboard.up("Control");
  };
  await drag();
  await wheel(180);
  await drag();
  await wheel(-240);
  await drag();
  const frames = /** @type {number[]} */ (await page.evaluate(() => /** @type {any} */ (globalThis).frames.slice(2)));
  await page.close();
  frames.sort((a, b) => a - b);
  return { traces_first_ms: first, traces_slowest_frame_ms: frames.at(-1), traces_usual_frame_ms: frames[frames.length >> 1] };
}

/**
 * Ten gigabytes: looked over, and a contrast of windows computed.
 * @param {import("playwright-core").BrowserContext} context
 */
export async function large(context) {
  const { page } = await openPage(context, { url: await bridgeUrl() });
  await page.evaluate(() => document.body.append(Object.assign(document.createElement("input"), { type: "file", id: "file", multiple: true })));
  await page.setInputFiles("#file", await largeFiles());
  const measured = await page.evaluate(async () => {
    const bridge = await /** @type {any} */ (globalThis).bridgeReady;
    const input = /** @type {HTMLInputElement} */ (document.getElementById("file"));
    const failed = new Promise((_, fail) => bridge.on("problem", (/** @type {any} */ problem) => fail(new Error(JSON.stringify(problem)))));
    const finished = new Promise((done) => bridge.on("finished", done));
    const from = performance.now();
    await bridge.open([.../** @type {FileList} */ (input.files)]).catch((/** @type {any} */ problem) => Promise.reject(new Error(JSON.stringify(problem))));
    const opened = performance.now() - from;
    const { recipe } = await bridge.propose();
    const asked = performance.now();
    await bridge.setRecipe(recipe).catch((/** @type {any} */ problem) => Promise.reject(new Error(JSON.stringify(problem))));
    await Promise.race([finished, failed]);
    return { opened, computed: performance.now() - asked, memory: await bridge.memory() };
  });
  await page.close();
  return { large_mb_s: (LARGE_RECORDS * RECORD) / 1e3 / measured.opened, large_computed_ms: measured.computed, large_memory_bytes: measured.memory };
}
