// One browser, one fresh page a test, and a witness of everything that must not happen: requests, blocked attempts, errors.
import { existsSync } from "node:fs";
import { mkdir, mkdtemp, readFile, rm, writeFile } from "node:fs/promises";
import { tmpdir } from "node:os";
import { join, resolve } from "node:path";
import { fileURLToPath, pathToFileURL } from "node:url";
import { chromium } from "playwright-core";

export const root = resolve(fileURLToPath(new URL("../..", import.meta.url)));
export const pageFile = join(root, "dist/teasel.html");
export const pageUrl = pathToFileURL(pageFile).href;
/** Where `cargo xtask test` has put the demo recording as a file. */
export const recordings = process.env.TEASEL_RECORDINGS ?? join(root, "target/page-tests");
const shots = join(root, "target/screenshots");

const candidates = [process.env.TEASEL_CHROMIUM, "/usr/bin/chromium", "/usr/bin/chromium-browser", "/usr/bin/google-chrome"];
const executablePath = candidates.find((path) => path && existsSync(path));

const args = [
  "--no-sandbox",
  "--disable-gpu",
  "--disable-quic",
  "--no-first-run",
  "--disable-background-networking",
  "--disable-component-update",
  "--disable-sync",
];

/** Starts Chromium with a fresh profile. */
export async function launch() {
  if (!executablePath) throw new Error("Chromium is not installed: apt-get install chromium");
  const profile = await mkdtemp(join(tmpdir(), "teasel-browser-"));
  const context = await chromium.launchPersistentContext(profile, {
    executablePath,
    args,
    headless: true,
    viewport: { width: 1280, height: 720 },
    acceptDownloads: true,
  });
  return {
    context,
    async close() {
      await context.close();
      await rm(profile, { recursive: true, force: true });
    },
  };
}

/**
 * Opens the built page and watches it.
 * @param {import("playwright-core").BrowserContext} context
 * @param {{fragment?: string, url?: string}} [options]
 */
export async function openPage(context, { fragment = "", url = pageUrl } = {}) {
  const page = await context.newPage();
  const seen = { requests: /** @type {string[]} */ ([]), violations: /** @type {any[]} */ ([]), errors: /** @type {string[]} */ ([]) };
  page.on("request", (request) => {
    const address = request.url();
    const own = address.split("#")[0] === url;
    if (!own && !address.startsWith("data:") && !address.startsWith("blob:")) seen.requests.push(address);
  });
  page.on("websocket", (socket) => seen.requests.push(socket.url()));
  await page.exposeFunction("teaselTestViolation", (/** @type {any} */ violation) => seen.violations.push(violation));
  await page.exposeFunction("teaselTestError", (/** @type {string} */ error) => seen.errors.push(error));
  await page.addInitScript(() => {
    // A problem is a plain object, which the browser would report as "Object".
    const told = (/** @type {any} */ thrown) => (thrown instanceof Error ? String(thrown) : JSON.stringify(thrown));
    // @ts-ignore: exposed above
    addEventListener("error", (event) => window.teaselTestError(told(event.error ?? event.message)));
    // @ts-ignore: exposed above
    addEventListener("unhandledrejection", (event) => window.teaselTestError(told(event.reason)));
    document.addEventListener("securitypolicyviolation", (event) =>
      // @ts-ignore: exposed above
      window.teaselTestViolation({ blocked: event.blockedURI, directive: event.effectiveDirective }),
    );
  });
  await page.goto(url + fragment);
  return { page, seen };
}

/**
 * Waits until the page says that it is in one of these states.
 * @param {import("playwright-core").Page} page
 * @param {string[]} states
 */
export async function reaches(page, states, timeout = 60_000) {
  // Seen and told in one look: read again, the state could be another.
  const seen = await page.waitForFunction(
    (wanted) => {
      const state = document.documentElement.dataset.state ?? "";
      return wanted.includes(state) ? state : null;
    },
    states,
    { timeout, polling: 20 },
  );
  return seen.jsonValue();
}

/**
 * Keeps a picture in target/screenshots.
 * @param {import("playwright-core").Page} page
 * @param {string} name
 */
export async function picture(page, name, fullPage = false) {
  await mkdir(shots, { recursive: true });
  await page.screenshot({ path: join(shots, `${name}.png`), fullPage });
}

/**
 * Presses a button and gives what the page hands out as a download.
 * @param {import("playwright-core").Page} page
 * @param {string} selector
 */
export async function download(page, selector) {
  const coming = page.waitForEvent("download", { timeout: 60_000 });
  await page.locator(selector).click();
  const handed = await coming;
  const stream = await handed.createReadStream();
  const chunks = [];
  for await (const chunk of stream) chunks.push(chunk);
  return { name: handed.suggestedFilename(), bytes: Buffer.concat(chunks) };
}

/**
 * The built page with its own script exchanged for one that only starts the bridge, as `bridgeReady`: the same module, worker and
 * policy, without the sheet around them.
 */
export async function bridgeUrl() {
  const [{ build }, { createHash }] = await Promise.all([import("esbuild"), import("node:crypto")]);
  const { outputFiles } = await build({
    stdin: {
      contents: `import { start } from "./www/bridge.js"; globalThis.bridgeReady = start(); document.documentElement.dataset.state = "empty";`,
      resolveDir: root,
    },
    bundle: true,
    minify: true,
    format: "iife",
    write: false,
    define: { "import.meta.url": '"about:blank"' },
    alias: { "teasel-module": join(root, "target/page/teasel_page.js") },
  });
  const script = outputFiles[0].text.trim();
  const hash = createHash("sha256").update(script).digest("base64");
  const html = await readFile(pageFile, "utf8");
  const own = html.lastIndexOf("<script>");
  const exchanged = `${html.slice(0, own)}<script>${script}</script></body></html>`.replace(/'sha256-[^']+'/, `'sha256-${hash}'`);
  const file = join(root, "target/page/bridge.html");
  await writeFile(file, exchanged);
  return pathToFileURL(file).href;
}
