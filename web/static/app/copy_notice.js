import { el } from "./element.js";

/**
 * Says that a design came from a shared link, so that nobody fears to change what others see.
 *
 * @param {import("./store.js").Store} store
 * @returns {HTMLElement}
 */
export function copyNotice(store) {
  const text = el("p", { text: "Opened from a shared link. This is your own copy: changes stay with you, the shared design stays as it is." });
  const close = el("button", { type: "button", class: "quiet", "aria-label": "close this notice", text: "✕", on: { click: () => node.replaceChildren() } });
  // The region is there from the start, so that what comes into it is read out.
  const node = el("div", { class: "copy-notice", role: "status" });
  store.addEventListener("loaded", () => {
    if (store.origin.kind === "link") node.replaceChildren(text, close);
    else node.replaceChildren();
  });
  return node;
}
