/** The thread: seven knots, each with its step's answer, and between them the fibres as far as they are teased apart. */
import { find, makeSvg } from "./kit.js";
import { chance, smooth } from "./curve.js";
import { hasResults, leadingOf } from "./leading.js";
import { clock, count, factor } from "./numbers.js";
import { follow } from "./state.js";

/** @typedef {import("./types").State} State */
/** @typedef {import("./types").StepName} StepName */
/** @typedef {"wait" | "now" | "work" | "done" | "look"} Knot */
/** @typedef {{ knot: Knot, answer: string, percent?: number }} Answer */

const WITHHELD = "withheld";
/** @type {StepName[]} */
const STEPS = ["recording", "channels", "windows", "compression", "components", "evidence", "take-away"];
/** @type {Record<Knot, string>} */
const WORDS = { wait: "waiting", now: "waiting for you", work: "working", done: "done", look: "needs a look" };

export function mountThread() {
  follow((state) => {
    const answers = STEPS.map((step) => remembered(step, answer(step, state), state));
    STEPS.forEach((step, i) => show(step, answers[i] ?? { knot: "wait", answer: "" }));
    weave(state);
  });
  weave(null);
}

/** What each step said when it was done. @type {Map<StepName, Answer>} */
const known = new Map();

/** While the evidence is on its way again, a step keeps what it said before. @param {StepName} step @param {Answer} said @param {State} state */
function remembered(step, said, { phase, sheet, stopped }) {
  if (!sheet) known.clear();
  const open = said.answer === WITHHELD || (step === "components" && said.answer.includes("+"));
  const before = known.get(step);
  if (open && phase === "working" && before) return { ...said, knot: said.knot === "work" ? "work" : before.knot, answer: before.answer };
  if (phase === "ready" && !stopped) known.set(step, said);
  return said;
}

/** @param {StepName} step @param {Answer} said */
function show(step, said) {
  for (const place of document.querySelectorAll(`[data-step="${step}"]`)) {
    place.setAttribute("data-knot", said.knot);
    const knot = /** @type {HTMLElement} */ (find(".knot", place));
    knot.style.setProperty("--part", String(said.percent ?? 0));
    if (place.localName !== "li") continue;
    find(".answer", place).textContent = said.answer;
    find("a", place).setAttribute("aria-current", said.knot === "now" || said.knot === "work" ? "step" : "false");
    find(".aside", place).textContent = said.percent === undefined ? WORDS[said.knot] : `working, ${Math.round(said.percent)} %`;
  }
}

/** Which step a stage of the work belongs to. @type {Record<string, StepName>} */
const STEP_OF = { reading: "recording", preparing: "channels", windows: "windows", fitting: "components", "held-out": "evidence", permuting: "evidence", curve: "compression" };

/** @param {StepName} step @param {State} state @returns {Answer} */
function answer(step, state) {
  const { progress } = state;
  const said = settled(step, state);
  if (progress && state.phase !== "choosing" && STEP_OF[progress.stage] === step && said.knot !== "now") {
    const percent = progress.of > 0 ? (100 * progress.done) / progress.of : 0;
    return { knot: "work", answer: said.answer || `${Math.round(percent)} %`, percent };
  }
  return said;
}

