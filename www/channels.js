/** Channels: filters, reference, and which channels are left out or interpolated. */
import { isMovie } from "./carriers.js";
import { find, make } from "./kit.js";
import { numberField, picks, select, textField } from "./fields.js";
import { figureSlot } from "./figure.js";
import { moreFilters } from "./filters.js";
import { typed, written } from "./numbers.js";
import { fateOf, proposals, settle } from "./proposals.js";
import { ranks } from "./ranks.js";
import { movie } from "./movie.js";
import { follow, now } from "./state.js";

/** @typedef {import("./types").App} App */
/** @typedef {import("./types").Recipe} Recipe */

/** More channels than this are not listed. */
const MOST_LISTED = 512;

/** What pressing a channel's name does. @type {"leave_out" | "interpolate"} */
let pressing = "leave_out";

/** @param {App} app */
export function mountChannels(app) {
  const body = find("#channels .body");
  const filter = () => now().recipe?.filter;
  const hertz = (/** @type {string} */ label, /** @type {"high_pass_hz" | "low_pass_hz" | "resample_hz"} */ key, /** @type {(value: number) => string} */ refuses = () => "") =>
    numberField(label, { get: () => filter()?.[key], optional: true, range: () => [0.001, top(key)], step: () => 1, empty: "all", refuses, set: (value) => app.change((recipe) => void (recipe.filter[key] = value)) });
  const [high, low, rate] = [
    hertz("high-pass in hertz", "high_pass_hz", (value) => (value >= (filter()?.low_pass_hz ?? Infinity) ? "must lie below the upper edge" : "")),
    hertz("low-pass in hertz", "low_pass_hz", (value) => (value <= (filter()?.high_pass_hz ?? -Infinity) ? "must lie above the lower edge" : "")),
    hertz("resample to, in hertz", "resample_hz")];
  rate.field.placeholder = "as it is";
  const notch = notchField(app);
  const reference = select("reference", (value) => app.change((recipe) => void (recipe.channels.reference = asReference(value))));
  const chips = make("div", { class: "chips", role: "group", "aria-label": "Channels; a pressed one is left out or interpolated" });
  const mode = picks("What pressing a name does", "pressing", (value) => (pressing = value === "interpolate" ? "interpolate" : "leave_out", showMode()));
  const showMode = () => mode.show([{ value: "leave_out", label: "leaves it out" }, { value: "interpolate", label: "interpolates it" }], pressing);
  showMode();

  const leave = make("details", { class: "more leave-out" }, make("summary", {}, "Leave out or interpolate any channel"),
    make("p", { class: "choice" }, "Pressing a name ", mode.root, make("span", { class: "quiet small" }, "An interpolated channel adds no dimension: it helps maps and averages, not the separation.")), chips);
  body.append(
    make("div", { class: "choice" },
      make("span", { class: "together" }, "Keep ", high.field, " to ", low.field, " Hz,"),
      make("span", { class: "together" }, "stop ", notch.field, " Hz,"),
      make("span", { class: "together" }, "refer to ", reference.root),
      make("span", { class: "together" }, "resample to ", rate.field, " Hz")),
    movie(app),
    pairOf(app),
    picturesOf(app),
    proposals(app),
    leave,
    moreFilters(app),
    ranks(),
  );
  follow((state, before) => {
    if (state.recipe === before.recipe && state.sheet === before.sheet && state.summary === before.summary) return;
    leave.hidden = isMovie(state.summary);
    for (const field of [high, low, rate, notch]) field.show();
    showReference(reference);
    showChips(app, chips);
    for (const field of body.querySelectorAll(".choice :is(input, select)")) field.toggleAttribute("disabled", !state.recipe);
  });
}

/** The head and the stems: two figures with one caption. @param {App} app */
function pairOf(app) {
  const stems = figureSlot(app, "channels", { section: "channels", title: "Each channel as recorded", hint: "filled: used · ring: needs a look · cross: left out", label: "Standard deviation and mains excess of each channel, in recording order" });
  const map = figureSlot(app, "channels-map", { section: "channels", label: "Where the channels lie" });
  const row = make("div", { class: "head-and-stems" }, map.root, stems.place);
  stems.root.append(row);
  return stems.root;
}

/** A movie's mean and standard deviation, as pictures. @param {App} app */
function picturesOf(app) {
  const pictures = figureSlot(app, "channels-map", {
    section: "channels", title: "Each pixel over all frames", hint: "left out: blank", label: "Mean and standard deviation of each pixel",
    load: async () => (now().figures.includes("channels-map") ? app.bridge.figure("channels-map") : null),
  });
  const place = make("div", { class: "pictures", hidden: true }, pictures.root);
  follow((state, before) => void (state.summary !== before.summary && (place.hidden = !isMovie(state.summary))));
  return place;
}

