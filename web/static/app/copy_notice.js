import { el } from "./element.js";

/**
 * Says that a design came from a shared link, so that nobody fears to change what others see.
 *
 * @param {import("./store.js").Store} store
 * @returns {HTMLElement}
 */
export function copyNotice(store) {
  const node = el("div", { class: "copy-notice", hidden: true },
    el("p", { text: "Opened from a shared link. This is your own copy: changes stay with you, the shared design stays as it is." }),
    el("button", { type: "button", class: "quiet", "aria-label": "close this notice", text: "✕", on: { click: () => { node.hidden = true; } } }));
  store.addEventListener("loaded", () => {
    node.hidden = store.origin.kind !== "link";
    if (!node.hidden) store.say("opened from a shared link: this is your own copy");
  });
  return node;
}
