/** Shapes that cross between the core, the worker and the page. They follow src/core/src/{recipe,sheet,error}.rs field by field. */
export interface EventWindow {
  event: string;
  also?: string[];
  from_s: number;
  to_s: number;
  until?: string;
  first?: number;
  last?: number;
  leave_out?: number[];
  equal?: boolean;
}
export type SpanList = [number, number][];
/** Times, or the label of annotations that last; as a reference "rest" is everything else. */
export type Spans = SpanList | string;
export type Contrast =
  | { kind: "windows"; signal: EventWindow; reference: EventWindow }
  | { kind: "spans"; signal: Spans; reference: Spans; piece_s?: number }
  | { kind: "band"; centre_hz: number; half_width_hz: number; reference: "flanks" | "broadband"; within?: EventWindow | Spans; piece_s?: number }
  | ({ kind: "repeatable" } & EventWindow)
  | { kind: "slow"; lag_s: number; within?: EventWindow | Spans; piece_s?: number };
export type Kind = Contrast["kind"];
export interface Recipe {
  teasel_recipe: number;
  recording?: Given;
  movie?: Movie;
  channels: { leave_out: string[]; interpolate: string[]; keep?: string[]; reference: "as recorded" | "average" | string[] | { bipolar: "neighbours" | [string, string][] }; positions?: Positions };
  filter: {
    high_pass_hz: number | null; low_pass_hz: number | null; notch_hz: number[]; resample_hz: number | null;
    detrend?: "mean" | "linear" | { linear_every_s: number } | null;
    mains?: { hz: number; harmonics: number; how: "fit" | "notch"; window_s: number } | null;
  };
  drop_windows?: Partial<Record<"amplitude" | "step" | "flat" | "covariance", { z: number } | { uv: number }>>;
  keep: number | "auto" | "best";
  measure: "typical" | "total";
  contrast: Contrast;
  not_used?: SpanList;
  hold_back?: { last: number; open: boolean };
  shrink: number | "auto" | "ledoit-wolf" | "oas";
  components: number;
  /** Welch unless told otherwise. */
  spectrum?: "welch" | "multitaper";
  evidence: { folds: number; permutations: number; bootstrap: number; seed: number };
}
export type Positions =
  | { grid: { rows: number; columns: number; spacing_mm: number; first: string; along: string; prefix?: string } }
  | { probe: { spacing_um: number; order: string; prefix?: string } }
  | { at: Record<string, number[]> };
export interface Movie {
  bin?: number;
  mask?: { above: number } | { quantile: number } | [number, number, number][];
  dff?: { percentile: number; window_s: number };
}
/** Of a movie the sheet brings no channels and no patterns: pictures show them. */
export interface MovieCard {
  height: number;
  width: number;
  rows: number;
  columns: number;
  mean: (number | null)[];
  used: number[];
  threshold: number | null;
}
export interface RecordingCard {
  name: string;
  format: string;
  rate_hz: number;
  duration_s: number;
  stretches: { first: number; count: number; onset_s: number }[];
  others: { name: string; unit: string; rate_hz: number; reason: string }[];
  events: Record<string, number>;
  event_onsets_s: Record<string, number[]>;
  layout: { kind: "head" | "plane" | "line" } | { kind: "frames"; height: number; width: number };
  about: About;
  side_files: string[];
  warnings: string[];
  envelope: number[];
}
/** What a header and side files tell beside samples and events. */
export interface About {
  start: string | null;
  kinds: Record<string, string>;
  /** Channels that a side file sets aside, with the reason. */
  aside: Record<string, string>;
  mains_hz: number | null;
  reference: string | null;
  positions: string | null;
  /** A table of events whose columns have to be told. */
  untold: string | null;
}
export interface EventColumns {
  onset: string;
  unit: "s" | "ms" | "samples";
  label?: string | null;
  duration?: string | null;
}
export interface EventsPreview {
  columns: string[];
  rows: string[][];
  count: number;
  mapping: EventColumns;
  labels: [string, number][];
  more_labels: number;
  span_s: [number, number] | null;
  late: number;
  problem: Problem | null;
}
export type ChannelState =
  | { state: "used" | "interpolated" | "left-out" }
  | { state: "unusable" | "needs-a-look"; reason: string };
