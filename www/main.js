import { start } from "./bridge.js";

const message = /** @type {HTMLElement} */ (document.getElementById("message"));
start().then(
  (bridge) => {
    message.textContent = `Teasel ${bridge.version} is ready.`;
  },
  (error) => {
    document.documentElement.dataset.state = "error";
    message.textContent = String(error);
  },
);