/** @param {StepName} step @param {State} state @returns {Answer} */
function settled(step, { summary, sheet, phase, recipe, stopped, taken }) {
  /** @type {Answer} */
  const waiting = { knot: "wait", answer: "" };
  if (step === "recording") {
    if (!summary) return waiting;
    const { duration_s, warnings, layout } = summary.recording;
    return { knot: warnings.length ? "look" : "done", answer: `${layout.kind === "frames" ? `${layout.height} × ${layout.width} px` : `${summary.channels.length} ch`}, ${clock(duration_s)}` };
  }
  if (step === "channels") {
    if (sheet?.movie) return { knot: "done", answer: `${count(sheet.movie.used.length)} used` };
    const channels = (sheet ?? summary)?.channels;
    if (!channels) return waiting;
    const used = channels.filter(({ state }) => state.state !== "left-out" && state.state !== "unusable").length;
    const doubt = channels.some(({ state }) => state.state === "needs-a-look" || state.state === "unusable");
    const out = channels.length - used;
    return { knot: doubt ? "look" : "done", answer: out ? `${used} used, ${out} out` : `${used} used` };
  }
  if (step === "windows" && phase === "choosing" && !recipe) return { knot: "look", answer: "no events" };
  if (step === "windows" && phase === "choosing") return { knot: "now", answer: "pick an event" };
  if (step === "evidence" && stopped) return { knot: "look", answer: "stopped" };
  if (!sheet) return waiting;
  if (step === "windows" && sheet.windows) {
    const { signal, reference } = sheet.windows;
    return { knot: Math.min(signal.used, reference.used) < 10 ? "look" : "done", answer: `${signal.used} + ${reference.used}` };
  }
  if (step === "compression" && sheet.compression) return { knot: "done", answer: `keep ${sheet.compression.kept} of ${sheet.compression.rank}` };
  if (step === "components" && hasResults(sheet)) {
    if (!sheet.stronger.length && !sheet.weaker.length) return { knot: "look", answer: "none" };
    const { up, down, tested } = passing(sheet);
    return { knot: "done", answer: tested ? `${up} up, ${down} down` : `${sheet.stronger.length} + ${sheet.weaker.length}` };
  }
  if (step === "evidence" && hasResults(sheet)) return evidence(sheet);
  if (step === "take-away" && hasResults(sheet)) return taken ? { knot: "done", answer: taken === 1 ? "1 file taken" : `${taken} files taken` } : { knot: "wait", answer: "not taken yet" };
  return waiting;
}

/** @param {import("./types").Sheet} sheet @returns {Answer} */
function evidence(sheet) {
  const leading = leadingOf(sheet);
  const measure = sheet.recipe.measure === "total" ? leading?.total : leading?.typical;
  if (measure?.held_out === null || measure?.held_out === undefined) return { knot: sheet.windows ? "look" : "wait", answer: WITHHELD };
  return { knot: "done", answer: `held-out ${factor(measure.held_out)}` };
}

/** Components of each end with p ≤ 0.05. @param {import("./types").Sheet} sheet */
export function passing(sheet) {
  const pass = (/** @type {import("./types").Component[]} */ list) => list.filter(({ p }) => p !== null && p <= 0.05).length;
  const tested = [...sheet.stronger, ...sheet.weaker].some(({ p }) => p !== null);
  return { up: pass(sheet.stronger), down: pass(sheet.weaker), tested };
}

/** How many strands, of which kind, run from each knot to the next. @param {State | null} state @returns {string[][]} */
function strands(state) {
  const many = (/** @type {number} */ n) => Array.from({ length: n }, () => "fibre");
  const kept = state?.sheet?.compression ? Math.max(2, Math.min(6, Math.round(state.sheet.compression.kept / 3))) : 0;
  const apart = state?.sheet && hasResults(state.sheet) ? passing(state.sheet) : null;
  const ends = apart ? [...Array(apart.up).fill("up"), ...Array(apart.down).fill("down")] : [];
  const out = ends.length ? ends : apart ? ["fibre"] : [];
  return [state?.summary ? many(11) : [], state?.sheet?.preparation ? many(9) : [], state?.sheet?.windows ? many(8) : [], many(kept), out, apart?.tested ? out : []];
}

let woven = "";

/** @param {State | null} state */
function weave(state) {
  const plan = strands(state);
  const pattern = JSON.stringify(plan);
  const open = state?.phase === "working" && state.sheet && !passing(state.sheet).tested && /"(up|down)"/.test(woven);
  if (pattern === woven || open) return;
  woven = pattern;
  const random = chance(3);
  const paths = plan.flatMap((kinds, i) => {
    const [from, to] = [58 + 100 * i, 142 + 100 * i];
    if (!kinds.length) return [makeSvg("path", { class: "fibre waits", d: `M${from} 14H${to}` })];
    return kinds.map((kind, k) => {
      const aim = kinds.length > 1 ? (k / (kinds.length - 1) - 0.5) * Math.min(20, 5 * kinds.length) : 0;
      const calm = kind === "fibre" ? 1 : 0.25;
      const [a, b] = [6.3 * random(), 6.3 * random()];
      /** @type {[number, number][]} */
      const points = Array.from({ length: 13 }, (_, j) => {
        const t = j / 12;
        const wander = calm * (2.6 * Math.sin(9 * t + a) + 1.6 * Math.sin(17 * t + b));
        return [from + (to - from) * t, 14 + Math.sin(Math.PI * t) ** 0.8 * (aim * 0.75 + wander)];
      });
      return makeSvg("path", { class: `fibre ${kind}`, d: smooth(points) });
    });
  });
  find(".thread .fibres").replaceChildren(...paths);
}
