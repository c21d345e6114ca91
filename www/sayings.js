/** What the page says when something is missing, kept, stopped or wrong. */
import { make } from "./kit.js";
import { asProblem, say, sentence, unsay, whereabouts, whole } from "./notices.js";
import { clock, count } from "./numbers.js";

/** @typedef {import("./notices.js").Way} Way */

/** @type {Way} */
const CLOSE = { label: "Close", act: () => unsay("#hint") };

/** @param {() => void} pick */
export function sayNoEvents(pick) {
  const strong = (/** @type {string} */ text) => make("b", {}, text);
  say("#hint", {
    title: "This recording holds no events",
    text: ["Nor does a rhythm stand out of its spectrum, so no question is proposed. Mark spans on the traces as signal and reference, or drop its table of events here; the recording stays open. A tab-separated file with the columns ", strong("onset"), ", ", strong("duration"), " and ", strong("trial_type"), " is read as it is; of any other table with a row an event you are asked which column is which."],
    ways: [{ label: "Choose the table of events…", act: pick, main: true }],
  });
}

export function sayFewEvents() {
  say("#hint", {
    title: "No event occurs ten times",
    text: ["With fewer than ten windows a side, held-out ratios and p are withheld: enough to look, too few to test. Choose an event and its components can be looked at."],
    ways: [CLOSE],
  });
}

/** @param {string[]} notes */
export function sayOpenEnds(notes) {
  say("#hint", { title: "The link left some things open", text: [notes.join(" ")], ways: [CLOSE] });
}

/** Choices that wait for a recording. @param {string} title @param {string[]} labels events that they ask for @param {() => void} aside */
export function sayWaiting(title, labels, aside) {
  const each = labels.flatMap((label, k) => [k ? ", " : "", make("bdi", {}, make("b", {}, label))]);
  const expects = labels.length ? [" They expect events labelled ", ...each, "."] : [" They leave the events to the recording: its most frequent ones are filled in, and it is said which."];
  say("#hint", {
    title,
    text: ["They are used for the next recording that is opened. A link holds no data: drop the recording it belongs to, or take a demo.", ...expects],
    ways: [{ label: "Set them aside", act: aside }],
  });
}

/** The way on stays in the evidence. */
function leave() {
  unsay("#hint");
  document.getElementById("go-on")?.focus({ preventScroll: true });
}

/** @param {() => void} goOn */
export function sayStopped(goOn) {
  say("#hint", { title: "Stopped", text: ["What was computed before stays on the sheet."], ways: [{ label: "Go on", main: true, act: goOn }, { label: "Leave it", act: leave }] });
}

/** The worker ended. @param {() => void} again @param {(() => void) | null} takeRecipe */
export function sayEnded(again, takeRecipe) {
  say("#problem", {
    title: "The computation stopped; your choices are kept",
    text: ["The browser ended the worker, most likely for memory. Fewer channels or a lower sampling rate need less."],
    ways: [{ label: "Try again as it was", main: true, act: again }, ...(takeRecipe ? [{ label: "Take recipe.json", bare: true, act: takeRecipe }] : [])],
  });
}

/**
 * An error in its own words: what, where, expected and found, what to do.
 * @param {unknown} thrown
 * @param {Way[]} ways
 */
export function sayProblem(thrown, ways) {
  const problem = asProblem(thrown);
  const { salvage, file } = problem;
  const about = file && !problem.what.includes(file) ? `${file}: ` : "";
  const rest = salvage ? [" The ", make("b", {}, `${count(salvage.records)} whole records before it (${clock(salvage.seconds)})`), " can be opened."] : [];
  say("#problem", { title: sentence(about + problem.what, file), text: [whole(problem.advice), ...rest], where: whereabouts(problem), ways });
}
