/** What carries the samples, in words: channels, or the pixels of a movie, which are told by row and column. */
import { count } from "./numbers.js";

/** @typedef {import("./types").Summary} Summary */

/** "32 channels", "100 × 100 pixels". @param {Summary} summary */
export function carriers({ recording, channels }) {
  const { layout } = recording;
  return layout.kind === "frames" ? `${layout.height} × ${layout.width} pixels` : `${count(channels.length)} ${channels.length === 1 ? "channel" : "channels"}`;
}

/** Whether the recording is a movie. @param {Summary | null} summary */
export const isMovie = (summary) => summary?.recording.layout.kind === "frames";

/** A pixel's name as its place; every other name as it is. @param {string} name @param {Summary | null} summary */
export function placeOf(name, summary) {
  const pixel = isMovie(summary) ? /^r(\d+)c(\d+)$/.exec(name) : null;
  return pixel ? `row ${pixel[1]}, column ${pixel[2]}` : name;
}
