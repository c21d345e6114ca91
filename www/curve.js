/** Smooth strokes and reproducible chance, for the two drawings that the page makes itself. */

/**
 * A path through points, rounded as Catmull and Rom (1974) do.
 * @param {[number, number][]} points
 */
export function smooth(points) {
  const at = (/** @type {number} */ i) => points[Math.max(0, Math.min(points.length - 1, i))] ?? [0, 0];
  const short = (/** @type {number} */ v) => String(Math.round(v * 10) / 10);
  let path = `M${short(at(0)[0])} ${short(at(0)[1])}`;
  for (let i = 0; i + 1 < points.length; i += 1) {
    const [a, b, c, d] = [at(i - 1), at(i), at(i + 1), at(i + 2)];
    const near = [b[0] + (c[0] - a[0]) / 6, b[1] + (c[1] - a[1]) / 6];
    const far = [c[0] - (d[0] - b[0]) / 6, c[1] - (d[1] - b[1]) / 6];
    path += `C${[...near, ...far, ...c].map(short).join(" ")}`;
  }
  return path;
}

/**
 * Numbers in [0, 1) that are the same on every machine (a multiplicative generator, Park & Miller 1988).
 * @param {number} seed
 */
export function chance(seed) {
  let state = (seed * 48271) % 2147483647 || 1;
  return () => (state = (state * 48271) % 2147483647) / 2147483647;
}
