import { el, freshId } from "./element.js";

/**
 * The shell that every dialog shares: heading, close, body, a foot with its buttons.
 *
 * @typedef {object} Sheet
 * @property {HTMLDialogElement} dialog
 * @property {HTMLElement} body
 * @property {HTMLElement} foot
 * @property {(title?: string) => void} open
 * @property {(focus?: () => void) => void} close
 *
 * @param {HTMLElement} root
 * @param {{title: string, class?: string}} options
 * @returns {Sheet}
 */
export function sheet(root, { title, class: extra = "" }) {
  const heading = el("h2", { id: freshId("sheet"), text: title });
  const body = el("div", { class: "sheet-body" });
  const foot = el("div", { class: "sheet-foot" });
  const closer = el("button", { type: "button", class: "quiet sheet-close", "aria-label": "close", text: "✕", on: { click: () => close() } });
  const dialog = el("dialog", { class: `sheet ${extra}`.trim(), "aria-labelledby": heading.id },
    el("div", { class: "sheet-head" }, heading, closer), body, foot);
  let caller = null;
  let afterwards = null;
  dialog.addEventListener("close", () => {
    // The row that called may have been drawn anew meanwhile; then the page keeps the focus.
    if (afterwards) afterwards();
    else if (caller?.isConnected) caller.focus();
    afterwards = null;
  });
  dialog.addEventListener("pointerdown", (event) => {
    if (event.target === dialog && isOutside(dialog, event)) dialog.dataset.pressedOutside = "true";
  });
  dialog.addEventListener("click", (event) => {
    const began = dialog.dataset.pressedOutside;
    delete dialog.dataset.pressedOutside;
    // Typed work is not thrown away by a click beside the dialog.
    if (began && event.target === dialog && isOutside(dialog, event) && !dialog.classList.contains("keeps-open")) close();
  });
  // Keys typed in a dialog are not the workbench's shortcuts.
  dialog.addEventListener("keydown", (event) => event.stopPropagation());
  root.append(dialog);

  /** @param {() => void} [focus] where the focus goes; left out: back to what opened the dialog */
  function close(focus) {
    afterwards = focus ?? null;
    dialog.close();
    // Nothing inside keeps the focus until the next paint: keys belong to the page at once.
    if (dialog.contains(document.activeElement)) document.activeElement.blur();
  }

  return {
    dialog,
    body,
    foot,
    close,
    open(newTitle = title) {
      heading.textContent = newTitle;
      caller = document.activeElement;
      if (!dialog.open) dialog.showModal();
      body.scrollTop = 0;
    },
  };
}

function isOutside(dialog, event) {
  const box = dialog.getBoundingClientRect();
  return event.clientX < box.left || event.clientX > box.right || event.clientY < box.top || event.clientY > box.bottom;
}
