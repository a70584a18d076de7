/** The bar on top: the title, undo and redo, the frequency unit, pin, share, hand over, file, light or dark. */

import { el, textButton } from "./element.js";
import { icon } from "./icons.js";
import { fileMenu } from "./file_menu.js";
import { set } from "./svg.js";
import { shownTheme } from "./theme.js";

/** @param {HTMLElement} root @param {import("./store.js").Store} store */
export function header(root, store) {
  const callUp = (/** @type {string} */ dialog) => () => root.dispatchEvent(new CustomEvent("call-up", { bubbles: true, detail: { dialog } }));
  const undo = iconButton("undo", () => store.undo());
  const redo = iconButton("redo", () => store.redo());
  const units = unitSwitch(store);
  const pin = textButton("pin", () => (store.pinned ? store.unpin() : store.pin()), { class: "quiet" });
  const share = textButton("share link", callUp("share"), { class: "quiet" });
  const handOver = el("button", { type: "button", class: "strong", text: "Hand over", on: { click: callUp("hand over") } });
  const theme = iconButton("moon", () => store.setUi({ theme: shownTheme(store) === "dark" ? "light" : "dark" }));
  const title = titleField(store);
  root.append(
    el("h1", { class: "title" }, title.node), el("div", { class: "history", role: "group", "aria-label": "history" }, undo.node, redo.node),
    el("div", { class: "header-space" }), fileMenu(store, callUp), units.node, pin, share, handOver, theme.node,
  );

  function draw() {
    title.draw();
    undo.draw("undo", store.canUndo, store.undoLabel);
    redo.draw("redo", store.canRedo, store.redoLabel);
    units.draw();
    set(pin, {
      "aria-pressed": Boolean(store.pinned), text: store.pinned ? "pinned" : "pin",
      title: store.pinned ? "take the pinned reference away" : "keep this design as the pale reference",
    });
    theme.draw(shownTheme(store) === "dark" ? "light ground" : "dark ground", true, "", shownTheme(store) === "dark" ? "sun" : "moon");
  }
  for (const type of ["design", "history", "ui", "pinned", "theme"]) store.addEventListener(type, draw);
  draw();
}

/** A heading that is a field: type in it, Enter or leaving keeps it. */
function titleField(/** @type {import("./store.js").Store} */ store) {
  const input = /** @type {HTMLInputElement} */ (el("input", { class: "title-field", "aria-label": "title of the design", autocomplete: "off", spellcheck: "false", maxlength: 120 }));
  let drawn = /** @type {string | null} */ (null);
  const keep = () => {
    const text = input.value.trim();
    if (store.design && text !== (store.design.title ?? "")) store.edit("change the title", (design) => ({ ...design, title: text }));
  };
  input.addEventListener("change", keep);
  input.addEventListener("keydown", (event) => {
    if (event.key === "Enter") input.blur();
    if (event.key === "Escape") {
      input.value = store.design?.title ?? "";
      input.blur();
    }
  });
  return {
    node: input,
    draw() {
      const text = store.design?.title ?? "";
      if (text === drawn) return;
      drawn = text;
      if (document.activeElement !== input) input.value = text;
      input.placeholder = "a title for this design";
      // Where the browser cannot size a field by its content.
      input.size = Math.max(12, input.value.length);
      document.title = text ? `${text} · Loopwright` : "Loopwright";
    },
  };
}

function unitSwitch(/** @type {import("./store.js").Store} */ store) {
  const buttons = ["rad/s", "Hz"].map((unit) => textButton(unit, () => store.setUi({ unit }), { class: "quiet", "aria-label": `frequencies in ${unit}` }));
  return {
    node: el("div", { class: "unit-switch", role: "group", "aria-label": "frequency unit" }, ...buttons),
    draw() {
      for (const button of buttons) set(button, { "aria-pressed": button.textContent === store.ui.unit });
    },
  };
}

function iconButton(/** @type {string} */ name, /** @type {() => void} */ act) {
  const node = el("button", { type: "button", class: "quiet icon-button", on: { click: act } }, icon(name));
  let shown = name;
  let said = "";
  return {
    node,
    draw(/** @type {string} */ label, /** @type {boolean} */ usable, /** @type {string} */ more, /** @type {string} */ look = shown) {
      const full = more ? `${label}: ${more}` : label;
      if (full === said && usable === !node.hasAttribute("disabled") && look === shown) return;
      said = full;
      node.toggleAttribute("disabled", !usable);
      node.setAttribute("aria-label", full);
      node.setAttribute("title", full);
      if (look !== shown) node.replaceChildren(icon(look));
      shown = look;
    },
  };
}
