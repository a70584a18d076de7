/** A small field at a handle: type the number exactly. Enter sets it, Escape leaves it. */

import { el } from "./element.js";
import { exact } from "./format.js";
import { numberFault, typedNumber } from "./typed_number.js";

/** @param {HTMLElement} stage @param {import("./store.js").Store} store
 *  @returns {(grasp: import("./handle.js").Grasp) => void} */
export function typingField(stage, store) {
  return (grasp) => {
    stage.querySelector(".typing")?.remove();
    const back = /** @type {HTMLElement | null} */ (document.activeElement);
    const typed = grasp.typed ?? exact;
    const { x, y } = grasp.at();
    const fault = el("span", { class: "fault", role: "alert" });
    const input = /** @type {HTMLInputElement} */ (el("input", {
      type: "text", inputmode: "decimal", class: "field", "aria-label": grasp.name(), autocomplete: "off", value: typed(grasp.value()), size: 12,
    }));
    const box = el("form", { class: "typing" }, el("span", { class: "typing-name", text: grasp.name() }), input, fault);
    box.style.left = `${Math.max(8, Math.min(stage.clientWidth - 190, x - 60))}px`;
    box.style.top = `${Math.max(8, Math.min(stage.clientHeight - 80, y + 18))}px`;
    const close = () => {
      box.remove();
      back?.focus?.();
    };
    box.addEventListener("submit", (event) => {
      event.preventDefault();
      const number = typedNumber(input.value);
      const wrong = numberFault(input.value, number) ?? (grasp.refuse ?? notPositive(grasp))(number);
      fault.textContent = wrong ?? "";
      if (wrong) return;
      const value = grasp.read ? grasp.read(number) : number;
      const keep = grasp.keep ?? grasp.set;
      store.edit(`set ${grasp.name()}`, (design) => keep(design, value), grasp.aim ? { aim: grasp.aim(value) } : {});
      close();
    });
    box.addEventListener("keydown", (event) => {
      event.stopPropagation();
      if (event.key === "Escape") close();
    });
    box.addEventListener("focusout", () => setTimeout(() => box.contains(document.activeElement) || box.remove()));
    stage.append(box);
    input.focus();
    input.select();
  };
}

/** Corners, dampings and gains are positive; only a depth may be 0. */
function notPositive(/** @type {import("./handle.js").Grasp} */ grasp) {
  const mayBeZero = grasp.ends()[0] === 0;
  return (/** @type {number} */ number) => {
    if (mayBeZero ? number >= 0 : number > 0) return null;
    return `must be ${mayBeZero ? "0 or more" : "greater than 0"}, is ${exact(number)}`;
  };
}
