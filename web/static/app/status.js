/** The line at the foot of the page: a lost server, a design that cannot be read, and what others have to say. */

import { el, setText } from "./element.js";

const SPOKEN_MS = 7000;

/** @param {HTMLElement} root `<output role="status">` @param {import("./store.js").Store} store */
export function statusLine(root, store) {
  const text = el("span", { class: "status-text" });
  root.append(text);
  let said = "";
  let saidTone = "calm";
  let timer = 0;

  function draw() {
    const trouble = lost(store) ?? refused(store);
    setText(text, trouble ?? said);
    root.dataset.tone = trouble ? "trouble" : saidTone;
    root.classList.toggle("is-shown", Boolean(trouble ?? said));
  }

  store.addEventListener("say", (event) => {
    ({ text: said, tone: saidTone } = /** @type {CustomEvent} */ (event).detail);
    clearTimeout(timer);
    timer = window.setTimeout(() => {
      said = "";
      draw();
    }, SPOKEN_MS);
    draw();
  });
  let wasLost = false;
  store.addEventListener("connection", () => {
    if (store.connection === "open" && wasLost) store.say("The server is back; everything is up to date.");
    wasLost = store.connection === "lost";
    draw();
  });
  store.addEventListener("frame", draw);
  for (const type of ["design", "frame", "connection"]) store.addEventListener(type, () => showWaiting(store));
  draw();
}

/** On the root element: whether what is drawn is already that of the design. */
function showWaiting(/** @type {import("./store.js").Store} */ store) {
  document.documentElement.dataset.live = store.connection === "lost" ? "lost" : store.waiting ? "waiting" : "up to date";
}

function lost(/** @type {import("./store.js").Store} */ store) {
  if (store.connection !== "lost") return null;
  return "The server does not answer. Your work is kept here and goes on as soon as it is back; trying again…";
}

function refused(/** @type {import("./store.js").Store} */ store) {
  const frame = store.frame;
  if (!frame || frame.ok) return null;
  const [first, ...more] = frame.errors ?? [];
  if (!first) return "This design cannot be judged.";
  const rest = more.length ? ` (and ${more.length} more)` : "";
  return `${first.where ? `${first.where}: ` : ""}${first.what}${rest}. The curves are those of the last design that could be drawn.`;
}
