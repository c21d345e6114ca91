// What is taken away from the page: series, cleaned recordings, saved filters on another recording, figures of a size, the guide; and
// names from a file that would like to be more than names.
import assert from "node:assert/strict";
import { mkdtemp, rm, writeFile } from "node:fs/promises";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { download, launch, openPage, picture, reaches } from "./harness.mjs";
import { noise } from "./recordings.mjs";

/** Six characters of a label are left in a place of 16. */
const CHANNELS = ["<b>x</b>", "=1+1", '"q"\',', "A4"];
const LABEL = "<script>alert(1)</script> =1+1 \u202Eevil 🦔 " + "n".repeat(60);

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
let folder = "";
before(async () => {
  browser = await launch();
  folder = await mkdtemp(join(tmpdir(), "teasel-take-"));
  const plain = Array.from({ length: 24 }, (_, k) => ({ onset: 2 * k + 2, label: "knock" }));
  await writeFile(join(folder, "plain.edf"), noise(plain));
  await writeFile(join(folder, "next.edf"), noise(plain.map(({ onset, label }) => ({ onset: onset + 0.05, label }))));
  const bytes = noise(plain.map(({ onset }) => ({ onset, label: Buffer.from("knock").toString() })));
  // The labels stand after the head's 256 bytes, 16 each.
  CHANNELS.forEach((name, k) => Buffer.from(name.padEnd(16), "latin1").copy(bytes, 256 + 16 * k));
  await writeFile(join(folder, "hostile.edf"), bytes);
  const rows = plain.map(({ onset }) => `${onset}\t0\t${LABEL}`);
  await writeFile(join(folder, "hostile_events.tsv"), ["onset\tduration\ttrial_type", ...rows].join("\n"));
});
after(async () => {
  await browser.close();
  await rm(folder, { recursive: true, force: true });
});

/** @param {string[]} files */
async function sheetOf(files) {
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.setInputFiles("input#recording", files.map((file) => join(folder, file)));
  assert.equal(await reaches(page, ["ready", "error"], 120_000), "ready", (await page.textContent("#problem")) ?? "");
  return { page, seen };
}
const clean = { requests: [], violations: [], errors: [] };

