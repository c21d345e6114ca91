// A small recording of noise as EDF or EDF+C, for what the page does with events that are missing, tied or beside the file.

const [RATE, SECONDS, CHANNELS, NOTES] = [100, 60, ["A1", "A2", "A3", "A4"], 120];

/**
 * Four channels, one minute; EDF+C where there are events, plain EDF otherwise.
 * @param {{ onset: number, label: string }[]} events at most one a second
 */
export function noise(events) {
  const labels = events.length ? [...CHANNELS, "EDF Annotations"] : CHANNELS;
  const own = (/** @type {string} */ label) => CHANNELS.includes(label);
  const each = (/** @type {number} */ width, /** @type {(label: string) => string | number} */ text) => labels.map((label) => field(text(label), width)).join("");
  const head = [
    field(0, 8), field("X X X X", 80), field("Startdate 01-JAN-2026 X X X", 80), "01.01.26", "00.00.00", field(256 * (labels.length + 1), 8),
    field(events.length ? "EDF+C" : "", 44), field(SECONDS, 8), field(1, 8), field(labels.length, 4),
    each(16, (label) => label), each(80, () => ""), each(8, (label) => (own(label) ? "uV" : "")), each(8, (label) => (own(label) ? -1000 : -1)), each(8, (label) => (own(label) ? 1000 : 1)),
    each(8, () => -32768), each(8, () => 32767), each(80, () => ""), each(8, (label) => (own(label) ? RATE : NOTES / 2)), each(32, () => ""),
  ].join("");
  let seed = 7;
  const random = () => (seed = (seed * 48271) % 2147483647) / 2147483647 - 0.5;
  const records = Array.from({ length: SECONDS }, (_, second) => {
    const samples = Int16Array.from({ length: RATE * CHANNELS.length }, () => 2000 * random());
    const said = events.filter(({ onset }) => Math.floor(onset) === second).map(({ onset, label }) => `+${onset}\x14${label}\x14\0`);
    const notes = events.length ? Buffer.from(`+${second}\x14\x14\0${said.join("")}`.padEnd(NOTES, "\0"), "latin1") : Buffer.alloc(0);
    return Buffer.concat([Buffer.from(samples.buffer), notes]);
  });
  return Buffer.concat([Buffer.from(head, "latin1"), ...records]);
}

/** @param {string | number} text @param {number} width */
function field(text, width) {
  return String(text).slice(0, width).padEnd(width);
}
