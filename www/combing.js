/** The drawing in the drop area: fibres on their way through a teasel head, tangled on the left, told apart on the right. */
import { makeSvg } from "./kit.js";
import { chance, smooth } from "./curve.js";

const HEAD = { x: 452, y: 106, wide: 30, tall: 76 };
const WIDE = 888;

/** @returns {SVGSVGElement} */
export function combing() {
  const drawing = makeSvg("svg", { viewBox: "0 0 888 328", preserveAspectRatio: "xMidYMin slice", "aria-hidden": "true" });
  drawing.append(...tangle(), ...strands(), ...bracts(), ...head());
  return drawing;
}

/** Half the head's width at a height. @param {number} y */
function halfWidth(y) {
  const t = (y - HEAD.y) / HEAD.tall;
  return Math.abs(t) >= 1 ? 0 : HEAD.wide * Math.sqrt(1 - t * t) * (1 + 0.12 * t);
}

/** Wandering fibres that gather at the head's left side. */
function tangle() {
  const random = chance(7);
  return Array.from({ length: 24 }, (_, i) => {
    const [start, end] = [26 + i * 6.6 + 14 * (random() - 0.5), HEAD.y - 30 + i * 2.7];
    const waves = [1, 2, 3].map((k) => ({ size: (22 / k) * (0.4 + random()), turns: k * (0.7 + 0.8 * random()), phase: 6.3 * random() }));
    /** @type {[number, number][]} */
    const points = [];
    for (let k = 0; k <= 26; k += 1) {
      const t = k / 26;
      const gather = t * t * t * (t * (6 * t - 15) + 10);
      const loose = (1 - gather) * waves.reduce((sum, w) => sum + w.size * Math.sin(6.283 * w.turns * t + w.phase), 0);
      points.push([t * (HEAD.x - 8), start + (end - start) * gather + loose]);
    }
    return makeSvg("path", { class: "fibre", opacity: (0.45 + 0.5 * random()).toFixed(2), d: smooth(points) });
  });
}

/** What leaves the head: two strands for what rises, two for what falls, thin ones for the rest. */
function strands() {
  const burst = (/** @type {number} */ x, /** @type {number} */ at, /** @type {number} */ width) => Math.exp(-(((x - at) / width) ** 2));
  /** @type {[string, number, number, (x: number) => number][]} */
  const plan = [
    ["up", -34, 44, (x) => 15 * burst(x, 640, 62) * Math.sin(x / 4.1)],
    ["up", -22, 68, (x) => 8 * burst(x, 715, 74) * Math.sin(x / 5.6 + 1)],
    ...[-10, -3, 4, 11, 18].map((from, i) => /** @type {[string, number, number, (x: number) => number]} */ (["rest", from, 88 + 10.5 * i, () => 0])),
    ["down", 27, 154, (x) => 8.5 * (1 - 0.85 * burst(x, 690, 84)) * Math.sin(x / 11)],
    ["down", 37, 178, (x) => 12 * (1 - 0.85 * burst(x, 650, 96)) * Math.sin(x / 13.5 + 2)],
  ];
  return plan.map(([kind, from, to, wave]) => {
    /** @type {[number, number][]} */
    const points = [];
    const step = kind === "rest" ? 24 : 4.5;
    for (let x = HEAD.x + 6; x <= WIDE + step; x += step) {
      const t = Math.min(1, (x - HEAD.x) / 150);
      const spread = t * t * (3 - 2 * t);
      points.push([x, HEAD.y + from + (to - HEAD.y - from) * spread + spread * wave(x)]);
    }
    return makeSvg("path", { class: `fibre ${kind}`, d: smooth(points) });
  });
}

/** The head: two families of spirals seen on a rounded body, and spines that lean towards the tip. */
function head() {
  const lines = [makeSvg("path", { class: "body", d: outline() })];
  for (const turn of [-1, 1]) for (let k = 0; k < 11; k += 1) lines.push(...spiral(turn, (k * 6.283) / 11));
  for (const side of [-1, 1])
    for (let y = HEAD.y - HEAD.tall + 4; y < HEAD.y + HEAD.tall - 6; y += 6.2) {
      const x = HEAD.x + side * halfWidth(y);
      const lean = 4 + 5 * Math.max(0, (HEAD.y - y) / HEAD.tall);
      lines.push(makeSvg("path", { class: "spine", d: `M${x.toFixed(1)} ${y.toFixed(1)}q${(side * 5).toFixed(1)} -1 ${(side * 8.5).toFixed(1)} ${(-lean).toFixed(1)}` }));
    }
  for (const dx of [-7, -3.5, 0, 3.5, 7]) lines.push(makeSvg("path", { class: "spine", d: `M${HEAD.x + dx} ${HEAD.y - HEAD.tall + Math.abs(dx) * 0.4}l${dx * 0.7} -11` }));
  return lines;
}

function outline() {
  /** @type {[number, number][]} */
  const left = [];
  /** @type {[number, number][]} */
  const right = [];
  for (let k = 0; k <= 20; k += 1) {
    const y = HEAD.y - HEAD.tall * Math.cos((Math.PI * k) / 20);
    left.push([HEAD.x - halfWidth(y), y]);
    right.unshift([HEAD.x + halfWidth(y), y]);
  }
  return `${smooth([...left, ...right])}Z`;
}

/**
 * The stretches of one spiral that face the reader.
 * @param {number} turn
 * @param {number} phase
 */
function spiral(turn, phase) {
  /** @type {[number, number][][]} */
  const runs = [[]];
  for (let k = 2; k <= 38; k += 1) {
    const y = HEAD.y - HEAD.tall * Math.cos((Math.PI * k) / 40);
    const angle = turn * 4.2 * (k / 40) + phase;
    if (Math.cos(angle) > 0) runs[runs.length - 1]?.push([HEAD.x + halfWidth(y) * Math.sin(angle), y]);
    else if (runs[runs.length - 1]?.length) runs.push([]);
  }
  return runs.filter((run) => run.length > 2).map((run) => makeSvg("path", { class: "spiral", d: smooth(run) }));
}

/** Long leaves below the head, and the stem. */
function bracts() {
  const [x, y] = [HEAD.x, HEAD.y + HEAD.tall - 3];
  const leaf = (/** @type {number} */ side, /** @type {number} */ reach, /** @type {number} */ rise) =>
    makeSvg("path", { class: "bract", d: `M${x} ${y + 5}C${x + side * reach * 0.5} ${y + 10} ${x + side * reach} ${y - rise * 0.3} ${x + side * reach * 0.98} ${y - rise}` });
  return [
    makeSvg("path", { class: "stem", d: `M${x} ${y}C${x + 1} ${y + 14} ${x - 1} ${y + 22} ${x} ${y + 32}` }),
    ...[-1, 1].flatMap((side) => [leaf(side, 46, 48), leaf(side, 58, 20), leaf(side, 30, 26)]),
  ];
}
