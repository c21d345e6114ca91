/** What a sheet is about: whether it holds results, and which component leads. */

/** @typedef {import("./types").Sheet} Sheet */

/** Results are there once the compression is known: it comes with the fit, whichever ends have components. @param {Sheet | null} sheet */
export function hasResults(sheet) {
  return Boolean(sheet?.compression);
}

/** The first component of the leading end; none where that end is empty. @param {Sheet | null} sheet */
export function leadingOf(sheet) {
  return sheet ? sheet[sheet.leading]?.[0] : undefined;
}