export interface ChannelCard {
  name: string;
  unit: string;
  sd: number | null;
  mains_db: number | null;
  mains_hz: number | null;
  state: ChannelState;
  position: [number, number, number] | null;
}
export interface SideCard {
  used: number;
  dropped: Record<string, number>;
  samples: number;
  seconds: number;
}
export interface TypicalRatio {
  /** null where the kind of contrast has no ratio in a single trial */
  fitted: number | null;
  held_out: number | null;
  interval: [number, number] | null;
}
export interface TotalRatio {
  fitted: number;
  held_out: number | null;
  folds: number[];
}
export interface Component {
  typical: TypicalRatio;
  total: TotalRatio;
  p: number | null;
  filter: number[];
  largest_at: string;
  peak_hz: number | null;
  stability: number | null;
  places_changed: number | null;
  trials: { onset_s: number; fold: number; log_ratio: number }[];
}
export interface Sheet {
  movie?: MovieCard;
  recording: RecordingCard;
  recipe: Recipe;
  channels: ChannelCard[];
  quality: { channels: { name: string; doubts: { kind: string; reason: string }[] }[]; compared_s: number; estimate: string | null } | null;
  preparation: {
    rate_hz: number; channels: string[]; rank: number; longest_filter_s: number; filters: string[];
    ranks: { step: string; channels: number; rank: number; why: string }[]; response: { reach_s: number } | null;
  } | null;
  rejection: {
    criteria: { name: string; limit: number; median: number; unit: string; beyond: [number, number] }[];
    windows: [number, number]; effect: { typical: [number, number]; total: [number, number] } | null;
  } | null;
  principal: { share: number }[];
  dimensions: { samples: number; effective_samples: number; surrogates: number; surrogate_samples: number; noise_edge: number | null } | null;
  windows: {
    paired: boolean;
    signal: SideCard;
    reference: SideCard;
    trials: { onset_s: number; event: string; dropped: string | null }[];
  } | null;
  compression: { kept: number; rank: number; share: number; guides: Record<string, number> } | null;
  curve: { keep: number[]; fitted: number[]; held_out: number[]; log_se: number[] } | null;
  shrinkage: number | null;
  /** The end that departs farther from 1: curve, folds and comparators are about its first component. */
  leading: "stronger" | "weaker";
  stronger: Component[];
  weaker: Component[];
  compare: unknown[];
  held_back?: { signal: number; reference: number; stronger: { typical: number | null; total: number }[]; weaker: { typical: number | null; total: number }[] };
  permutation: { asked: number; done: number; distinct: number | null; exact: boolean; null: string } | null;
  folds: { trials: number; ratio: number }[];
  warnings: string[];
}
export interface Summary {
  recording: RecordingCard;
  channels: ChannelCard[];
  /** The samples stay in the file; bytes that the part of them may take which the windows need. */
  part_bytes?: number;
  /** What is told of the recording, in order. */
  facts: { label: string; text: string }[];
}
export interface Span {
  text: string;
  tone: "plain" | "strong" | "signal" | "reference";
}
export interface Reading {
  section: string;
  text: Span[];
  but: Span[] | null;
}
export interface Problem {
  kind: string;
  file: string | null;
  what: string;
  place: string | null;
  expected: string | null;
  found: string | null;
  advice: string;
  salvage: { records: number; seconds: number } | null;
  /** What has to be told before the file can be opened. */
  asks: Ask[];
}
/** A question that a file leaves open; the answer goes into the recipe's `recording` under `key`. */
export interface Ask {
  key: "rate_hz" | "unit" | "axes" | "variable";
  question: string;
  /** Answers to choose from; empty where it is a number or free text. */
  options: string[];
  guess: string | null;
}
/** What a file does not carry and the user told. */
export interface Given {
  rate_hz?: number;
  unit?: string;
  axes?: string;
  variable?: string;
  events?: EventColumns;
}
export interface PlotBox {
  left: number;
  right: number;
  top: number;
  bottom: number;
  x0: number;
  x1: number;
  y0: number;
  y1: number;
}
/** One drawing as plain data; only the drawing code looks inside. */
export type Figure = object;
export interface Table {
  columns: string[];
  rows: string[][];
}
/** Lines to look at: channels as recorded, channels as prepared, components. */
export type LineKind = "recorded" | "prepared" | "components";
export interface Stretch {
  first: number;
  count: number;
  onset_s: number;
}
export interface Track {
  rate_hz: number;
  stretches: Stretch[];
  lines: { name: string; unit: string; swing: number }[];
}
export interface Tracks {
  recorded: Track;
  prepared: Track | null;
  components: Track | null;
}
export interface Progress {
  stage: string;
  done: number;
  of: number;
}
export interface SheetNews {
  sheet: Sheet;
  readings: Reading[];
  figures: string[];
  drawn?: Record<string, Figure>;
  generation: number;
  finished?: boolean;
}

export type Phase = "empty" | "reading" | "choosing" | "working" | "ready" | "error";
export type StepName = "recording" | "channels" | "windows" | "compression" | "components" | "evidence" | "take-away";
export interface State {
  phase: Phase;
  /** What was opened: shown in the head; `size` is null for a synthesised recording. */
  source: { name: string; size: number | null; demo: string | null } | null;
  summary: Summary | null;
  /** The choices in force. */
  recipe: Recipe | null;
  /** Why this contrast was proposed; empty when the user brought a recipe. */
  why: string;
  sheet: Sheet | null;
  readings: Reading[];
  figures: string[];
  /** Figures that came along with the newest sheet. */
  drawn: Record<string, Figure>;
  /** Counts the choices that came into force; a sheet carries the count of its own. */
  generation: number;
  /** The sheet answers an older recipe than `recipe`. */
  stale: boolean;
  /** The work was stopped before its end, and not gone on with. */
  stopped: boolean;
  /** The last choices of this recording whose work came to its end. */
  finished: Recipe | null;
  /** The stage at work, null at rest. */
  progress: Progress | null;
  /** Counts everything that was taken away from this sheet. */
  taken: number;
}

