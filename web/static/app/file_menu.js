/** The file menu: open, save, demos. */

import { el, freshId } from "./element.js";
import { icon } from "./icons.js";

/** @param {import("./store.js").Store} store @param {(dialog: string) => () => void} callUp */
export function fileMenu(store, callUp) {
  const id = freshId("menu");
  const menu = el("div", { class: "menu", id, role: "menu", popover: "auto", "aria-label": "design file" });
  const button = el("button", {
    type: "button", class: "quiet menu-button", "aria-haspopup": "menu", "aria-expanded": "false", "aria-controls": id,
  }, "file", icon("down"));
  const item = (/** @type {string} */ text, /** @type {() => void} */ act) => el("button", {
    type: "button", role: "menuitem", class: "menu-item", text, tabindex: -1,
    on: { click: () => { menu.hidePopover(); act(); } },
  });
  menu.append(item("open a design file…", callUp("open")), item("save as a file", callUp("save")), item("demo designs…", callUp("demos")));
  button.addEventListener("click", () => {
    const { left, bottom } = button.getBoundingClientRect();
    menu.style.left = `${left}px`;
    menu.style.top = `${bottom + 4}px`;
    menu.togglePopover();
  });
  menu.addEventListener("toggle", (event) => {
    const open = /** @type {any} */ (event).newState === "open";
    button.setAttribute("aria-expanded", String(open));
    if (open) /** @type {HTMLElement} */ (menu.firstElementChild).focus();
  });
  menu.addEventListener("keydown", (event) => walk(menu, button, event));
  return el("div", { class: "menu-root" }, button, menu);
}

function walk(/** @type {HTMLElement} */ menu, /** @type {HTMLElement} */ button, /** @type {KeyboardEvent} */ event) {
  const items = /** @type {HTMLElement[]} */ ([...menu.children]);
  const at = items.indexOf(/** @type {HTMLElement} */ (document.activeElement));
  /** @type {Record<string, number>} */
  const next = { ArrowDown: at + 1, ArrowUp: at - 1, Home: 0, End: items.length - 1 };
  if (event.key in next) {
    event.preventDefault();
    items[(next[event.key] + items.length) % items.length].focus();
  } else if (event.key === "Escape" || event.key === "Tab") {
    menu.hidePopover();
    button.focus();
  }
}
