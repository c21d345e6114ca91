/** The guide: six short screens, opened and closed by one button; it covers nothing and needs nothing. */
import { find } from "./kit.js";

export function mountGuide() {
  const section = find("#guide");
  const button = find("#open-guide");
  const turn = (/** @type {boolean} */ open) => {
    section.hidden = !open;
    button.setAttribute("aria-expanded", String(open));
    if (!open) return button.focus();
    const title = find("#title-guide");
    title.focus({ preventScroll: true });
    section.scrollIntoView({ block: "start" });
  };
  button.addEventListener("click", () => turn(Boolean(section.hidden)));
  find("#close-guide").addEventListener("click", () => turn(false));
  section.addEventListener("keydown", (event) => {
    if (event.key === "Escape") turn(false);
  });
}
