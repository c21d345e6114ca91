// The page opens by double click, asks the network for nothing, and runs no script but its own.
import assert from "node:assert/strict";
import { createHash } from "node:crypto";
import { readFile } from "node:fs/promises";
import { after, before, test } from "node:test";
import { launch, openPage, pageFile, picture, reaches } from "./harness.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
before(async () => {
  browser = await launch();
});
after(() => browser.close());

test("starts from file:// without a request, a blocked attempt or an error", async () => {
  const { page, seen } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  await page.waitForTimeout(500);
  await picture(page, "start");
  assert.deepEqual(seen, { requests: [], violations: [], errors: [] });
  assert.equal(await page.evaluate(() => performance.getEntriesByType("resource").length), 0);
  await page.close();
});

test("the worker starts and runs the module", async () => {
  const { page } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  const worker = page.workers()[0] ?? (await page.waitForEvent("worker", { timeout: 10_000 }));
  assert.match(worker.url(), /^blob:/);
  assert.equal(await worker.evaluate(() => typeof WebAssembly.Module), "function");
  await page.close();
});

test("the policy pins exactly the script that the page runs, and the published sum is the file's", async () => {
  const html = await readFile(pageFile, "utf8");
  const script = html.slice(html.lastIndexOf("<script>") + "<script>".length, html.lastIndexOf("</script>"));
  const pinned = html.match(/script-src ([^;]+);/)?.[1].split(" ") ?? [];
  assert.deepEqual(pinned, [`'sha256-${createHash("sha256").update(script).digest("base64")}'`, "'wasm-unsafe-eval'"]);
  assert.match(html, /default-src 'none';/);
  assert.match(html, /connect-src 'none';/);
  const sum = (await readFile(`${pageFile}.sha256`, "utf8")).split(/\s+/);
  assert.deepEqual(sum.slice(0, 2), [createHash("sha256").update(html).digest("hex"), "teasel.html"]);
});

test("no path of the machine that built it is in the file or in its module", async () => {
  const html = await readFile(pageFile, "utf8");
  const { gunzipSync } = await import("node:zlib");
  const block = html.match(/id="teasel-module">([^<]+)</)?.[1] ?? "";
  const module = gunzipSync(Buffer.from(block, "base64")).toString("latin1");
  assert.ok(module.startsWith("\0asm"));
  for (const text of [html, module]) assert.doesNotMatch(text, /\/(root|home|Users)\/|\.cargo\/registry/);
});
