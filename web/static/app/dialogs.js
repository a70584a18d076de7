import { demos } from "./demos.js";
import { handOver } from "./hand_over.js";
import { openFile, saveFile } from "./files.js";
import { share } from "./share.js";

/**
 * The dialogs that the header calls up. Any control opens one by a bubbling event:
 * `new CustomEvent("call-up", { bubbles: true, detail: { dialog: "share" } })`.
 *
 * @param {HTMLElement} root where the dialogs live, and what listens for the event
 * @param {import("./store.js").Store} store
 * @returns {Record<"share"|"hand over"|"open"|"save"|"demos", () => void>} the same, to call directly
 */
export function dialogs(root, store) {
  const byName = {
    share: share(root, store),
    "hand over": handOver(root, store),
    open: openFile(root, store),
    save: () => saveFile(store),
    demos: demos(root, store),
  };
  root.addEventListener("call-up", (event) => byName[event.detail.dialog]?.());
  return byName;
}
