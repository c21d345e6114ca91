/** The sentence above the traces: which channels, how long, how tall, before or after the preparation, and what a drag does. */
import { make } from "./kit.js";
import { numberField, picks, select } from "./fields.js";
import { follow } from "./state.js";
import { above, followTracks, rooms, showComponents, tracksNow } from "./traces.js";
import { followView, look, spanLimits, viewNow } from "./trace-view.js";

/** @typedef {import("./marks.js").MarkKind} MarkKind */

/** What a drag does: it moves the view, or marks. @type {MarkKind | null} */
let marking = null;

export function markingNow() {
  return marking;
}

/** @param {() => void} redraw */
export function traceChoices(redraw) {
  const lines = () => above()?.track.lines.length ?? 0;
  const which = select("channels shown", (value) => look({ row: Number(value) }));
  const many = numberField("channels at once", { get: () => Math.min(viewNow().rows, lines()), range: () => [1, Math.max(1, lines())], step: () => 1, refuses: (value) => (Number.isInteger(value) ? "" : "must be a whole number"), set: (value) => value && look({ rows: value, row: Math.min(viewNow().row, Math.max(0, lines() - value)) }) });
  const long = numberField("seconds across", { get: () => Number(viewNow().seconds.toPrecision(4)), range: spanLimits, step: () => (viewNow().seconds > 3 ? 1 : 0.1), set: (value) => value && look({ from: viewNow().from + (viewNow().seconds - value) / 2, seconds: value }) });
  const unit = () => above()?.track.lines[0]?.unit ?? "";
  const usual = () => { const shown = above(); return (shown && rooms(shown.track).get(unit())) || 1; };
  const tall = numberField("units from one line to the next", { get: () => Number((usual() / viewNow().gain).toPrecision(3)), range: () => [usual() / 1e3, usual() * 1e3], step: () => usual() / viewNow().gain / 10, set: (value) => value && look({ gain: usual() / value }) });
  const per = make("span");
  const kind = picks("Before or after the preparation", "trace-kind", (value) => look({ kind: value === "prepared" ? "prepared" : "recorded", row: 0 }));
  const under = make("input", { type: "checkbox", checked: true, change: () => (showComponents(under.checked), redraw()) });
  const tick = make("label", { class: "tick" }, under, "components below");
  const act = picks("What a drag does", "trace-act", (value) => (marking = value === "move" ? null : /** @type {MarkKind} */ (value)));
  act.show([{ value: "move", label: "moves" }, { value: "signal", label: "marks signal" }, { value: "reference", label: "marks reference" }, { value: "not_used", label: "marks not to be used" }], "move");
  const root = make("div", {},
    make("div", { class: "choice" },
      make("span", { class: "together" }, "Show ", which.root), make("span", { class: "together" }, many.field, " channels at once,"),
      make("span", { class: "together" }, long.field, " s across,"), make("span", { class: "together" }, tall.field, per), kind.root, tick),
    make("div", { class: "choice" }, make("span", { class: "together" }, "A drag on the traces ", act.root)));
  const show = () => {
    const all = above()?.track.lines ?? [];
    const { row, rows } = viewNow();
    const starts = Array.from({ length: Math.ceil(all.length / rows) }, (_, i) => Math.min(i * rows, Math.max(0, all.length - rows)));
    if (!starts.includes(row)) starts.push(row);
    const options = [...new Set(starts)].sort((a, b) => a - b).map((from) => ({ value: String(from), label: `${all[from]?.name ?? ""} to ${all[Math.min(all.length, from + rows) - 1]?.name ?? ""}` }));
    which.show(options, String(row));
    which.root.disabled = options.length < 2;
    for (const field of [many, long, tall]) field.show();
    per.textContent = `${unit()} a row`.trim();
    const prepared = Boolean(tracksNow()?.prepared);
    kind.root.hidden = !prepared;
    kind.show([{ value: "recorded", label: "as recorded" }, { value: "prepared", label: "as prepared" }], viewNow().kind);
    tick.hidden = !tracksNow()?.components;
  };
  followTracks(show);
  followView(show);
  follow((state, before) => state.summary !== before.summary && show());
  return root;
}
