/** Recording: what its file and its side files tell, as a list, and what to beware of. */
import { find, make } from "./kit.js";
import { follow } from "./state.js";

export function mountAbout() {
  const list = make("dl", { class: "facts" });
  const notes = make("ul", { class: "notes" });
  const block = make("div", { class: "told" }, make("div", { class: "caption" }, make("b", {}, "What the files tell")), list, notes);
  find("#recording.step .body").append(block);
  follow((state, before) => {
    if (state.summary === before.summary) return;
    const { facts, recording } = state.summary ?? { facts: [], recording: null };
    list.replaceChildren(...facts.map(({ label, text }) => make("div", {}, make("dt", {}, label), make("dd", {}, text))));
    notes.replaceChildren(...(recording?.warnings ?? []).map((warning) => make("li", {}, warning)));
  });
}
