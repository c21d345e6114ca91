/** Progress: what is at work, how far it is, and a way to stop it. Short work is never mentioned. */
import { afterRest, find } from "./kit.js";
import { hasResults } from "./leading.js";
import { count } from "./numbers.js";
import { speak } from "./readings.js";
import { follow, now } from "./state.js";

/** Work that ends sooner than this goes unmentioned. */
const [PATIENCE_MS, READING_PATIENCE_MS] = [450, 180];
const REST_MS = 300;

/** @type {Record<string, string>} */
const WORDS = {
  reading: "Reading the recording", making: "Making the recording", preparing: "Preparing the channels", windows: "Covariances of the windows",
  fitting: "Looking for what differs", "held-out": "Testing on trials that were held out", permuting: "Permuting", curve: "Ratio against the dimensions kept", picturing: "Pictures over time and frequency",
};

let began = 0;
let stage = "";
let stageBegan = 0;

/** @param {() => void} stop */
export function mountProgress(stop) {
  const box = find("#message");
  find("#stop").addEventListener("click", stop);
  const rest = afterRest(() => now().progress || speak(atRest()), REST_MS);
  setInterval(() => now().progress && show(box), 150);
  follow((state, before) => {
    if (state.progress === before.progress && state.phase === before.phase) return;
    if (state.progress && !before.progress) began = performance.now();
    if (state.progress && state.progress.stage !== stage) {
      stage = state.progress.stage;
      stageBegan = performance.now();
    }
    if (!state.progress) {
      box.classList.add("at-rest");
      stage = "";
      rest();
    }
    show(box);
  });
}

/** @param {HTMLElement} box */
function show(box) {
  const { progress, phase } = now();
  const long = performance.now() - began > (phase === "reading" ? READING_PATIENCE_MS : PATIENCE_MS);
  box.classList.toggle("at-rest", !progress || !long);
  if (!progress) return;
  const part = progress.of > 0 ? (100 * progress.done) / progress.of : 0;
  box.style.setProperty("--part", part.toFixed(1));
  find("h3", box).textContent = heading();
  find(".shown .quiet", box).textContent = rest(part);
  if (long) speak(WORDS[progress.stage] ?? "");
}

function heading() {
  const { progress } = now();
  if (!progress) return "";
  const numbers = progress.stage === "permuting" ? `: ${count(progress.done)} of ${count(progress.of)}` : progress.of > 1 && progress.done < progress.of ? `: ${Math.floor((100 * progress.done) / progress.of)} %` : "";
  return (WORDS[progress.stage] ?? "Working") + numbers;
}

/** @param {number} part */
function rest(part) {
  const spent = (performance.now() - stageBegan) / 1000;
  const left = part > 3 && spent > 0.8 ? Math.ceil((spent * (100 - part)) / part) : 0;
  const time = left > 90 ? `About ${Math.ceil(left / 60)} min left.` : left ? `About ${left} s left.` : "";
  const moving = /permut/i.test(stage) && hasResults(now().sheet) ? " The ratios above are final; only p is still moving." : "";
  return `${time}${moving}`.trim();
}

function atRest() {
  const { phase, readings, recipe, stale } = now();
  if (phase === "ready" && !stale) {
    const said = readings.find(({ section }) => section === "so-far");
    return said ? said.text.map(({ text }) => text).join("") : "Done.";
  }
  if (phase !== "choosing") return "";
  return recipe ? "The recording is open. Choose an event." : "The recording is open. It holds no events: choose its table of events.";
}
