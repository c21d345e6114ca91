/** The ledger: how many requests the page has made since it opened, by the browser's own count. */
import { find, make } from "./kit.js";

/** @type {string[]} */
const seen = [];

/** Counts every resource that the browser lists and every attempt that the policy refused; `blob:` and `data:` never leave the machine. */
export function mountLedger() {
  const watch = new PerformanceObserver((list) => list.getEntries().forEach(({ name }) => note(name)));
  watch.observe({ type: "resource", buffered: true });
  document.addEventListener("securitypolicyviolation", (event) => note(`refused: ${event.blockedURI || event.violatedDirective}`));
  show();
}

/** @param {string} address */
function note(address) {
  if (/^(blob|data):/.test(address)) return;
  seen.push(address);
  show();
}

function show() {
  for (const place of document.querySelectorAll("[data-ledger]")) place.textContent = String(seen.length);
  find("[data-ledger-list]").replaceChildren(...seen.slice(-20).map((address) => make("li", {}, address)));
}
