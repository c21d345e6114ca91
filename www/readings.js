/** Readings beside the figures. A changed reading appears only after the dials have rested, and then it is spoken once. */
import { carriers, isMovie } from "./carriers.js";
import { afterRest, find } from "./kit.js";
import { count, duration } from "./numbers.js";
import { plainText, writeSpans } from "./spans.js";
import { follow, now } from "./state.js";

const REST_MS = 300;
/** What stands in each section now. @type {Map<string, string>} */
const written = new Map();

export function mountReadings() {
  const later = afterRest(writeAll, REST_MS);
  follow((state, before) => {
    if (state.readings === before.readings && state.summary === before.summary) return;
    if (state.readings.length === 0) clear(), introduce();
    else if (before.readings.length === 0) writeAll();
    else later();
  });
}

/** The text of one section's reading, for those who cannot see the figure. @param {string} section */
export function readingOf(section) {
  const reading = now().readings.find((one) => one.section === section);
  return reading ? plainText(reading.text) + (reading.but ? ` But ${plainText(reading.but)}` : "") : "";
}

/** Nothing is known any more. */
function clear() {
  for (const section of written.keys()) {
    const place = find(`#reading-${section}`);
    place.replaceChildren();
    writeBut(place, null);
  }
  written.clear();
}

/** What is known of a recording before anything is computed. */
function introduce() {
  const { summary } = now();
  if (!summary) return;
  const { recording, channels } = summary;
  const events = Object.entries(recording.events);
  const doubt = channels.filter(({ state }) => state.state === "needs-a-look" || state.state === "unusable").map(({ name }) => name);
  const labels = events.length ? `events: ${events.slice(0, 6).map(([name, many]) => `${name} ${count(many)}`).join(", ")}${events.length > 6 ? ", …" : ""}` : "no events";
  find("#reading-recording").textContent = `${carriers(summary)} at ${Number(recording.rate_hz.toFixed(3))} Hz over ${duration(recording.duration_s)}; ${labels}.`;
  find("#reading-channels").textContent = isMovie(summary) ? `All ${carriers(summary)} can be used.` : doubt.length ? `Of ${channels.length} channels ${doubt.length} need a look: ${doubt.slice(0, 8).join(", ")}${doubt.length > 8 ? ", …" : ""}.` : `All ${channels.length} channels can be used.`;
}

function writeAll() {
  const { readings } = now();
  for (const { section, text, but } of readings) {
    const place = document.querySelector(`#reading-${section}`);
    if (!place) continue;
    writeBut(place, but);
    if (written.get(section) === plainText(text)) continue;
    written.set(section, plainText(text));
    writeSpans(place, text);
    place.classList.remove("is-new");
    requestAnimationFrame(() => place.classList.add("is-new"));
  }
}

/**
 * @param {Element} place
 * @param {import("./types").Span[] | null} but
 */
function writeBut(place, but) {
  const doubt = place.parentElement?.querySelector(".but");
  if (!(doubt instanceof HTMLElement)) return;
  doubt.hidden = !but;
  if (but) writeSpans(doubt, but);
}

/** Says one sentence to screen readers. @param {string} sentence */
export function speak(sentence) {
  const place = find("#message .spoken");
  if (place.textContent !== sentence) place.textContent = sentence;
}
