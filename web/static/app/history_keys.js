/** Undo and redo by the keys that everyone's fingers know, except while typing in a field. */

/** @param {import("./store.js").Store} store */
export function historyKeys(store) {
  document.addEventListener("keydown", (event) => {
    if (!(event.ctrlKey || event.metaKey) || event.altKey) return;
    const target = /** @type {HTMLElement} */ (event.target);
    if (target.closest?.("input, textarea, select, dialog[open]")) return;
    const key = event.key.toLowerCase();
    if (key === "z" && !event.shiftKey) store.undo();
    else if (key === "y" || (key === "z" && event.shiftKey)) store.redo();
    else return;
    event.preventDefault();
  });
}
