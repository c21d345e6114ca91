// The policy holds: every way out is tried from inside the page, at a server on this machine that counts who arrives.
import assert from "node:assert/strict";
import { createServer } from "node:http";
import { after, before, test } from "node:test";
import { launch, openPage, reaches } from "./harness.mjs";

/** @type {Awaited<ReturnType<typeof launch>>} */
let browser;
let arrived = 0;
const server = createServer((_, response) => {
  arrived += 1;
  response.setHeader("Access-Control-Allow-Origin", "*").end("reached");
});
server.on("upgrade", (_, socket) => {
  arrived += 1;
  socket.destroy();
});
let address = "";
before(async () => {
  browser = await launch();
  await new Promise((done) => server.listen(0, "127.0.0.1", () => done(null)));
  address = `127.0.0.1:${/** @type {import("node:net").AddressInfo} */ (server.address()).port}`;
});
after(async () => {
  await browser.close();
  server.close();
});

/** @type {[string, string, (address: string) => unknown][]} */
const ways = [
  ["fetch", "connect-src", (to) => fetch(`http://${to}/`).catch(() => {})],
  ["XMLHttpRequest", "connect-src", (to) => {
    const request = new XMLHttpRequest();
    request.open("POST", `http://${to}/`);
    try {
      request.send("data");
    } catch {}
  }],
  ["beacon", "connect-src", (to) => void navigator.sendBeacon(`http://${to}/`, "data")],
  ["WebSocket", "connect-src", (to) => {
    try {
      new WebSocket(`ws://${to}/`);
    } catch {}
  }],
  ["EventSource", "connect-src", (to) => void new EventSource(`http://${to}/`)],
  ["image", "img-src", (to) => void (new Image().src = `http://${to}/`)],
  ["style sheet", "style-src-elem", (to) => document.head.append(Object.assign(document.createElement("link"), { rel: "stylesheet", href: `http://${to}/` }))],
  ["font", "font-src", (to) => new FontFace("x", `url(http://${to}/)`).load().catch(() => {})],
  ["script", "script-src-elem", (to) => document.head.append(Object.assign(document.createElement("script"), { src: `http://${to}/` }))],
  ["frame", "frame-src", (to) => document.body.append(Object.assign(document.createElement("iframe"), { src: `http://${to}/` }))],
  ["media", "media-src", (to) => document.body.append(Object.assign(document.createElement("video"), { src: `http://${to}/` }))],
  ["form", "form-action", (to) => {
    const form = Object.assign(document.createElement("form"), { action: `http://${to}/`, method: "post" });
    document.body.append(form);
    form.submit();
  }],
  ["base address", "base-uri", (to) => document.head.append(Object.assign(document.createElement("base"), { href: `http://${to}/` }))],
  ["script written into the page", "script-src-elem", () => document.body.append(Object.assign(document.createElement("script"), { textContent: "globalThis.ran = true" }))],
  // In a task of its own: what the test evaluates directly may do this.
  ["text run as a script", "script-src", () => void setTimeout(() => {
    try {
      new Function("globalThis.ran = true")();
    } catch {}
  })],
  ["worker from an address", "worker-src", (to) => {
    const text = `fetch("http://${to}/")`;
    new Worker(`data:text/javascript,${encodeURIComponent(text)}`).onerror = (event) => event.preventDefault();
  }],
];

for (const [name, directive, attempt] of ways) {
  test(`blocked and reported: ${name}`, async () => {
    const { page, seen } = await openPage(browser.context);
    await reaches(page, ["empty"]);
    const before = arrived;
    await page.evaluate(`(${attempt})(${JSON.stringify(address)})`);
    for (let i = 0; i < 40 && seen.violations.length === 0; i += 1) await page.waitForTimeout(50);
    assert.ok(
      seen.violations.some((violation) => violation.directive === directive),
      `a violation of ${directive}, not ${JSON.stringify(seen.violations)}`,
    );
    assert.equal(arrived, before, "the server must not be reached");
    assert.equal(await page.evaluate(() => "ran" in globalThis), false);
    await page.close();
  });
}

test("the worker is under the same policy", async () => {
  const { page } = await openPage(browser.context);
  await reaches(page, ["empty"]);
  const worker = page.workers()[0] ?? (await page.waitForEvent("worker"));
  const before = arrived;
  const outcome = await worker.evaluate(
    (to) => fetch(`http://${to}/`).then(() => "reached", () => "refused"),
    address,
  );
  assert.equal(outcome, "refused");
  assert.equal(arrived, before);
  await page.close();
});

test("the server that counts does count", async () => {
  const before = arrived;
  await fetch(`http://${address}/`);
  assert.equal(arrived, before + 1);
});