test("series, trials and a cleaned recording are handed out, and the cleaning is shown", async () => {
  const { page, seen } = await sheetOf(["plain.edf"]);
  const csv = (await download(page, '[data-takeaway="trials-csv"]')).bytes.toString();
  assert.match(csv, /^component,side,trial,onset_s,power,log_power,fold,held_out_log_ratio\n/);
  const edf = (await download(page, '[data-takeaway="series-edf"]')).bytes;
  assert.match(edf.subarray(0, 256).toString("latin1"), /component_series/);
  const bib = (await download(page, '[data-takeaway="bibtex"]')).bytes.toString();
  assert.match(bib, /@article\{haufe2014,/);
  await page.locator(".cleaning summary").click();
  await page.locator('[data-figure="cleaned-after"] canvas:visible').waitFor();
  assert.match((await page.textContent(".cleaning .but-plain")) ?? "", /Removed from the prepared channels: stronger 1/);
  assert.equal(await page.locator(".shares tbody tr").count(), 4);
  const npy = await download(page, '[data-clean="npy"]');
  assert.equal(npy.name, "plain-cleaned.npy");
  assert.match(npy.bytes.subarray(0, 128).toString("latin1"), /NUMPY.*<f4.*\(4, ?6000,? ?\)/s);
  const cleaned = await download(page, '[data-clean="edf"]');
  assert.match(cleaned.bytes.subarray(0, 256).toString("latin1"), /removed_stronger-1/);
  await page.locator("#take-away").screenshot({ path: join(folder, "take.png") });
  await picture(page, "takeaway-1280", true);
  assert.deepEqual(seen, clean);
  await page.close();
});

test("every figure of a component is drawn, and saved at the size and density that were asked for", async () => {
  const { page, seen } = await sheetOf(["plain.edf"]);
  await page.locator("#components .comps .button").first().click();
  for (const part of ["map", "spectrum", "trials", "trials-by-power", "time-frequency", "consistency", "powers", "excerpt"]) {
    const figure = page.locator(`.opened-one [data-figure$="-1-${part}"] canvas`);
    await figure.scrollIntoViewIfNeeded();
    await page.locator(`.opened-one [data-figure$="-1-${part}"] canvas:visible`).waitFor({ timeout: 20_000 });
  }
  const slot = '.opened-one [data-figure$="-1-powers"]';
  await page.locator(`${slot} .save summary`).click();
  await page.locator(`${slot} .save input[aria-label="Width in millimetres"]`).fill("85");
  await page.locator(`${slot} .save input[aria-label="Width in millimetres"]`).press("Tab");
  await page.locator(`${slot} .save input[type="checkbox"]`).check();
  const png = (await download(page, `${slot} .save button:has-text("PNG")`)).bytes;
  const at = png.indexOf("pHYs");
  assert.equal(png.readUInt32BE(at + 4), Math.round(300 / 0.0254), "pixels a metre");
  // 85 mm are 321 CSS px; 300 dpi are 3.125 device px to each.
  assert.equal(png.readUInt32BE(16), Math.round(321 * 3.125));
  await page.locator(`${slot} .save summary`).click();
  const svg = (await download(page, `${slot} .save button:has-text("SVG")`)).bytes.toString();
  assert.match(svg, /^<svg[^>]* width="85mm" height="[\d.]+mm"/);
  assert.doesNotMatch(svg, /<rect[^>]*width="3210"/);
  await page.locator('input[name="spectrum"][value="multitaper"]').check({ force: true });
  await reaches(page, ["ready"]);
  await page.setViewportSize({ width: 1280, height: 720 });
  await picture(page, "component-1280", true);
  await page.setViewportSize({ width: 820, height: 1180 });
  await page.emulateMedia({ colorScheme: "dark" });
  await picture(page, "component-dark-820", true);
  assert.deepEqual(seen, clean);
  await page.close();
});

test("saved filters dropped with another recording are applied without refitting", async () => {
  const { page } = await sheetOf(["plain.edf"]);
  const weights = (await download(page, '[data-takeaway="weights-json"]')).bytes;
  await page.close();
  await writeFile(join(folder, "weights.json"), weights);
  const other = await sheetOf(["next.edf", "weights.json"]);
  await other.page.locator("#carried table").waitFor({ timeout: 30_000 });
  assert.ok((await other.page.locator("#carried tbody tr").count()) >= 2);
  assert.match((await other.page.textContent("#carried .say")) ?? "", /stronger 1 (still separates|leans|does not separate)/);
  await picture(other.page, "carried-1280");
  // A recording of another montage is refused with the reason.
  const renamed = Buffer.from(noise(Array.from({ length: 24 }, (_, k) => ({ onset: 2 * k + 2, label: "knock" }))));
  Buffer.from("B9".padEnd(16)).copy(renamed, 256);
  await writeFile(join(folder, "renamed.edf"), renamed);
  await other.page.setInputFiles("input#recording", join(folder, "renamed.edf"));
  await other.page.locator("#carried .where", { hasText: "A1" }).waitFor({ timeout: 30_000 });
  assert.deepEqual(other.seen, clean);
  await other.page.close();
});

test("names from a file stay names: on the page, in tables, reports and archives", async () => {
  const { page, seen } = await sheetOf(["hostile.edf", "hostile_events.tsv"]);
  assert.equal(await page.locator("main script, main b:text-is('x')").count(), 0);
  assert.equal(await page.evaluate(() => document.querySelectorAll("#main script").length), 0);
  const weights = (await download(page, '[data-takeaway="weights-csv"]')).bytes.toString();
  assert.match(weights, /^'=1\+1,/m);
  const report = (await download(page, '[data-takeaway="report"]')).bytes.toString();
  assert.doesNotMatch(report, /<script|<b>x<\/b>|\u202E/);
  assert.match(report, /&lt;script&gt;/);
  const zip = (await download(page, '[data-takeaway="everything"]')).bytes;
  assert.doesNotMatch(zip.toString("latin1"), /PK\x01\x02.{42}[^P]*[<>"]script/s);
  await picture(page, "hostile-1280", true);
  assert.deepEqual(seen, clean);
  await page.close();
});

test("the guide has six screens, opens and closes by keyboard, and covers nothing", async () => {
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.locator("#open-guide").focus();
  await page.keyboard.press("Enter");
  assert.equal(await page.locator("#guide article").count(), 6);
  assert.equal(await page.locator("#guide").isVisible(), true);
  await picture(page, "guide-1280");
  await page.setViewportSize({ width: 820, height: 1180 });
  await picture(page, "guide-820");
  await page.keyboard.press("Escape");
  assert.equal(await page.locator("#guide").isHidden(), true);
  assert.equal(await page.evaluate(() => document.activeElement?.id), "open-guide");
  assert.deepEqual(seen, clean);
  await page.close();
});
