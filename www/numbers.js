/** Numbers as the sheet writes and reads them: minus is U+2212, ranges have an en dash, factors a times sign. */

/** @param {string} text */
const minus = (text) => text.replace(/^-/, "−");

/** A factor: `2.83×`. @param {number | null | undefined} value */
export function factor(value) {
  if (value === null || value === undefined || !Number.isFinite(value)) return "–";
  return `${value >= 100 ? value.toFixed(0) : value >= 10 ? value.toFixed(1) : value.toFixed(2)}×`;
}

/** An interval of factors: `2.33–3.47`. @param {[number, number] | null} pair */
export function interval(pair) {
  return pair ? `${factor(pair[0]).slice(0, -1)}–${factor(pair[1]).slice(0, -1)}` : "";
}

/** @param {number | null} p */
export function probability(p) {
  if (p === null) return "–";
  return p < 0.001 ? p.toPrecision(1) : p.toFixed(3);
}

/** Seconds with two digits, or three where the sampling grid needs them. @param {number} value */
export function seconds(value) {
  const near = Number(value.toFixed(3));
  if (near === 0) return "0";
  return minus(Number(near.toFixed(2)) === near ? near.toFixed(2) : near.toFixed(3));
}

/** Position in a recording: `4:00`. @param {number} value in seconds */
export function clock(value) {
  const whole = Math.round(value);
  const [h, m, s] = [Math.floor(whole / 3600), Math.floor(whole / 60) % 60, whole % 60];
  const tail = `${h ? String(m).padStart(2, "0") : m}:${String(s).padStart(2, "0")}`;
  return h ? `${h}:${tail}` : tail;
}

/** A length of time: `2 h 13 min`, `4 min`, `58.5 s`. @param {number} value in seconds */
export function duration(value) {
  if (value < 90) return `${Number(value.toFixed(1))} s`;
  const minutes = Math.round(value / 6) / 10;
  return minutes < 90 ? `${minutes} min` : `${Math.floor(minutes / 60)} h ${Math.round(minutes % 60)} min`;
}

/** A count in groups of three: `1,000`. @param {number} value */
export function count(value) {
  return String(Math.round(value)).replace(/\B(?=(\d{3})+$)/g, ",");
}

/** @param {number} bytes */
export function size(bytes) {
  if (bytes >= 1e9) return `${(bytes / 1e9).toFixed(1)} GB`;
  if (bytes >= 1e6) return `${(bytes / 1e6).toFixed(1)} MB`;
  return bytes >= 1000 ? `${Math.round(bytes / 1000)} kB` : `${bytes} bytes`;
}

/** Reads a typed number; accepts U+2212 and a decimal comma. @param {string} text @returns {number | null} */
export function typed(text) {
  const plain = text.trim().replace("−", "-").replace(",", ".");
  const value = Number(plain);
  return plain !== "" && Number.isFinite(value) ? value : null;
}

/**
 * A number as it stands in a field.
 * @param {number | null} value
 */
export function written(value) {
  return value === null ? "" : minus(String(Number(value.toFixed(4))));
}