export interface DrawOptions {
  width: number;
  height: number;
  /** Device pixels per CSS pixel. */
  scale: number;
  dark: boolean;
}
/** What www/bridge.js gives: one queue to the worker, and the drawing of the page's own instance. */
export interface Bridge {
  open(files: File[], options: { salvage: boolean; given?: Given }): Promise<Summary>;
  openDemo(which: string): Promise<Summary>;
  propose(): Promise<{ recipe: Recipe; why: string } | null>;
  setRecipe(recipe: Recipe): Promise<number | null>;
  /** Whether the worker still holds a whole recording. */
  holds(): Promise<boolean>;
  stop(): Promise<unknown>;
  resume(): Promise<unknown>;
  revive(): Promise<Summary | null>;
  watch(names: string[]): Promise<unknown>;
  on(name: string, listener: (news: any) => void): () => void;
  figure(name: string): Promise<Figure | null>;
  traces(from_s: number, seconds: number, channels: number[]): Promise<Figure>;
  tracks(): Promise<Tracks>;
  bins(kind: LineKind, lines: number[], size: number, first: number, count: number): Promise<Float32Array>;
  takeaway(kind: string, extras?: { name: string; bytes: Uint8Array<ArrayBuffer> }[]): Promise<Uint8Array<ArrayBuffer>>;
  draw(canvas: HTMLCanvasElement, figure: Figure, options: DrawOptions): void;
  figureHeight(figure: Figure, width: number): number;
  plotBox(figure: Figure, width: number, height: number): PlotBox | null;
  svg(figure: Figure, width: number, height: number): string;
  table(figure: Figure): Table;
  naturalOrder(names: string[]): number[];
  eventsPreview(name: string, bytes: Uint8Array, columns: EventColumns | null, rate_hz: number, span_s: number): EventsPreview;
  isSideTable(name: string, bytes: Uint8Array, channels: string[]): boolean;
  parseRecipe(text: string): Recipe;
  linkEncode(recipe: Recipe, withNames: boolean): string;
  recipeText(recipe: Recipe): string;
  linkDecode(text: string): { recipe: Recipe; events: [number, number] | null; without: string[] };
  linkComplete(text: string, events: Record<string, number>): { recipe: Recipe; notes: string[] };
  excerpt(component: string, from_s: number, seconds: number): Promise<Figure | null>;
  cleanLook(components: string[], how: "remove" | "keep-only", from_s: number, seconds: number): Promise<CleanLook>;
  cleaned(components: string[], how: "remove" | "keep-only", form: "edf" | "npy" | "csv"): Promise<Uint8Array<ArrayBuffer>>;
  carry(weights: string, recipe: Recipe): Promise<CarriedTold>;
  row(folder: string): Promise<string>;
  another(): Promise<Bridge>;
  end(): void;
  folderNames(files: string[]): string[];
  failedRow(recording: string, folder: string, why: Problem): string;
  many(rows: string[]): Many;
}
/** What cleaning would do, and a few seconds before and after. */
export interface CleanLook {
  note: string;
  others: number;
  shares: { channels: string[]; before: number[]; after: number[]; removed: number[]; unit: string };
  before: Figure;
  after: Figure;
}
/** Saved filters on the open recording. */
export interface CarriedTold {
  rows: { name: string; before: number; before_held_out: boolean; typical: number; interval: [number, number] | null; total: number; windows: [number, number]; reading: string }[];
  notes: string[];
  csv: string;
  figures: [string, string, Figure][];
}
/** The first component of an end, in the table of a set. */
export interface Leader {
  fitted: number;
  typical_held_out: number | null;
  typical_low: number | null;
  typical_high: number | null;
  total_held_out: number | null;
  p: number | null;
  peak_hz: number | null;
  largest_at: string;
  likeness: number | null;
}
export interface ManyRow {
  recording: string;
  folder: string;
  problem: string | null;
  signal_windows: number | null;
  reference_windows: number | null;
  measure: "typical" | "total" | null;
  stronger_1: Leader | null;
  weaker_1: Leader | null;
  warnings: string[];
}
/** A set of recordings, one recipe: the table, what they say together, and its files. */
export interface Many {
  recordings: ManyRow[];
  said: string[];
  but: string[];
  csv: string;
  json: string;
  group_csv: string;
  figures: { name: string; caption: string; figure: Figure }[];
}
/** What every part of the sheet works with. */
export interface App {
  bridge: Bridge;
  /** Changes the choices and recomputes. */
  change(edit: (recipe: Recipe) => void): void;
}
