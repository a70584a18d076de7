import { el, setText, freshId } from "./element.js";
import { exact } from "./format.js";
import { numberFault, typedNumber } from "./typed_number.js";

/**
 * A number in a sentence that turns into a field when it is clicked: Enter keeps, Escape puts back,
 * leaving keeps what is sound.
 *
 * @typedef {object} ExactNumber
 * @property {HTMLElement} node
 * @property {(value: number|undefined) => void} update show another value; a field being typed in is left alone
 *
 * @param {object} options
 * @param {string} options.name what the number is, for screen readers: "zero of lead, rad/s"
 * @param {(value: number|undefined) => string} options.show as it reads in the sentence
 * @param {(value: number|undefined) => string} [options.typed] as it stands in the field, to full precision
 * @param {(text: string) => number|undefined} [options.read] from the field; NaN where it is no number
 * @param {(value: number|undefined) => Promise<string|null>} options.keep gives what is wrong with it, or null
 * @returns {ExactNumber}
 */
export function exactNumber({ name, show, typed = exact, read = typedNumber, keep }) {
  let value;
  let editing = false;
  const button = el("button", { type: "button", class: "exact-number", on: { click: open } });
  const node = el("span", { class: "exact" }, button);

  function update(next) {
    value = next;
    const text = show(value);
    setText(button, text);
    const label = `${name}: ${text}, change`;
    if (button.getAttribute("aria-label") !== label) button.setAttribute("aria-label", label);
  }

  function open() {
    if (editing) return;
    editing = true;
    const before = typed(value);
    const fault = el("span", { class: "fault", role: "alert", id: freshId("fault") });
    const input = el("input", {
      type: "text", inputmode: "decimal", class: "exact-input", value: before, autocomplete: "off",
      "aria-label": name, "aria-describedby": fault.id, size: Math.max(6, before.length + 1),
    });
    const close = (focus) => {
      if (!editing) return;
      editing = false;
      node.replaceChildren(button);
      if (focus) button.focus();
    };
    const complain = (what) => {
      fault.textContent = what;
      input.setAttribute("aria-invalid", "true");
    };
    let busy = false;
    const finish = async (leaving) => {
      if (busy || !editing) return;
      if (input.value.trim() === before.trim()) return close(!leaving);
      const number = read(input.value);
      const wrong = numberFault(input.value, number);
      if (wrong) return leaving ? close(false) : complain(wrong);
      busy = true;
      const refused = await keep(number);
      busy = false;
      if (!refused) {
        close(!leaving);
        update(number);
      } else if (leaving) close(false);
      else complain(refused);
    };
    input.addEventListener("keydown", (event) => {
      if (event.key === "Enter") {
        event.preventDefault();
        finish(false);
      } else if (event.key === "Escape") {
        event.preventDefault();
        close(true);
      }
    });
    input.addEventListener("blur", () => finish(true));
    node.replaceChildren(input, fault);
    input.focus();
    input.select();
  }

  return { node, update };
}
