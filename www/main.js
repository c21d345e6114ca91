/** The page: starts the bridge, joins the parts, and opens recordings through one door. */
import { start } from "./bridge.js";
import { find, make } from "./kit.js";
import { mountAbout } from "./about.js";
import { carriers } from "./carriers.js";
import { mountChannels } from "./channels.js";
import { mountChoosing } from "./choosing.js";
import { mountComponents } from "./components.js";
import { mountCompression } from "./compression.js";
import { mountEvidence } from "./evidence.js";
import { figuresOf, mountFigures } from "./figure.js";
import { mountFinding } from "./finding.js";
import { mountFirst } from "./first.js";
import { mountHistory } from "./history.js";
import { mountLedger } from "./ledger.js";
import { duration, size } from "./numbers.js";
import { mountCarried } from "./carried.js";
import { mountCleaning } from "./cleaning.js";
import { mountGuide } from "./guide.js";
import { mountMany } from "./many.js";
import { unsay } from "./notices.js";
import { door } from "./open.js";
import { mountMapping } from "./mapping.js";
import { mountPositions } from "./positions.js";
import { mountProgress } from "./progress.js";
import { mountReadings } from "./readings.js";
import { mountRecipeLink } from "./recipe-link.js";
import { mountRejection } from "./rejection.js";
import { mountRecording } from "./recording.js";
import { follow, now, put } from "./state.js";
import { numbersOf } from "./tables.js";
import { mountTakeaway } from "./takeaway.js";
import { mountThread } from "./thread.js";
import { mountWindows } from "./windows.js";
import { mountWork } from "./work.js";

/** @typedef {import("./types").Bridge} Bridge */

mountLedger();
mountThread();
mountReadings();
mountFigures();
mountGuide();

/** The first screen answers at once; what it asks for waits for the bridge. */
const ready = /** @type {Promise<Bridge>} */ (start());
const opened = ready.then(join);
mountFirst({
  files: (files) => void opened.then(({ files: open }) => open(files)),
  demo: (which) => void opened.then(({ demo }) => demo(which)),
  recipe: (file) => void opened.then(({ recipe }) => recipe(file)),
});
opened.then(({ begin }) => begin(), (thrown) => {
  document.documentElement.dataset.state = "error";
  const box = find("#problem");
  box.hidden = false;
  box.replaceChildren(make("h3", {}, "This browser cannot run Teasel"), make("p", {}, `It needs WebAssembly with 128-bit vectors and workers (any browser since 2023). ${thrown instanceof Error ? thrown.message : ""}`));
});

/** @param {Bridge} bridge */
function join(bridge) {
  const work = mountWork(bridge, { failed: (thrown) => doors.failed(thrown), died: () => doors.died() });
  /** @type {import("./types").App} */
  const app = { bridge, change: work.change };
  const many = mountMany(app, { first: (files) => void doors.files(files) });
  const carried = mountCarried(app);
  const doors = door(app, work.send, { set: (files) => many.offer(files).catch(doors.failed), weights: carried.take });
  mountRecording(app);
  mountAbout();
  mountChannels(app);
  mountMapping(app, doors);
  mountPositions(app, doors);
  mountWindows(app);
  mountRejection(app);
  mountCompression(app);
  mountComponents(app);
  mountEvidence(app, () => doors.goOn());
  mountFinding(app);
  mountTakeaway(app, doors.failed);
  mountCleaning(app);
  mountChoosing(app, () => {
    unsay("#hint");
    unsay("#problem");
    put({ phase: "working" });
    work.send();
    find("#main").focus({ preventScroll: true });
  });
  mountProgress(() => void doors.stop());
  mountRecipeLink(bridge);
  mountHistory(app);
  head();
  sections(app);
  return doors;
}

/** What is open, in the head and in the window's title. */
function head() {
  follow((state, before) => {
    if (state.summary === before.summary) return;
    const card = state.summary?.recording;
    find("#steps").hidden = !card;
    if (!card || !state.summary) return;
    const facts = [carriers(state.summary), `${Number(card.rate_hz.toFixed(3))} Hz`, duration(card.duration_s), ...(state.source?.size ? [size(state.source.size)] : [])];
    find("#opened").replaceChildren(make("b", {}, card.name), ` · ${facts.join(" · ")}`);
    document.title = `${card.name} · Teasel`;
  });
}

/** The tables of numbers in each section's margin. @param {import("./types").App} app */
function sections(app) {
  for (const section of document.querySelectorAll(".step")) {
    if (!section.querySelector(".numbers")) continue;
    const update = numbersOf(app, /** @type {HTMLElement} */ (section), () => figuresOf(section.id).filter(({ plan, place }) => plan.width === undefined && place.isConnected));
    follow((state, before) => state.sheet !== before.sheet && update());
  }
}