/** The largest frequency that can be asked for: half the rate, or the rate itself where it is what is asked for. @param {string} key */
function top(key) {
  const rate = now().summary?.recording.rate_hz ?? 1e6;
  return key === "resample_hz" ? rate : rate / 2;
}

/** Stop bands: several with commas, semicolons or spaces between. @param {App} app */
function notchField(app) {
  // A comma between whole numbers of two or three digits parts them ("50,60"), and so does one before a space; elsewhere it is a decimal mark ("16,7").
  const parts = (/** @type {string} */ text) => text.replace(/(?<=\b\d{2,3}),(?=\d{2,3}(?:[,\s;]|$))/g, " ").split(/,?[\s;]+/).filter(Boolean).map(typed);
  return textField({ "aria-label": "mains and other lines to stop, in hertz", placeholder: "none" }, {
    text: () => (now().recipe?.filter.notch_hz ?? []).map(written).join(" "),
    refuses: (text) => (parts(text).every((value) => value !== null && value > 0 && value < top("notch")) ? "" : `must be numbers above 0 and below ${written(top("notch"))}, such as 50 100`),
    take: (text) => app.change((recipe) => void (recipe.filter.notch_hz = parts(text).map(Number))),
  });
}

/** Channels that are listed by name: the pixels of a movie are not. @param {import("./types").ChannelCard[] | undefined} channels */
const listed = (channels) => ((channels?.length ?? 0) > MOST_LISTED ? [] : channels ?? []);

/** @param {string} value @returns {Recipe["channels"]["reference"]} */
function asReference(value) {
  if (value === "neighbours") return { bipolar: "neighbours" };
  return value === "as recorded" || value === "average" ? value : [value.replace(/^channel:/, "")];
}

/** @param {ReturnType<typeof select>} reference */
function showReference(reference) {
  const { recipe, summary } = now();
  const current = recipe?.channels.reference ?? "as recorded";
  const names = listed(summary?.channels).map(({ name }) => name);
  const several = Array.isArray(current) && current.length > 1 ? [{ value: "several", label: `the mean of ${current.join(" and ")}` }] : [];
  const bipolar = typeof current === "object" && !Array.isArray(current) ? current.bipolar : null;
  const writtenOut = Array.isArray(bipolar) ? [{ value: "listed", label: `${bipolar.length} pairs of the recipe` }] : [];
  reference.show(
    [{ value: "as recorded", label: "as recorded" }, { value: "average", label: "the average of used" }, { value: "neighbours", label: "its neighbour (bipolar)" }, ...several, ...writtenOut, ...names.map((name) => ({ value: `channel:${name}`, label: name }))],
    Array.isArray(current) ? (several.length ? "several" : `channel:${current[0]}`) : bipolar ? (writtenOut.length ? "listed" : "neighbours") : String(current),
  );
}

/** @param {App} app @param {HTMLElement} chips */
function showChips(app, chips) {
  const { recipe, summary, sheet } = now();
  const channels = listed((sheet ?? summary)?.channels);
  if (chips.children.length !== channels.length || channels.some(({ name }, i) => chips.children[i]?.getAttribute("data-name") !== name))
    chips.replaceChildren(...channels.map(({ name }) => make("button", { type: "button", "data-name": name, click: () => turn(app, name) }, name)));
  channels.forEach(({ name, state }, i) => {
    const chip = /** @type {HTMLButtonElement | undefined} */ (chips.children[i]);
    if (!chip) return;
    const why = summary?.recording.about.aside[name];
    const fate = recipe ? fateOf(recipe, name) : undefined;
    // What a side file sets aside is left out until it is kept.
    const away = fate === "leave_out" || fate === "interpolate" ? fate : !fate && why !== undefined ? "leave_out" : null;
    chip.setAttribute("aria-pressed", String(away !== null || state.state === "unusable"));
    chip.dataset.fate = away ?? "";
    chip.setAttribute("aria-label", `${name}${away === "leave_out" ? ", left out" : away ? ", interpolated" : ""}`);
    chip.disabled = !recipe;
    chip.title = "reason" in state ? state.reason : (why ?? "");
  });
}

/** Another press takes a choice back. @param {App} app @param {string} name */
function turn(app, name) {
  const aside = now().summary?.recording.about.aside[name] !== undefined;
  app.change((recipe) => {
    const fate = fateOf(recipe, name);
    if (aside && !fate && pressing === "leave_out") return settle(recipe, name, "keep");
    settle(recipe, name, fate === pressing || (aside && fate === "keep") ? null : pressing);
  });
}
