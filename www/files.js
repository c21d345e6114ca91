/** Files as they come from a drop or a picker: which are recordings, which lie beside one; and what a folder holds. */

/** Side files by the names that the standards give them, packed or not. */
const SIDE_FILE = /(^|_)(events|channels|electrodes|coordsystem|eeg|ieeg|meg|nirs|scans|participants|dataset_description)\.(tsv|json|csv)(\.gz)?$|\.json$/i;
/** Tables, which may hold samples or events. */
const TABLE = /\.(tsv|csv|txt)(\.gz)?$/i;
/** What lies about in a folder and is never a recording. */
const OTHER = /^(readme|changes|licen[cs]e|citation)(\.|$)|\.(md|pdf|html?|py|sh|docx?|xlsx?|png|jpe?g|svg|bib|ya?ml)$/i;
/** Bytes in which the first line of a table of events ends. */
const FIRST_LINE = 2048;
/** More files than this are no one recording. */
const MOST_FILES = 2000;

/**
 * Recordings and the files beside them. A table beside another recording is a side file; of tables alone those with a column `onset` are.
 * @param {File[]} files
 * @returns {Promise<{ recordings: File[], sides: File[] }>}
 */
export async function sorted(files) {
  if (files.length === 1) return { recordings: files, sides: [] };
  const kinds = await Promise.all(files.map(kind));
  const of = (/** @type {string} */ kind) => files.filter((_, at) => kinds[at] === kind);
  const whole = of("recording");
  return whole.length ? { recordings: whole, sides: [...of("table"), ...of("side")] } : { recordings: of("table"), sides: of("side") };
}

/** @param {File} file */
async function kind(file) {
  if (OTHER.test(file.name)) return "other";
  if (SIDE_FILE.test(file.name)) return "side";
  if (!TABLE.test(file.name)) return "recording";
  const [first = ""] = (await file.slice(0, FIRST_LINE).text()).split("\n");
  return /(^|[\t;,"])onset([\t;,"\r]|$)/i.test(first) ? "side" : "table";
}

/**
 * Everything that was dropped, folders with what is in them; hidden files stay out.
 * @param {DataTransfer} dropped
 * @returns {Promise<File[]>}
 */
export async function droppedFiles(dropped) {
  const entries = [...dropped.items].map((item) => item.webkitGetAsEntry?.() ?? null);
  if (!entries.some((entry) => entry?.isDirectory)) return [...dropped.files];
  const files = await Promise.all(entries.map((entry) => (entry ? inside(entry) : [])));
  return files.flat().slice(0, MOST_FILES);
}

/** @param {FileSystemEntry} entry @returns {Promise<File[]>} */
async function inside(entry) {
  if (entry.name.startsWith(".")) return [];
  if (entry.isFile) return [await new Promise((done, failed) => /** @type {FileSystemFileEntry} */ (entry).file(done, failed))];
  const reader = /** @type {FileSystemDirectoryEntry} */ (entry).createReader();
  /** @type {FileSystemEntry[]} */
  const all = [];
  // A folder is handed out in portions; an empty one is the last.
  for (;;) {
    const some = await new Promise((/** @type {(entries: FileSystemEntry[]) => void} */ done, failed) => reader.readEntries(done, failed));
    if (!some.length || all.length > MOST_FILES) break;
    all.push(...some);
  }
  return (await Promise.all(all.map(inside))).flat();
}
